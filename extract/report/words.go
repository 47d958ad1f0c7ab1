package report

import (
	"fmt"
	"strings"
	"unicode"

	"nullmark/extract/result"
)

// clean makes any string printable: what is no valid UTF-8 and what no screen
// or XML reader should be handed (control characters, direction overrides)
// becomes U+FFFD; line breaks and tabs become spaces.
func clean(s string) string {
	s = strings.ToValidUTF8(s, "\uFFFD")
	return strings.Map(func(r rune) rune {
		switch {
		case r == '\n' || r == '\t' || r == '\r':
			return ' '
		case !unicode.IsPrint(r) && !unicode.Is(unicode.Zs, r):
			return '\uFFFD'
		}
		return r
	}, s)
}

const (
	rate  = "rate"
	total = "total"
)

// energyUnit and angularUnit name the units of fluxes and of totals.
func energyUnit(measure string) string {
	if measure == total {
		return "μ²/M"
	}
	return "μ²/M²"
}

func angularUnit(measure string) string {
	if measure == total {
		return "μ²"
	}
	return "μ²/M"
}

// measureOf is what the numbers of this result are: rate or total.
func measureOf(r *result.Result) string {
	if r.Total != nil && r.Total.Measure != "" {
		return r.Total.Measure
	}
	for _, m := range r.Modes {
		if m.Measure != "" {
			return m.Measure
		}
	}
	return rate
}

// unmet counts the modes of which not every number reached what was asked.
func unmet(r *result.Result) int {
	n := 0
	for _, m := range r.Modes {
		if !m.Met {
			n++
		}
	}
	return n
}

// count writes "1 mode", "7 modes".
func count(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}

// wholeMotion says whether totals hold an estimate of what is radiated outside the
// evolved range: then they are those of the whole motion.
func wholeMotion(r *result.Result) bool {
	for _, m := range r.Modes {
		if _, there := m.Budget["outside the range"]; there {
			return true
		}
	}
	return false
}

// lossSentence says what leaves the orbit: the answer to the first question.
func lossSentence(r *result.Result) string {
	opening, style := "The orbit loses energy at the rate", scientific
	if measureOf(r) == total {
		opening, style = "After the start-up the orbit loses the energy", readable
		if wholeMotion(r) {
			opening = "Over its whole motion the orbit loses the energy"
		}
	}
	unit := energyUnit(measureOf(r))
	if t := r.Total; t != nil && (t.Infinity != nil || t.Horizon != nil) {
		var ends []string
		if t.Infinity != nil {
			ends = append(ends, plusMinus(t.Infinity.Energy, style)+" "+unit+" to null infinity")
		}
		if t.Horizon != nil {
			end := plusMinus(t.Horizon.Energy, style) + " " + unit + " into the hole"
			if t.Horizon.Energy.Value < 0 {
				end += " (negative: it gains there)"
			}
			ends = append(ends, end)
		}
		return fmt.Sprintf("%s %s.", opening, strings.Join(ends, " and "))
	}
	if len(r.Ringing) > 0 {
		g := r.Ringing[0]
		return fmt.Sprintf("The (%d,%d) field rings with M ω = %s − i %s (overtone n = %d, at %s).",
			g.L, g.M, plusMinus(g.Re, readable), plusMinus(result.Q{Value: -g.Im.Value, Error: g.Im.Error}, readable), g.N, clean(g.Where))
	}
	if len(r.Tail) > 0 {
		g := r.Tail[0]
		return fmt.Sprintf("The (%d,%d) field decays at late times with the power %s (at %s).", g.L, g.M, plusMinus(g.Exponent, readable), clean(g.Where))
	}
	return ""
}

// plusMinus writes value and bar for a sentence: "6.150372549e-5 ± 4.3e-13".
func plusMinus(q result.Q, n notation) string {
	f := write(q, n)
	if !f.Good {
		return f.Value
	}
	if f.Bar == "0" {
		return f.Value + " (exact)"
	}
	open, shut := strings.IndexByte(f.Value, '('), strings.IndexByte(f.Value, ')')
	return f.Value[:open] + f.Value[shut+1:] + " ± " + f.Bar
}

// metSentence says whether the asked accuracy was reached, and if not, where
// it failed worst.
func metSentence(r *result.Result) string {
	a := r.Accuracy
	asked := askedNumber(a.Asked)
	worst := ""
	if a.Worst.What != "" {
		where := ""
		if a.Worst.L > 0 {
			where = " of mode " + modeName(a.Worst.L, a.Worst.M)
		}
		worst = fmt.Sprintf("the worst is the %s%s with a relative bar of %s", clean(a.Worst.What), where, roughNumber(a.Worst.Relative))
	}
	switch {
	case a.Met && worst != "":
		return fmt.Sprintf("Every mode reached the asked relative accuracy %s; %s.", asked, worst)
	case a.Met:
		return fmt.Sprintf("Every mode reached the asked relative accuracy %s.", asked)
	}
	s := fmt.Sprintf("The asked relative accuracy %s was not reached", asked)
	if n := unmet(r); n > 0 {
		s = fmt.Sprintf("%s of %d did not reach the asked relative accuracy %s", count(n, "mode"), len(r.Modes), asked)
	}
	if worst != "" {
		s += "; " + worst
	}
	return s + "."
}

// countsSentence says what a row counts, when all rows agree.
func countsSentence(modes []result.Mode) string {
	counts := ""
	for i, m := range modes {
		if i > 0 && m.Counts != counts {
			return ""
		}
		counts = m.Counts
	}
	switch counts {
	case "":
		return ""
	case "both signs of m":
		return "Each row counts m and −m together; the strain is that of m itself."
	case "this m":
		return "Each row counts the given m alone."
	}
	return "Each row counts: " + clean(counts) + "."
}
