package report

import (
	"math"
	"math/big"
	"math/rand/v2"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"nullmark/extract/result"
)

func TestNumberForms(t *testing.T) {
	for _, c := range []struct {
		v, e  float64
		n     notation
		value string
		bar   string
	}{
		{5.368795479e-5, 3e-14, scientific, "5.3687954790(30)e-5", "3.0e-14"},
		{5.368795479e-5, 3.01e-14, scientific, "5.3687954790(31)e-5", "3.1e-14"},
		{-0.560320396, 1.2e-9, readable, "-0.5603203960(12)", "1.2e-9"},
		{9.9996, 0.012, scientific, "1.0000(12)e1", "1.2e-2"},
		{9.9996, 0.012, readable, "10.000(12)", "0.012"},
		{9.996, 0.12, readable, "10.00(12)", "0.12"},
		{1, 0.1, readable, "1.00(10)", "0.10"},
		{1, 0.0995, readable, "1.00(10)", "0.10"},
		{0, 1.2e-14, scientific, "0.0(12)e-14", "1.2e-14"},
		{3e-15, 1.2e-14, scientific, "0.3(12)e-14", "1.2e-14"},
		{-3e-16, 1.2e-14, scientific, "0.0(12)e-14", "1.2e-14"},
		{123456, 78, readable, "123456(78)", "78"},
		{123456, 780, readable, "1.2346(78)e5", "7.8e2"},
		{1e300, 1e290, scientific, "1.00000000000(10)e300", "1.0e290"},
		{5e-324, 5e-324, scientific, "4.9(50)e-324", "5.0e-324"},
		{6.765201239930965e-16, 8.788395371804647e-32, scientific, "6.7652012399309653(9)e-16", "8.8e-32"},
		{1, 1e-300, scientific, "1.0000000000000000(1)", "1.0e-300"},
		{0, 0, scientific, "0", "0"},
		{2.5e-7, 0, scientific, "2.5e-7", "0"},
	} {
		f := write(result.Q{Value: c.v, Error: c.e}, c.n)
		if f.Value != c.value || f.Bar != c.bar || !f.Good {
			t.Errorf("%v ± %v: %q bar %q, want %q bar %q", c.v, c.e, f.Value, f.Bar, c.value, c.bar)
		}
	}
	for _, q := range []result.Q{{Value: math.NaN(), Error: 1}, {Value: 1, Error: math.Inf(1)}, {Value: 1, Error: math.NaN()}, {Value: 1, Error: -1}, {Value: math.Inf(-1)}} {
		if f := write(q, scientific); f.Good || f.Bar != "" || f.Value != "no certified number" {
			t.Errorf("%v is written as %q bar %q", q, f.Value, f.Bar)
		}
	}
	for x, want := range map[float64]string{1e-9: "1e-9", 2.5e-10: "2.5e-10", 1e-14: "1e-14", 0.01: "0.01", 1: "1"} {
		if got := askedNumber(x); got != want {
			t.Errorf("asked %v is written %q, want %q", x, got, want)
		}
	}
}

var concise = regexp.MustCompile(`^(-?)(\d+)(?:\.(\d+))?\((\d{1,2})\)(?:e(-?\d+))?$`)

