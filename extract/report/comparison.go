package report

import (
	_ "embed"
	"errors"
	"fmt"
	"html/template"
	"io"
	"strings"

	"nullmark/extract/result"
)

//go:embed comparison.html
var comparisonLayout string

// Comparison writes the page that sets a model against a reference: the
// sentence, the table of modes, pictures, then peaks, marked times, flux,
// balance and how the model was read. Parts without data are left out; curves
// may be nil. The same input gives the same bytes and is not modified.
func Comparison(w io.Writer, c *result.Comparison, curves *result.Curves) error {
	if c == nil {
		return errors.New("report: there is no comparison to write a page about")
	}
	t := template.New("comparison").Funcs(template.FuncMap{"style": func() template.CSS { return template.CSS(style) }})
	for _, text := range []struct{ name, layout string }{{"page", layout}, {"comparison", comparisonLayout}} { // page defines the look of tables
		var err error
		if text.name == "page" {
			_, err = t.New(text.name).Parse(text.layout)
		} else {
			_, err = t.Parse(text.layout)
		}
		if err != nil {
			return fmt.Errorf("report: template of the %s: %w", text.name, err)
		}
	}
	if err := t.Execute(w, comparisonView(c, curves)); err != nil {
		return fmt.Errorf("report: writing the page: %w", err)
	}
	return nil
}

// comparisonPage is what the template is filled with.
type comparisonPage struct {
	Title, Verdict, Sentence, Class string
	More                            []string // shift, hints
	Warnings                        []string
	Modes                           []table
	Sentences                       []string
	Pictures                        []drawn
	Peaks, Marked                   []table
	Flux                            []table
	FluxSentence                    string
	Balance                         []table
	BalanceSentence, BalanceNote    string
	Views                           []table
	ViewsNote                       string
	Numbers                         []table
	Settings                        [][2]string
}

// verdictWord is a verdict as it stands on the page.
func verdictWord(v string) string {
	switch v {
	case result.Inside:
		return "inside the error bar"
	case result.Differs:
		return "differs"
	case result.CannotTell:
		return "cannot tell"
	}
	return clean(v)
}

func comparisonView(c *result.Comparison, curves *result.Curves) comparisonPage {
	p := comparisonPage{Verdict: capital(verdictWord(c.Overall.Verdict)), Sentence: clean(c.Overall.Sentence), Class: "unmet"}
	if c.Overall.Verdict == result.Inside {
		p.Class = "met"
	}
	name := clean(c.Model)
	if name == "" {
		name = "the model"
	}
	p.Title = capital(name) + " against the reference"
	if c.Title != "" {
		p.Title += ": " + clean(c.Title)
	}
	if s := c.Shift; s != nil {
		p.More = append(p.More, fmt.Sprintf("Before comparing, the model was taken %s M later and its orbital phase increased by %s rad: the shifts that fit best over u = %s … %s M.",
			plusMinus(s.Time, readable), plusMinus(s.Phase, readable), settingNumber(s.Window[0]), settingNumber(s.Window[1])))
	}
	for _, h := range c.Hints {
		p.More = append(p.More, "Another convention? "+clean(h)+" Nothing of the kind was applied.")
	}
	if c.Flux != nil {
		p.More = append(p.More, clean(c.Flux.Sentence))
		p.FluxSentence = clean(c.Flux.Sentence)
		p.Flux = comparedFluxTables(c.Flux)
	}
	if b := c.Balance; b != nil {
		p.More = append(p.More, clean(b.Sentence))
		p.BalanceSentence, p.BalanceNote = clean(b.Sentence), clean(b.Note)
		p.Balance = balanceTables(b)
	}
	for _, w := range c.Warnings {
		p.Warnings = append(p.Warnings, clean(w))
	}
	for _, m := range c.Modes {
		if m.Verdict != result.Inside || len(c.Modes) <= 6 { // the table says it of the others
			p.Sentences = append(p.Sentences, clean(m.Sentence))
		}
	}
	p.Modes = comparedModesTable(c.Modes)
	p.Peaks = peakTables(c.Modes)
	p.Marked = markedTables(c.Modes)
	p.Views, p.ViewsNote = viewTables(c)
	p.Numbers = numberTables(c.Numbers)
	p.Settings = settingsList(c)
	for _, f := range comparisonPictures(c, curves) {
		p.Pictures = append(p.Pictures, drawn{f.ID, f.Title, f.Caption, template.HTML(f.SVG)})
	}
	return p
}

