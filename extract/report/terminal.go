package report

import (
	"errors"
	"fmt"
	"io"
	"math"
	"sort"
	"strings"
	"unicode/utf8"

	"nullmark/extract/result"
)

// terminalModes is how many modes the short table shows.
const terminalModes = 10

// Terminal writes the short table that ends a run: the total and the strongest
// modes, each value with its bar, then whether the asked accuracy was reached.
// Lines are kept to width columns (0 means 80) as far as a number allows: the
// two ends stand beside each other where both fit and below each other where
// they do not. With colour the verdict is set in colour as well; every line
// reads the same without. It returns an error when r is nil or w fails.
func Terminal(w io.Writer, r *result.Result, width int, colour bool) error {
	if r == nil {
		return errors.New("report: there is no result to print")
	}
	if width <= 0 {
		width = 80
	}
	var lines []string
	if r.Title != "" {
		lines = append(lines, wrap(clean(r.Title), width)...)
	}
	lines = append(lines, fluxLines(r, width)...)
	lines = append(lines, fitLines(r)...)
	verdict := "Asked accuracy met. "
	code := "\x1b[32m"
	if !r.Accuracy.Met {
		verdict, code = "Asked accuracy NOT met. ", "\x1b[1;31m"
	}
	for _, line := range wrap(verdict+metSentence(r), width) {
		if colour {
			line = code + line + "\x1b[0m"
		}
		lines = append(lines, line)
	}
	for _, warning := range r.Warnings {
		lines = append(lines, wrap("Warning: "+clean(warning), width)...)
	}
	if _, err := io.WriteString(w, strings.Join(lines, "\n")+"\n"); err != nil {
		return fmt.Errorf("report: printing the table: %w", err)
	}
	return nil
}

// fluxLines is the table of energies, one block or one for each end.
func fluxLines(r *result.Result, width int) []string {
	type end struct {
		name string
		of   func(inf, hor *result.Flux) *result.Flux
	}
	ends := []end{
		{"to null infinity", func(inf, _ *result.Flux) *result.Flux { return inf }},
		{"into the horizon", func(_, hor *result.Flux) *result.Flux { return hor }},
	}
	type source struct {
		name     string
		inf, hor *result.Flux
	}
	var rows []source
	if t := r.Total; t != nil && (t.Infinity != nil || t.Horizon != nil) {
		rows = append(rows, source{"total", t.Infinity, t.Horizon})
	}
	modes := append([]result.Mode(nil), r.Modes...)
	size := func(m result.Mode) float64 {
		v := 0.0
		for _, f := range []*result.Flux{m.Infinity, m.Horizon} {
			if f != nil && finite(f.Energy.Value) {
				v = math.Max(v, math.Abs(f.Energy.Value))
			}
		}
		return v
	}
	sort.SliceStable(modes, func(a, b int) bool { return size(modes[a]) > size(modes[b]) })
	hidden := 0
	for _, m := range modes {
		if m.Infinity == nil && m.Horizon == nil {
			continue
		}
		if len(rows) > terminalModes {
			hidden++
			continue
		}
		name := modeName(m.L, m.M)
		if !m.Met {
			name += " not met"
		}
		rows = append(rows, source{name, m.Infinity, m.Horizon})
	}
	var used []end
	for _, e := range ends {
		for _, s := range rows {
			if e.of(s.inf, s.hor) != nil {
				used = append(used, e)
				break
			}
		}
	}
	if len(used) == 0 {
		return nil
	}
	block := func(ends []end) []string {
		grid := [][]string{{""}}
		for _, e := range ends {
			grid[0] = append(grid[0], e.name, "± bar")
		}
		for _, s := range rows {
			line := []string{s.name}
			for _, e := range ends {
				f := e.of(s.inf, s.hor)
				if f == nil {
					line = append(line, missing, missing)
					continue
				}
				text := write(f.Energy, scientific)
				bar := text.Bar
				if !text.Good {
					bar = missing
				}
				line = append(line, text.Value, bar)
			}
			grid = append(grid, line)
		}
		for column := 1; column < len(grid[0]); column += 2 {
			levelColumn(grid, column)
		}
		return aligned(grid, func(column int) bool { return column%2 == 1 })
	}
	title := "Energy " + lossWord(measureOf(r)) + " in " + energyUnit(measureOf(r))
	if countsSentence(r.Modes) != "" && r.Modes[0].Counts == "both signs of m" {
		title += ", m and −m together"
	}
	out := append(wrap(title, width), block(used)...)
	if len(used) == 2 && widest(out) > width {
		out = wrap(title, width)
		for _, e := range used {
			out = append(out, block([]end{e})...)
		}
	}
	if hidden > 0 {
		out = append(out, wrap(count(hidden, "more mode")+" in flux.csv and in report.html", width)...)
	}
	return out
}