// TestNumberRoundsRight reads random numbers back with exact rationals. The
// last place of the value and the digits in parentheses must say: the bar is
// rounded up by less than one unit, and the value is the nearest one at that
// place.
func TestNumberRoundsRight(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	random := func() float64 {
		x := (1 + 9*rng.Float64()) * math.Pow(10, float64(rng.IntN(560)-280))
		switch rng.IntN(8) {
		case 0:
			x = float64(rng.IntN(2000)) / 1000
		case 1: // close below a power of ten, where rounding gains a digit
			x = math.Nextafter(math.Pow(10, float64(rng.IntN(20)-10)), 0)
		}
		if rng.IntN(2) == 0 {
			x = -x
		}
		return x
	}
	for range 60000 {
		v := random()
		e := math.Abs(random())
		if rng.IntN(4) > 0 {
			e = math.Abs(v) * math.Pow(10, -18*rng.Float64()+2)
		}
		if e == 0 || math.IsInf(e, 0) || v == 0 && rng.IntN(2) == 0 {
			continue
		}
		n := notation(rng.IntN(2))
		f := write(result.Q{Value: v, Error: e}, n)
		m := concise.FindStringSubmatch(f.Value)
		if m == nil {
			t.Fatalf("%v ± %v is written %q", v, e, f.Value)
		}
		exp := 0
		if m[5] != "" {
			exp, _ = strconv.Atoi(m[5])
		}
		unit := rational("1e" + strconv.Itoa(exp-len(m[3])))
		shown := new(big.Rat).Mul(rational(m[1]+m[2]+m[3]), unit)
		bar := new(big.Rat).Mul(rational(m[4]), unit)
		// Bars and values are those the shortest decimals of v and e stand for:
		// a typed 0.1 is a tenth.
		exactBar := rational(strconv.FormatFloat(e, 'e', -1, 64))
		if bar.Cmp(exactBar) < 0 {
			t.Fatalf("%v ± %v: %q claims less than the bar", v, e, f.Value)
		}
		if over := new(big.Rat).Sub(bar, exactBar); over.Cmp(unit) >= 0 {
			t.Fatalf("%v ± %v: %q pads the bar by a unit or more", v, e, f.Value)
		}
		off := new(big.Rat).Sub(shown, new(big.Rat).SetFloat64(v))
		if off.Abs(off).Cmp(new(big.Rat).Quo(unit, rational("2"))) > 0 {
			t.Fatalf("%v ± %v: %q is not the nearest at that place", v, e, f.Value)
		}
		if len(m[4]) == 1 && len(m[2]+m[3]) < 17 {
			t.Fatalf("%v ± %v: %q has one digit of bar", v, e, f.Value)
		}
		if strings.HasPrefix(f.Value, "-") && shown.Sign() == 0 {
			t.Fatalf("%v ± %v: %q is a negative zero", v, e, f.Value)
		}
		own := rational(f.Bar)
		if own.Cmp(exactBar) < 0 || new(big.Rat).Mul(exactBar, rational("1.1")).Cmp(own) < 0 {
			t.Fatalf("bar %v is written %q", e, f.Bar)
		}
	}
}

func rational(s string) *big.Rat {
	r, ok := new(big.Rat).SetString(s)
	if !ok {
		panic("not a number: " + s)
	}
	return r
}

func TestTicksAreRoundAndInside(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for range 2000 {
		lo := (rng.Float64() - 0.5) * math.Pow(10, float64(rng.IntN(12)-6))
		a := axis{lo: lo, hi: lo + rng.Float64()*math.Pow(10, float64(rng.IntN(12)-6)) + 1e-9, to: 500}
		ticks := a.ticks(6)
		if len(ticks) < 2 || len(ticks) > 8 {
			t.Fatalf("%d ticks between %v and %v", len(ticks), a.lo, a.hi)
		}
		for _, k := range ticks {
			if at := a.at(k.v); at < -1 || at > 501 {
				t.Fatalf("tick %v lies outside %v to %v", k.v, a.lo, a.hi)
			}
		}
	}
	log := axis{lo: 1e-38, hi: 1e-3, to: 500, log: true}
	if n := len(log.ticks(8)); n < 3 || n > 8 {
		t.Errorf("%d ticks on 35 decades", n)
	}
	if at := log.at(-5); at != 0 {
		t.Errorf("a negative value sits at %v of a logarithmic axis", at)
	}
}

// TestUnitsOfDerivatives: with G = c = M = 1 written out, an amplitude r h/mu
// has no unit, a frequency 1/M, and each derivative in u takes another 1/M.
func TestUnitsOfDerivatives(t *testing.T) {
	for key, want := range map[string]string{
		"amplitude": "1", "amplitude_slope": "1/M", "amplitude_curvature": "1/M²",
		"frequency": "1/M", "frequency_slope": "1/M²", "omega_phi": "1/M",
		"rstar": "M", "period_r": "M", "inclination": "degrees",
	} {
		if got := unitOf(key); got != want {
			t.Errorf("%s has the unit %q, want %q", key, got, want)
		}
	}
}
