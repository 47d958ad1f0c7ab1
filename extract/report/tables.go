package report

import (
	"sort"
	"strconv"
	"strings"

	"nullmark/extract/result"
)

// value appends the two cells of a number: value and bar.
func value(cells []cell, q *result.Q, n notation) []cell {
	if q == nil {
		return append(cells, cell{missing, "num value"}, cell{missing, "num bar"})
	}
	f := write(*q, n)
	bar := f.Bar
	if !f.Good {
		bar = missing
	}
	return append(cells, cell{f.Value, "num value"}, cell{bar, "num bar"})
}

// level puts a blank before the values of a column that holds signs elsewhere,
// so that their decimal points stand below each other, and sets their headings
// to the left as well.
func level(tables []table) []table {
	for _, t := range tables {
		for column := 0; len(t.Rows) > 0 && column < len(t.Rows[0].Cells); column++ {
			signed := false
			t.Heads[len(t.Rows[0].Heads)+column].Left = t.Rows[0].Cells[column].Class == "num value"
			for _, r := range t.Rows {
				signed = signed || r.Cells[column].Class == "num value" && strings.HasPrefix(r.Cells[column].Text, "-")
			}
			for _, r := range t.Rows {
				if c := &r.Cells[column]; signed && c.Class == "num value" && !strings.HasPrefix(c.Text, "-") {
					c.Text = "\u00a0" + c.Text
				}
			}
		}
	}
	return tables
}

// quantity picks energy or angular momentum of a flux that may be absent.
type quantity struct {
	name, id string
	unit     func(measure string) string
	of       func(*result.Flux) *result.Q
}

func quantities() []quantity {
	return []quantity{
		{"Energy", "energy", energyUnit, func(f *result.Flux) *result.Q {
			if f == nil {
				return nil
			}
			return &f.Energy
		}},
		{"Angular momentum", "angular", angularUnit, func(f *result.Flux) *result.Q {
			if f == nil {
				return nil
			}
			return &f.AngularMomentum
		}},
	}
}

// lossWord names what a number counts: a rate or a total (from when on, the
// conventions say).
func lossWord(measure string) string {
	if measure == total {
		return "radiated in all"
	}
	return "per coordinate time"
}

// endsTable lays two fluxes out: a row an end, columns energy and angular momentum.
func endsTable(id, caption, measure string, infinity, horizon *result.Flux) []table {
	if infinity == nil && horizon == nil {
		return nil
	}
	t := table{ID: id, Caption: caption, Heads: []head{{Text: "where"}}}
	for _, q := range quantities() {
		t.Heads = append(t.Heads, head{Text: q.name + " " + lossWord(measure), Unit: q.unit(measure), Num: true}, head{Text: "bar", Unit: q.unit(measure), Num: true})
	}
	add := func(name string, f *result.Flux) {
		if f == nil {
			return
		}
		r := row{Heads: []string{name}}
		for _, q := range quantities() {
			r.Cells = value(r.Cells, q.of(f), scientific)
		}
		t.Rows = append(t.Rows, r)
	}
	add("to null infinity", infinity)
	add("into the horizon", horizon)
	return []table{t}
}

