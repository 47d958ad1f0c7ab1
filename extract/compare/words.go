package compare

import (
	"fmt"
	"math"
	"sort"
	"strconv"
	"strings"

	"nullmark/extract/result"
)

func modeName(l, m int) string { return fmt.Sprintf("(%d,%d)", l, m) }

// list joins names with commas; more than six are counted.
func list(s []string) string {
	if len(s) > 6 {
		return strings.Join(s[:6], ", ") + fmt.Sprintf(" and %d more", len(s)-6)
	}
	return strings.Join(s, ", ")
}

func short(x float64) string { return tidy(strconv.FormatFloat(x, 'g', 6, 64)) }

// number writes a value to three digits, and a sign in front.
func signed(x float64) string {
	s := plain(x)
	if x >= 0 {
		s = "+" + s
	}
	return s
}

func plain(x float64) string {
	if a := math.Abs(x); a != 0 && (a < 1e-3 || a >= 1e5) {
		return tidy(strconv.FormatFloat(x, 'e', 2, 64))
	}
	return strconv.FormatFloat(x, 'g', 4, 64)
}

// tidy turns 1e-06 into 1e-6 and 1e+12 into 1e12.
func tidy(s string) string {
	mantissa, power, ok := strings.Cut(s, "e")
	if !ok {
		return s
	}
	e, err := strconv.Atoi(power)
	if err != nil {
		return s
	}
	return mantissa + "e" + strconv.Itoa(e)
}

// barText writes a bar to two digits.
func barText(x float64) string { return tidy(strconv.FormatFloat(x, 'g', 2, 64)) }

func withBar(q result.Q) string { return signed(q.Value) + " ± " + barText(q.Error) }

func sortedKeys(m map[string]float64) []string {
	keys := make([]string, 0, len(m))
	for k := range m {
		keys = append(keys, k)
	}
	sort.Strings(keys)
	return keys
}

func byTime(m []marker) {
	sort.SliceStable(m, func(i, j int) bool { return m[i].u < m[j].u })
}