func capital(s string) string {
	if s == "" {
		return s
	}
	r := []rune(s)
	return strings.ToUpper(string(r[0])) + string(r[1:])
}

// verdictCell stands out where something is wrong, in words and in weight.
func verdictCell(v string) cell {
	if v == result.Inside {
		return cell{"inside", ""}
	}
	return cell{verdictWord(v), "off"}
}

func pairHeads(text, unit string) []head {
	return []head{{Text: text, Unit: unit, Num: true}, {Text: "bar", Unit: unit, Num: true}}
}

// alone writes a value whose bar stands in its brackets only.
func alone(cells []cell, q *result.Q, n notation) []cell {
	all := value(cells, q, n)
	return all[:len(all)-1]
}

func comparedModesTable(modes []result.ModeComparison) []table {
	if len(modes) == 0 {
		return nil
	}
	t := table{ID: "compared-modes", Caption: "Differences by mode, model minus reference", Heads: []head{{Text: "l"}, {Text: "m"}, {Text: "verdict"}}}
	t.Heads = append(t.Heads, pairHeads("largest phase difference", "rad")...)
	t.Heads = append(t.Heads, head{Text: "phase drift", Unit: "rad/M", Num: true})
	t.Heads = append(t.Heads, pairHeads("largest amplitude difference", "relative")...)
	t.Heads = append(t.Heads, head{Text: "largest, in bars", Num: true})
	for i := range modes {
		m := &modes[i]
		r := row{Heads: []string{fmt.Sprint(m.L), fmt.Sprint(m.M)}, Cells: []cell{verdictCell(m.Verdict)}}
		var phase, drift, amp *result.Q
		if d := m.PhaseDifference; d != nil {
			phase, drift = &d.Max, &d.Slope
		}
		if d := m.AmplitudeDifference; d != nil {
			amp = &d.Max
		}
		r.Cells = value(r.Cells, phase, scientific)
		r.Cells = value(alone(r.Cells, drift, scientific), amp, scientific)
		r.Cells = append(r.Cells, cell{tidyExponent(fmt.Sprintf("%.2g", m.Significance)), "num"})
		t.Rows = append(t.Rows, r)
	}
	return level([]table{t})
}

func peakTables(modes []result.ModeComparison) []table {
	var out []table
	for _, m := range modes {
		if m.Peak == nil {
			continue
		}
		t := table{ID: fmt.Sprintf("peak-%d-%d", m.L, m.M), Caption: "Maximum of |r h| of mode " + modeName(m.L, m.M), Heads: []head{{Text: "quantity"}}}
		t.Heads = append(t.Heads, head{Text: "model", Num: true}, head{Text: "reference", Num: true})
		t.Heads = append(t.Heads, pairHeads("difference", "")...)
		for _, k := range []struct {
			name string
			of   func(*result.Peak) *result.Q
		}{
			{"time u (M)", func(p *result.Peak) *result.Q { return &p.U }},
			{"amplitude |r h|/μ", func(p *result.Peak) *result.Q { return &p.Amplitude }},
			{"frequency (rad/M)", func(p *result.Peak) *result.Q { return &p.Frequency }},
			{"curvature of the amplitude (1/M²)", func(p *result.Peak) *result.Q { return &p.AmplitudeCurvature }},
			{"slope of the frequency (rad/M²)", func(p *result.Peak) *result.Q { return &p.FrequencySlope }},
		} {
			r := row{Heads: []string{k.name}}
			r.Cells = alone(r.Cells, k.of(&m.Peak.Model), readable)
			r.Cells = alone(r.Cells, k.of(&m.Peak.Reference), readable)
			r.Cells = value(r.Cells, k.of(&m.Peak.Difference), readable)
			t.Rows = append(t.Rows, r)
		}
		out = append(out, t)
	}
	return level(out)
}