// fluxTables makes the tables of energy and of angular momentum by mode.
func fluxTables(r *result.Result) []table {
	hasInf, hasHor, parity, sameCounts := false, false, false, countsSentence(r.Modes) != ""
	for _, m := range r.Modes {
		hasInf = hasInf || m.Infinity != nil
		hasHor = hasHor || m.Horizon != nil
		parity = parity || m.Parity != ""
	}
	if !hasInf && !hasHor {
		return nil
	}
	measure := measureOf(r)
	var out []table
	for _, q := range quantities() {
		t := table{ID: "modes-" + q.id, Caption: q.name + " by mode, " + lossWord(measure), Heads: []head{{Text: "l"}, {Text: "m"}}}
		if parity {
			t.Heads = append(t.Heads, head{Text: "parity"})
		}
		if !sameCounts {
			t.Heads = append(t.Heads, head{Text: "counts"})
		}
		if hasInf {
			t.Heads = append(t.Heads, head{Text: "to null infinity", Unit: q.unit(measure), Num: true}, head{Text: "bar", Unit: q.unit(measure), Num: true})
		}
		if hasHor {
			t.Heads = append(t.Heads, head{Text: "into the horizon", Unit: q.unit(measure), Num: true}, head{Text: "bar", Unit: q.unit(measure), Num: true})
		}
		t.Heads = append(t.Heads, head{Text: "asked accuracy"})
		for _, m := range r.Modes {
			line := row{Heads: []string{strconv.Itoa(m.L), strconv.Itoa(m.M)}}
			if parity {
				line.Cells = append(line.Cells, cell{clean(m.Parity), ""})
			}
			if !sameCounts {
				line.Cells = append(line.Cells, cell{clean(m.Counts), ""})
			}
			if hasInf {
				line.Cells = value(line.Cells, q.of(m.Infinity), scientific)
			}
			if hasHor {
				line.Cells = value(line.Cells, q.of(m.Horizon), scientific)
			}
			line.Cells = append(line.Cells, verdict(m))
			t.Rows = append(t.Rows, line)
		}
		out = append(out, t)
	}
	return out
}

// verdict is the cell that says whether a mode reached what was asked.
func verdict(m result.Mode) cell {
	if m.Met {
		return cell{"met", "met"}
	}
	if m.Why == "" {
		return cell{"NOT met", "unmet"}
	}
	return cell{"NOT met: " + clean(m.Why), "unmet"}
}

func strainTable(r *result.Result) []table {
	t := table{ID: "modes-strain", Caption: "Strain in the particle’s phase, r h e^{i m φp(u)}/μ, at null infinity",
		Heads: []head{{Text: "l"}, {Text: "m"}, {Text: "real part", Unit: "1", Num: true}, {Text: "bar", Unit: "1", Num: true}, {Text: "imaginary part", Unit: "1", Num: true}, {Text: "bar", Unit: "1", Num: true}}}
	for _, m := range r.Modes {
		if m.Strain == nil {
			continue
		}
		line := row{Heads: []string{strconv.Itoa(m.L), strconv.Itoa(m.M)}}
		line.Cells = value(line.Cells, &m.Strain.Re, readable)
		line.Cells = value(line.Cells, &m.Strain.Im, readable)
		t.Rows = append(t.Rows, line)
	}
	if len(t.Rows) == 0 {
		return nil
	}
	return []table{t}
}

func perMTables(r *result.Result) []table {
	hasInf, hasHor := false, false
	for _, m := range r.PerM {
		hasInf = hasInf || m.Infinity != nil
		hasHor = hasHor || m.Horizon != nil
	}
	if !hasInf && !hasHor {
		return nil
	}
	measure := measureOf(r)
	var out []table
	for _, q := range quantities() {
		t := table{ID: "per-m-" + q.id, Caption: q.name + " summed over l at each m, " + lossWord(measure), Heads: []head{{Text: "m"}}}
		if hasInf {
			t.Heads = append(t.Heads, head{Text: "to null infinity", Unit: q.unit(measure), Num: true}, head{Text: "bar", Unit: q.unit(measure), Num: true})
		}
		if hasHor {
			t.Heads = append(t.Heads, head{Text: "into the horizon", Unit: q.unit(measure), Num: true}, head{Text: "bar", Unit: q.unit(measure), Num: true})
		}
		t.Heads = append(t.Heads, head{Text: "sum over l"})
		for _, m := range r.PerM {
			line := row{Heads: []string{strconv.Itoa(m.M)}}
			if hasInf {
				line.Cells = value(line.Cells, q.of(m.Infinity), scientific)
			}
			if hasHor {
				line.Cells = value(line.Cells, q.of(m.Horizon), scientific)
			}
			if m.LConverged {
				line.Cells = append(line.Cells, cell{"complete", "met"})
			} else {
				line.Cells = append(line.Cells, cell{"larger l missing", "met"})
			}
			t.Rows = append(t.Rows, line)
		}
		out = append(out, t)
	}
	return out
}

