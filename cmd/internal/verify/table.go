package verify

import (
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"

	"nullmark/extract/result"
)

// Table writes the outcome for a reader: the checks by group, then the sources
// in full and what the columns mean. colour marks failures in red as well; the
// words carry the same.
func (o *Outcome) Table(w io.Writer, colour bool) error {
	var b strings.Builder
	head := []string{"check", "source", "published", "ours", "error bar", "apart", "", "s"}
	lines := make([][]string, 0, len(o.Checks))
	for _, r := range o.Checks {
		lines = append(lines, r.cells())
	}
	width := make([]int, len(head))
	for _, l := range append([][]string{head}, lines...) {
		for i, cell := range l {
			width[i] = max(width[i], utf8.RuneCountInString(cell))
		}
	}
	write := func(cells []string) {
		for i, cell := range cells {
			pad := strings.Repeat(" ", width[i]-utf8.RuneCountInString(cell))
			switch {
			case colour && cell == failed:
				b.WriteString("\x1b[1;31m" + cell + "\x1b[0m" + pad)
			case i >= 4 && i != 6:
				b.WriteString(pad + cell)
			case i == len(cells)-1:
				b.WriteString(cell)
			default:
				b.WriteString(cell + pad)
			}
			if i < len(cells)-1 {
				b.WriteString("  ")
			}
		}
		b.WriteByte('\n')
	}
	write(head)
	group := ""
	for i, r := range o.Checks {
		if r.Group != group {
			group = r.Group
			fmt.Fprintf(&b, "\n%s\n", strings.ToUpper(group))
		}
		write(lines[i])
		if r.Failure != "" {
			fmt.Fprintf(&b, "    %s\n", r.Failure)
		}
	}
	b.WriteString("\nSources\n")
	told := map[string]bool{}
	for _, r := range o.Checks {
		if !told[r.Source] {
			told[r.Source] = true
			b.WriteString(wrapped("  "+r.Source+": "+r.Citation+".", 100, "    "))
		}
	}
	b.WriteString("\n" + wrapped(legend, 100, "") + "\n" + o.verdict() + "\n")
	_, err := io.WriteString(w, b.String())
	return err
}

// legend says what the columns mean.
const legend = "Units G = c = M = 1, fluxes in (mu/M)^2, m and -m together, frequencies in 1/M. " +
	"apart = |ours - published| in units of our error bar plus what the source claims for its digits; a check passes up to 1. " +
	"A case that several checks need is run once, for the first of them (column s: seconds)."

// verdict sums the outcome up.
func (o *Outcome) verdict() string {
	if o.Passed {
		return fmt.Sprintf("%d checks passed in %.1f s.", len(o.Checks), o.Seconds)
	}
	return fmt.Sprintf("%d of %d checks FAILED (%.1f s).", o.Failed, len(o.Checks), o.Seconds)
}

// wrapped breaks a paragraph at spaces into lines of at most width characters,
// the later ones indented.
func wrapped(text string, width int, indent string) string {
	lead := text[:len(text)-len(strings.TrimLeft(text, " "))]
	line, lines := lead, []string(nil)
	for i, word := range strings.Fields(text) {
		if i > 0 && utf8.RuneCountInString(line)+1+utf8.RuneCountInString(word) > width {
			lines = append(lines, line)
			line = indent + word
			continue
		}
		if i > 0 {
			line += " "
		}
		line += word
	}
	return strings.Join(append(lines, line), "\n") + "\n"
}

const (
	passed = "pass"
	failed = "FAIL"
)

func (r Row) cells() []string {
	verdict := failed
	if r.Pass {
		verdict = passed
	}
	cells := []string{"  " + r.Name, r.Source, digits(result.Q{Value: r.Published, Error: r.Tolerance}), "-", "-", "-", verdict,
		fmt.Sprintf("%.1f", r.Seconds)}
	if r.Ours != nil {
		cells[3] = digits(*r.Ours)
		cells[4] = "0"
		if r.Ours.Error > 0 {
			cells[4] = fmt.Sprintf("%.0e", r.Ours.Error)
		}
	}
	if r.Deviation != nil {
		switch d := *r.Deviation; {
		case d < 100:
			cells[5] = fmt.Sprintf("%.2f", d)
		default:
			cells[5] = fmt.Sprintf("%.1e", d)
		}
	}
	return cells
}

// digits writes a number to one digit beyond the first digit of its bar, and
// to at most 12.
func digits(q result.Q) string {
	if q.Value == 0 {
		return "0"
	}
	n := 12
	if q.Error > 0 {
		n = int(math.Floor(math.Log10(math.Abs(q.Value)))-math.Floor(math.Log10(q.Error))) + 2
	}
	n = min(max(n, 2), 12)
	return strconv.FormatFloat(q.Value, 'g', n, 64)
}
