package report

import (
	"math"
	"math/big"
	"strconv"
	"strings"

	"nullmark/extract/result"
)

// notation says how a number is written.
type notation int

const (
	scientific notation = iota // always d.ddd(bb)e-5: columns of fluxes
	readable                   // plain decimals where the size allows, else scientific
)

// figure is a number as it is printed.
type figure struct {
	Value string // concise form, "5.3687954790(31)e-5": digits to the bar, the bar in units of the last digits
	Bar   string // "3.1e-14": the bar by itself, two digits, rounded up
	Good  bool   // false when value or bar is no finite number; then Value says so and Bar is empty
}

// missing is what stands in a cell for which the result has no number.
const missing = "–"

// write renders value and bar: the bar rounded up to two significant digits,
// the value rounded to nearest at the bar's last place. A value is never given
// more than seventeen digits; a bar that lies below the last of them is rounded
// up to it in the parentheses. A zero bar means exact, and the value is written in full.
func write(q result.Q, n notation) figure {
	if math.IsNaN(q.Value) || math.IsInf(q.Value, 0) || math.IsNaN(q.Error) || math.IsInf(q.Error, 0) || q.Error < 0 {
		return figure{Value: "no certified number"}
	}
	if q.Error == 0 {
		return figure{Value: plainNumber(q.Value), Bar: "0", Good: true}
	}
	unit, place := roundUp(q.Error)
	bar := decimal(strconv.Itoa(unit), "", place, n)
	if q.Value != 0 {
		for last := exponent(q.Value) - 16; place < last; place++ {
			if unit == 1 {
				place = last
				break
			}
			unit = (unit + 9) / 10
		}
	}
	digits, negative := roundAt(q.Value, place)
	text := decimal(digits, strconv.Itoa(unit), place, n)
	if negative {
		text = "-" + text
	}
	return figure{Value: text, Bar: bar, Good: true}
}

// roundUp returns unit in 10..99 and place with e <= unit·10^place and e >
// (unit-1)·10^place. It reads e as the shortest decimal that stands for it, so
// that a bar of 0.1 is 0.10 and not 0.11. It needs e > 0, finite.
func roundUp(e float64) (unit, place int) {
	digits, exp := shortest(e)
	for len(digits) < 2 {
		digits += "0"
	}
	unit = int(digits[0]-'0')*10 + int(digits[1]-'0')
	if strings.Trim(digits[2:], "0") != "" {
		unit++
	}
	place = exp - 1
	if unit == 100 {
		unit, place = 10, place+1
	}
	return unit, place
}

// shortest splits the shortest decimal of |x| into digits d0 d1 d2 … and the
// exponent of d0.
func shortest(x float64) (digits string, exp int) {
	s := strconv.FormatFloat(math.Abs(x), 'e', -1, 64)
	mantissa, power, _ := strings.Cut(s, "e")
	exp, err := strconv.Atoi(power)
	if err != nil {
		panic("report: exponent of " + s)
	}
	return strings.Replace(mantissa, ".", "", 1), exp
}

// exponent is the decimal exponent of the leading digit of x != 0.
func exponent(x float64) int {
	_, exp := shortest(x)
	return exp
}

// roundAt returns the digits of |x| / 10^place rounded to the nearest integer,
// ties away from zero, and whether the rounded number is below zero.
func roundAt(x float64, place int) (digits string, negative bool) {
	r := new(big.Rat).SetFloat64(math.Abs(x))
	ten := new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(max(place, -place))), nil)
	if place > 0 {
		r.Quo(r, new(big.Rat).SetInt(ten))
	} else {
		r.Mul(r, new(big.Rat).SetInt(ten))
	}
	r.Add(r, big.NewRat(1, 2))
	whole := new(big.Int).Quo(r.Num(), r.Denom())
	return whole.String(), x < 0 && whole.Sign() != 0
}

// decimal writes digits·10^place, followed by "(bar)" when bar is not empty;
// bar counts in units of the same place.
func decimal(digits, bar string, place int, n notation) string {
	lead := max(len(digits), len(bar)) - 1 + place
	inner := ""
	if bar != "" {
		inner = "(" + bar + ")"
	}
	if n == readable && place <= 0 && lead >= -4 && lead <= 5 {
		return point(digits, -place) + inner
	}
	text := point(digits, lead-place) + inner
	if lead == 0 {
		return text
	}
	return text + "e" + strconv.Itoa(lead)
}

// point sets a decimal point so that after digits follow it, with zeros before
// where they are needed.
func point(digits string, after int) string {
	if short := after + 1 - len(digits); short > 0 {
		digits = strings.Repeat("0", short) + digits
	}
	if after == 0 {
		return digits
	}
	return digits[:len(digits)-after] + "." + digits[len(digits)-after:]
}

// plainNumber writes a number that has no bar: a setting, or what follows from
// the orbit to double precision.
func plainNumber(x float64) string { return tidyExponent(strconv.FormatFloat(x, 'g', -1, 64)) }

// settingNumber writes a setting to at most six digits.
func settingNumber(x float64) string { return tidyExponent(strconv.FormatFloat(x, 'g', 6, 64)) }

// roughNumber writes a size to two digits, rounded up when it is above zero, as bars are.
func roughNumber(x float64) string {
	if !(x > 0) || math.IsInf(x, 0) {
		return plainNumber(x)
	}
	unit, place := roundUp(x)
	return decimal(strconv.Itoa(unit), "", place, scientific)
}

// askedNumber writes a wanted accuracy as the user would type it: 1e-9.
func askedNumber(x float64) string {
	digits, exp := shortest(x)
	if len(digits) > 6 || exp >= -2 {
		return settingNumber(x)
	}
	return point(digits, len(digits)-1) + "e" + strconv.Itoa(exp)
}

// tidyExponent turns 1e-05 into 1e-5 and 1e+20 into 1e20.
func tidyExponent(s string) string {
	mantissa, power, found := strings.Cut(s, "e")
	if !found {
		return s
	}
	exp, err := strconv.Atoi(power)
	if err != nil {
		return s
	}
	return mantissa + "e" + strconv.Itoa(exp)
}