func peakTable(r *result.Result) []table {
	t := table{ID: "peaks", Caption: "The maximum of |r h/μ| of each mode",
		Heads: []head{{Text: "l"}, {Text: "m"}, {Text: "number"}, {Text: "unit"}, {Text: "value", Unit: "", Num: true}, {Text: "bar", Unit: "", Num: true}}}
	for _, m := range r.Modes {
		if m.Peak == nil {
			continue
		}
		add := func(name, unit string, q *result.Q) {
			line := row{Heads: []string{strconv.Itoa(m.L), strconv.Itoa(m.M)}}
			line.Cells = value([]cell{{name, ""}, {unit, ""}}, q, readable)
			t.Rows = append(t.Rows, line)
		}
		p := m.Peak
		add("retarded time of the peak", "M", &p.U)
		if p.Delay != nil {
			add("delay after the peak of the orbital frequency", "M", p.Delay)
		}
		add("amplitude", "1", &p.Amplitude)
		add("frequency", "1/M", &p.Frequency)
		add("curvature of the amplitude", "1/M²", &p.AmplitudeCurvature)
		add("slope of the frequency", "1/M²", &p.FrequencySlope)
		for _, key := range sortedKeys(p.AtLightRing) {
			q := p.AtLightRing[key]
			add("at the light-ring crossing: "+label(key), unitOf(key), &q)
		}
	}
	if len(t.Rows) == 0 {
		return nil
	}
	return []table{t}
}

func recoilTable(r *result.Result) []table {
	if r.Total == nil || r.Total.Recoil == nil {
		return nil
	}
	k := r.Total.Recoil
	t := table{ID: "recoil", Caption: "Recoil of the whole system", Heads: []head{{Text: "component"}, {Text: "value", Unit: "μ²/M²", Num: true}, {Text: "bar", Unit: "μ²/M²", Num: true}}}
	for _, e := range []struct {
		name string
		q    result.Q
	}{{"x", k.X}, {"y", k.Y}, {"speed", k.Speed}} {
		t.Rows = append(t.Rows, row{Heads: []string{e.name}, Cells: value(nil, &e.q, scientific)})
	}
	return []table{t}
}

func spectrumTable(r *result.Result) []table {
	if r.Total == nil || r.Total.SpectrumPeak == nil {
		return nil
	}
	t := table{ID: "spectrum-peak", Caption: "Where the energy spectrum is largest", Heads: []head{{Text: "number"}, {Text: "value", Unit: "1/M", Num: true}, {Text: "bar", Unit: "1/M", Num: true}}}
	t.Rows = append(t.Rows, row{Heads: []string{"frequency ω"}, Cells: value(nil, r.Total.SpectrumPeak, readable)})
	return []table{t}
}

func ringingTables(r *result.Result) []table {
	var out []table
	if len(r.Ringing) > 0 {
		t := table{ID: "ringing", Caption: "Fitted ringing, e^{−iωu}", Heads: []head{{Text: "l"}, {Text: "m"}, {Text: "n"}, {Text: "where"},
			{Text: "Re ω", Unit: "1/M", Num: true}, {Text: "bar", Unit: "1/M", Num: true}, {Text: "Im ω", Unit: "1/M", Num: true}, {Text: "bar", Unit: "1/M", Num: true}}}
		for _, g := range r.Ringing {
			line := row{Heads: []string{strconv.Itoa(g.L), strconv.Itoa(g.M), strconv.Itoa(g.N)}}
			line.Cells = append(line.Cells, cell{clean(g.Where), ""})
			line.Cells = value(line.Cells, &g.Re, readable)
			line.Cells = value(line.Cells, &g.Im, readable)
			t.Rows = append(t.Rows, line)
		}
		out = append(out, t)
	}
	if len(r.Tail) > 0 {
		t := table{ID: "tails", Caption: "Fitted late-time decay, a power of time", Heads: []head{{Text: "l"}, {Text: "m"}, {Text: "where"}, {Text: "exponent", Unit: "1", Num: true}, {Text: "bar", Unit: "1", Num: true}}}
		for _, g := range r.Tail {
			line := row{Heads: []string{strconv.Itoa(g.L), strconv.Itoa(g.M)}}
			line.Cells = value([]cell{{clean(g.Where), ""}}, &g.Exponent, readable)
			t.Rows = append(t.Rows, line)
		}
		out = append(out, t)
	}
	return out
}