// markedTables lists the differences at marked times and over stages.
func markedTables(modes []result.ModeComparison) []table {
	var out []table
	for _, m := range modes {
		amp, phase := m.AmplitudeDifference, m.PhaseDifference
		if amp == nil {
			continue
		}
		t := table{ID: fmt.Sprintf("marked-%d-%d", m.L, m.M), Caption: "Mode " + modeName(m.L, m.M), Heads: []head{{Text: "when"}, {Text: "u", Unit: "M", Num: true}}}
		t.Heads = append(t.Heads, pairHeads("phase difference", "rad")...)
		t.Heads = append(t.Heads, pairHeads("amplitude difference", "relative")...)
		for _, a := range amp.At {
			r := row{Heads: []string{label(a.Marker)}, Cells: []cell{{settingNumber(a.U), "num"}}}
			var f *result.Q
			if phase != nil {
				for k := range phase.At {
					if phase.At[k].Marker == a.Marker {
						f = &phase.At[k].Value
					}
				}
			}
			q := a.Value
			r.Cells = value(value(r.Cells, f, scientific), &q, scientific)
			t.Rows = append(t.Rows, r)
		}
		for _, s := range []string{"inspiral", "plunge", "ringdown"} {
			q, ok := amp.ByStage[s]
			if !ok {
				continue
			}
			r := row{Heads: []string{s + ", largest"}, Cells: []cell{{missing, "num"}}}
			var f *result.Q
			if phase != nil {
				if x, ok := phase.ByStage[s]; ok {
					f = &x
				}
			}
			r.Cells = value(value(r.Cells, f, scientific), &q, scientific)
			t.Rows = append(t.Rows, r)
		}
		out = append(out, t)
	}
	return level(out)
}

func viewTables(c *result.Comparison) ([]table, string) {
	t := table{ID: "mismatch", Caption: "Mismatch after the best time and phase shift", Heads: []head{{Text: "signal"}}}
	t.Heads = append(t.Heads, pairHeads("mismatch", "")...)
	t.Heads = append(t.Heads, pairHeads("signal-to-noise ratio from which it could be noticed", "")...)
	add := func(name string, m *result.Q, s *result.Q, is string) {
		if m == nil {
			return
		}
		r := row{Heads: []string{name}}
		r.Cells = value(r.Cells, m, scientific)
		switch {
		case s == nil:
			r.Cells = append(r.Cells, cell{"none", "num value"}, cell{missing, "num bar"})
		case is != "":
			r.Cells = append(r.Cells, cell{is + " " + tidyExponent(fmt.Sprintf("%.3g", s.Value)), "num value"}, cell{missing, "num bar"})
		default:
			r.Cells = value(r.Cells, s, readable)
		}
		t.Rows = append(t.Rows, r)
	}
	for i := range c.Overall.Views {
		v := &c.Overall.Views[i]
		add("all modes, "+clean(v.From), &v.Mismatch, v.SNRVisible, v.SNRIs)
	}
	for i := range c.Modes {
		m := &c.Modes[i]
		add("mode "+modeName(m.L, m.M), m.Mismatch, m.SNRVisible, m.SNRIs)
	}
	if len(t.Rows) == 0 {
		return nil, ""
	}
	noise := "flat noise"
	if c.Settings.Noise != "flat" {
		noise = fmt.Sprintf("the noise of %s at a total mass of %s solar masses", clean(c.Settings.Noise), settingNumber(c.Settings.TotalMass))
	}
	return level([]table{t}), fmt.Sprintf("With %s. A difference is taken to be invisible while the mismatch stays below D/(2 SNR²), here with D = %d (common practice, no source).", noise, c.Settings.Parameters)
}

func comparedFluxTables(f *result.FluxComparison) []table {
	var out []table
	for k, c := range f.Curves {
		name := clean(c.Of) + ", all modes"
		if c.L > 0 {
			name = clean(c.Of) + ", mode " + modeName(c.L, c.M)
		}
		t := table{ID: fmt.Sprint("flux-", k), Caption: "Flux of " + name, Heads: []head{{Text: "x", Num: true}}}
		t.Heads = append(t.Heads, pairHeads("reference over its leading power of x", "")...)
		t.Heads = append(t.Heads, pairHeads("model over reference, less 1", "%")...)
		for i := range c.X {
			r := row{Heads: []string{settingNumber(c.X[i])}}
			n, q := c.Newtonian[i], result.Q{Value: 100 * (c.Ratio[i].Value - 1), Error: 100 * c.Ratio[i].Error}
			r.Cells = value(value(r.Cells, &n, readable), &q, readable)
			t.Rows = append(t.Rows, r)
		}
		out = append(out, t)
	}
	return level(out)
}

