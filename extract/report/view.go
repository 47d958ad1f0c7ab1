package report

import (
	"bytes"
	"encoding/json"
	"fmt"
	"html/template"
	"math"
	"strconv"
	"strings"

	"nullmark/extract/result"
)

// table is a table as the page draws it. Body cells are text.
type table struct {
	ID      string
	Caption string
	Heads   []head
	Rows    []row
	Note    string
}

type head struct {
	Text string
	Unit string
	Num  bool // numbers: aligned right
	Left bool // numbers whose decimal points stand below each other: aligned left
}

type row struct {
	Heads []string // leading cells that name the row
	Cells []cell
}

type cell struct {
	Text  string
	Class string
}

// page is what the template is filled with.
type page struct {
	Title, Kind  string
	Loss, Met    string
	MetWord      string
	MetClass     string
	Warnings     []string
	Totals       []table
	Truncation   []table
	TruncNote    string
	Modes        []table
	ModesNote    string
	Ringing      []table
	Pictures     []drawn
	Conventions  [][2]string
	Orbit        []table
	Rungs        []table
	Provenance   [][2]string
	Numpy        string
	NumpyHorizon string
	Case         string
}

type drawn struct {
	ID, Title, Caption string
	SVG                template.HTML
}

func provenance(p result.Provenance) [][2]string {
	var out [][2]string
	add := func(k, v string) {
		if v != "" {
			out = append(out, [2]string{k, clean(v)})
		}
	}
	add("version", p.Version)
	add("commit", p.Commit)
	add("Go", p.Go)
	add("architecture", p.Host)
	add("started", p.Start)
	if p.Seconds > 0 {
		add("wall time", strconv.FormatFloat(p.Seconds, 'f', 1, 64)+" s")
	}
	if p.CoreSeconds > 0 {
		add("computing time", strconv.FormatFloat(p.CoreSeconds, 'f', 1, 64)+" core seconds")
	}
	if p.PeakMemoryBytes > 0 {
		add("peak memory", strconv.FormatFloat(float64(p.PeakMemoryBytes)/1e6, 'f', 1, 64)+" MB")
	}
	if p.Workers > 0 {
		add("workers", strconv.Itoa(p.Workers))
	}
	return out
}

// numpyLines are the three lines that load the series of the strongest mode.
func numpyLines(s *result.Series) (wave, horizon string) {
	if s == nil || len(s.Modes) == 0 {
		return "", ""
	}
	i := 0
	if list := strongest(s, 1); len(list) > 0 {
		i = list[0]
	}
	l, m := s.Modes[i].L, s.Modes[i].M
	prefix := s.Prefix
	if prefix == "" {
		prefix = "h"
	}
	wave = fmt.Sprintf("import numpy as np\nw = np.load(\"waveform.npz\")\nu, wave, bar = w[\"u\"], w[\"%s_%d_%d\"], w[\"err_%d_%d\"]", clean(prefix), l, m, l, m)
	for _, mode := range s.Modes {
		if len(mode.Horizon) > 0 {
			return wave, "horizon.npz loads the same way, against advanced time v."
		}
	}
	return wave, ""
}

// caseText is the resolved case as indented JSON, or empty.
func caseText(c any) string {
	if c == nil {
		return ""
	}
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	if err := e.Encode(c); err != nil {
		return ""
	}
	var lines []string
	for line := range strings.SplitSeq(strings.TrimRight(b.String(), "\n"), "\n") {
		lines = append(lines, clean(line))
	}
	return strings.Join(lines, "\n")
}

// view turns the bundle into what the template prints.
func view(b *result.Bundle) page {
	r := b.Result
	measure := measureOf(r)
	p := page{Title: clean(r.Title), Loss: lossSentence(r), Met: metSentence(r), MetWord: "met", MetClass: "met"}
	if p.Title == "" {
		p.Title = "A result without a title"
	}
	if !r.Accuracy.Met {
		p.MetWord, p.MetClass = "NOT met", "unmet"
	}
	if r.Orbit != nil {
		p.Kind = clean(r.Orbit.Kind)
	}
	for _, w := range r.Warnings {
		p.Warnings = append(p.Warnings, clean(w))
	}
	if t := r.Total; t != nil {
		p.Totals = endsTable("total", "Total over all modes", measure, t.Infinity, t.Horizon)
		p.Totals = level(append(append(p.Totals, recoilTable(r)...), spectrumTable(r)...))
		if tr := t.Truncation; tr != nil {
			p.Truncation = endsTable("truncation", fmt.Sprintf("Estimated part beyond l = %d, already contained in the total", tr.LMax), measure, tr.Infinity, tr.Horizon)
			level(p.Truncation)
			p.TruncNote = clean(tr.Note)
		}
	}
	p.Modes = level(append(append(append(fluxTables(r), strainTable(r)...), perMTables(r)...), peakTable(r)...))
	p.ModesNote = countsSentence(r.Modes)
	p.Ringing = level(ringingTables(r))
	for _, pic := range pictures(b) {
		p.Pictures = append(p.Pictures, drawn{pic.ID, pic.Title, pic.Caption, template.HTML(pic.SVG)})
	}
	for _, k := range sortedKeys(r.Conventions) {
		p.Conventions = append(p.Conventions, [2]string{clean(strings.ReplaceAll(k, "_", " ")), clean(r.Conventions[k])})
	}
	p.Orbit = orbitTables(r.Orbit)
	p.Rungs = rungTable(r)
	p.Provenance = provenance(r.Provenance)
	p.Numpy, p.NumpyHorizon = numpyLines(b.Series)
	p.Case = caseText(r.Case)
	return p
}

// pictures draws what the bundle has data for, in the order of the page.
func pictures(b *result.Bundle) []picture {
	var out []picture
	add := func(p picture, ok bool) {
		if ok {
			out = append(out, p)
		}
	}
	r, s := b.Result, b.Series
	add(orbitPicture(r, s))
	if lo, hi, ok := span(s); ok {
		what := "Strain"
		if s.Prefix == "psi" {
			what = "Field"
		}
		add(wavePicture(s, "wave", what+" against retarded time", lo, hi, 4))
		if from, to, ok := aroundPeaks(r, lo, hi); ok {
			add(wavePicture(s, "peak", what+" around the peaks", from, to, 3))
		}
		add(amplitudePicture(s))
	}
	add(spectrumPicture(r, b.Spectrum))
	add(ringingPicture(r, s))
	add(decayPicture(r, s))
	add(fluxPicture(r))
	add(budgetPicture(r))
	add(evidencePicture(s))
	return out
}

// aroundPeaks is the range of u that holds all peaks with some room, when that
// is much shorter than the whole.
func aroundPeaks(r *result.Result, lo, hi float64) (from, to float64, ok bool) {
	first, last := math.Inf(1), math.Inf(-1)
	for _, m := range r.Modes {
		if m.Peak != nil && finite(m.Peak.U.Value) {
			first, last = math.Min(first, m.Peak.U.Value), math.Max(last, m.Peak.U.Value)
		}
	}
	if first > last {
		return 0, 0, false
	}
	from, to = math.Max(lo, first-120), math.Min(hi, last+80)
	return from, to, to > from && to-from < 0.5*(hi-lo)
}