func orbitTables(o *result.Orbit) []table {
	if o == nil {
		return nil
	}
	t := table{ID: "orbit-numbers", Caption: "What follows from the orbit (" + clean(o.Kind) + "), to double precision", Heads: []head{{Text: "number"}, {Text: "value", Unit: "", Num: true}, {Text: "unit"}}}
	add := func(name string, v float64, unit string) {
		t.Rows = append(t.Rows, row{Heads: []string{name}, Cells: []cell{{plainNumber(v), "num"}, {unit, ""}}})
	}
	if o.Energy != 0 {
		add("energy E", o.Energy, "μ")
	}
	if o.AngMom != 0 {
		add("angular momentum L", o.AngMom, "μ M")
	}
	for _, key := range sortedKeys(o.Numbers) {
		add(label(key), o.Numbers[key], unitOf(key))
	}
	out := []table{}
	if len(t.Rows) > 0 {
		out = append(out, t)
	}
	if len(o.Markers) > 0 {
		keys := sortedKeys(o.Markers)
		sort.SliceStable(keys, func(a, b int) bool { return o.Markers[keys[a]] < o.Markers[keys[b]] })
		t := table{ID: "orbit-markers", Caption: "When the particle passes", Heads: []head{{Text: "marker"}, {Text: "time", Unit: "M", Num: true}}}
		for _, key := range keys {
			t.Rows = append(t.Rows, row{Heads: []string{label(key)}, Cells: []cell{{plainNumber(o.Markers[key]), "num"}}})
		}
		out = append(out, t)
	}
	return out
}

func rungTable(r *result.Result) []table {
	if len(r.Rungs) == 0 {
		return nil
	}
	angular := false
	for _, g := range r.Rungs {
		angular = angular || g.Angular > 0
	}
	t := table{ID: "rungs", Caption: "The ladder of resolutions that was run", Heads: []head{{Text: "rung"}, {Text: "points", Unit: "", Num: true}, {Text: "spacing", Unit: "M", Num: true}, {Text: "time step", Unit: "M", Num: true},
		{Text: "kernel width", Unit: "M", Num: true}, {Text: "vanishing moments", Unit: "", Num: true}, {Text: "order", Unit: "", Num: true}}}
	if angular {
		t.Heads = append(t.Heads, head{Text: "coupled l", Unit: "", Num: true})
	}
	t.Heads = append(t.Heads, head{Text: "until", Unit: "M", Num: true}, head{Text: "cost", Unit: "core s", Num: true}, head{Text: "modes"})
	for i, g := range r.Rungs {
		num := func(s string) cell { return cell{s, "num"} }
		cells := []cell{num(strconv.Itoa(g.Points)), num(settingNumber(g.Dx)), num(settingNumber(g.Dt)),
			num(settingNumber(g.Kernel)), num(strconv.Itoa(g.Moments)), num(strconv.Itoa(g.Order))}
		if angular {
			cells = append(cells, num(strconv.Itoa(g.Angular)))
		}
		cells = append(cells, num(settingNumber(g.Until)), num(strconv.FormatFloat(g.CoreSeconds, 'f', 2, 64)), cell{clean(g.Modes), "list"})
		t.Rows = append(t.Rows, row{Heads: []string{strconv.Itoa(i)}, Cells: cells})
	}
	return []table{t}
}