// fitLines prints fitted frequencies and decay powers.
func fitLines(r *result.Result) []string {
	var out []string
	if len(r.Ringing) > 0 {
		grid := [][]string{{"ringing", "n", "where", "Re ω (1/M)", "± bar", "Im ω (1/M)", "± bar"}}
		for _, g := range r.Ringing {
			re, im := write(g.Re, readable), write(g.Im, readable)
			grid = append(grid, []string{modeName(g.L, g.M), fmt.Sprint(g.N), clean(g.Where), re.Value, re.Bar, im.Value, im.Bar})
		}
		levelColumn(grid, 3)
		levelColumn(grid, 5)
		out = append(out, aligned(grid, func(column int) bool { return column == 2 || column == 3 || column == 5 })...)
	}
	if len(r.Tail) > 0 {
		grid := [][]string{{"decay", "where", "exponent", "± bar"}}
		for _, g := range r.Tail {
			e := write(g.Exponent, readable)
			grid = append(grid, []string{modeName(g.L, g.M), clean(g.Where), e.Value, e.Bar})
		}
		levelColumn(grid, 2)
		out = append(out, aligned(grid, func(column int) bool { return column < 3 })...)
	}
	return out
}

// levelColumn puts a blank before the values of a column that holds signs
// elsewhere, so that decimal points stand below each other.
func levelColumn(grid [][]string, column int) {
	signed := false
	for _, line := range grid[1:] {
		signed = signed || strings.HasPrefix(line[column], "-")
	}
	for _, line := range grid {
		if signed && !strings.HasPrefix(line[column], "-") {
			line[column] = " " + line[column]
		}
	}
}

// aligned sets a grid of cells in columns, the first and those that left names
// to the left, the others to the right.
func aligned(grid [][]string, left func(column int) bool) []string {
	var widths []int
	for _, line := range grid {
		for i, c := range line {
			if i == len(widths) {
				widths = append(widths, 0)
			}
			widths[i] = max(widths[i], utf8.RuneCountInString(c))
		}
	}
	var out []string
	for _, line := range grid {
		var b strings.Builder
		for i, c := range line {
			space := strings.Repeat(" ", widths[i]-utf8.RuneCountInString(c))
			switch {
			case i == 0:
				b.WriteString(c + space)
			case left(i):
				b.WriteString("  " + c + space)
			default:
				b.WriteString("  " + space + c)
			}
		}
		out = append(out, strings.TrimRight(b.String(), " "))
	}
	return out
}

func widest(lines []string) int {
	w := 0
	for _, l := range lines {
		w = max(w, utf8.RuneCountInString(l))
	}
	return w
}

// wrap breaks text between words so that lines stay within width where words allow.
func wrap(text string, width int) []string {
	var out []string
	line := ""
	for word := range strings.FieldsSeq(text) {
		switch {
		case line == "":
			line = word
		case utf8.RuneCountInString(line)+1+utf8.RuneCountInString(word) <= width:
			line += " " + word
		default:
			out, line = append(out, line), word
		}
	}
	return append(out, line)
}