func balanceTables(b *result.Balance) []table {
	t := table{ID: "balance", Caption: "Averages: what the model’s dynamics lose, and what was measured at infinity and at the horizon", Heads: []head{{Text: "of"}}}
	for _, h := range []string{"lost by the orbit", "measured", "residual"} {
		t.Heads = append(t.Heads, pairHeads(h, "")...)
	}
	for _, k := range []struct {
		name string
		of   *result.BalanceOf
	}{{"energy (" + energyUnit(rate) + ")", b.Energy}, {"angular momentum (" + angularUnit(rate) + ")", b.AngMom}} {
		if k.of == nil {
			continue
		}
		a := k.of.Average
		r := row{Heads: []string{k.name}}
		for _, q := range []*result.Q{&a.Model, &a.Measured, &a.Residual} {
			r.Cells = value(r.Cells, q, scientific)
		}
		t.Rows = append(t.Rows, r)
	}
	return level([]table{t})
}

func numberTables(n []result.NumberPair) []table {
	if len(n) == 0 {
		return nil
	}
	t := table{ID: "numbers", Caption: "Certified numbers of both results", Heads: []head{{Text: "number"}, {Text: "verdict"}}}
	for _, h := range []string{"first", "reference", "difference"} {
		t.Heads = append(t.Heads, pairHeads(h, "")...)
	}
	for i := range n {
		r := row{Heads: []string{clean(n[i].Name)}, Cells: []cell{verdictCell(n[i].Verdict)}}
		for _, q := range []*result.Q{&n[i].Model, &n[i].Reference, &n[i].Difference} {
			r.Cells = value(r.Cells, q, scientific)
		}
		t.Rows = append(t.Rows, r)
	}
	return level([]table{t})
}

func settingsList(c *result.Comparison) [][2]string {
	s := c.Settings
	out := [][2]string{{"quantity", s.Quantity}, {"phase", s.Phase}, {"phase_of", s.PhaseOf}, {"time_is", s.TimeIs}, {"amplitudes per", s.Per}, {"align", s.Align}}
	if c.Range[1] > c.Range[0] {
		out = append(out, [2]string{"compared", fmt.Sprintf("u = %s … %s M; the start-up of the reference is never compared", settingNumber(c.Range[0]), settingNumber(c.Range[1]))})
	}
	for _, r := range s.Read {
		out = append(out, [2]string{"the file’s numbers", r})
	}
	for i := range out {
		out[i][1] = clean(out[i][1])
	}
	return out
}

// ComparisonText writes what a terminal shows of a comparison: the sentence,
// the hints, a line a mode that does not agree, flux, balance, warnings.
func ComparisonText(w io.Writer, c *result.Comparison) error {
	var b strings.Builder
	line := func(s string) {
		if s != "" {
			b.WriteString(clean(s) + "\n")
		}
	}
	line(c.Overall.Sentence)
	if c.Overall.Mismatch != nil {
		s := "Mismatch of the sum, the larger of face-on and edge-on: " + plusMinus(*c.Overall.Mismatch, scientific)
		if q := c.Overall.SNRVisible; q != nil {
			s += "; it could be noticed from a signal-to-noise ratio of "
			if c.Overall.SNRIs != "" {
				s += c.Overall.SNRIs + " "
			}
			s += tidyExponent(fmt.Sprintf("%.3g", q.Value))
		}
		line(s + ".")
	}
	for _, h := range c.Hints {
		line("Another convention? " + h + " Nothing of the kind was applied.")
	}
	if s := c.Shift; s != nil {
		line(fmt.Sprintf("Shifted before comparing: time %s M, orbital phase %s rad.", plusMinus(s.Time, readable), plusMinus(s.Phase, readable)))
	}
	if len(c.Modes) > 1 {
		for _, m := range c.Modes {
			if m.Verdict != result.Inside {
				line("  " + m.Sentence)
			}
		}
	}
	if c.Flux != nil {
		line(c.Flux.Sentence)
	}
	if c.Balance != nil {
		line(c.Balance.Sentence)
	}
	apart := 0
	for _, n := range c.Numbers {
		if n.Verdict == result.Differs {
			apart++
			line(fmt.Sprintf("  %s differs: by %s", n.Name, plusMinus(n.Difference, scientific)))
		}
	}
	if n := len(c.Numbers); n > 0 {
		line(fmt.Sprintf("%d of %s differ.", apart, count(n, "certified number")))
	}
	for _, s := range c.Warnings {
		line("Warning: " + s)
	}
	_, err := io.WriteString(w, b.String())
	return err
}
