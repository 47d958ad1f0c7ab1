package report

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"
	"strings"

	"nullmark/extract/result"
)

const (
	plotLeft  = 78.0
	plotRight = 632.0 // leaves room for labels at the ends of curves
)

// strongest returns the indices of up to n modes in order of the largest |Wave|
// after the start-up; modes without samples are left out.
func strongest(s *result.Series, n int) []int {
	type entry struct {
		i    int
		size float64
	}
	var all []entry
	for i := range s.Modes {
		if size := largest(s, i); size > 0 {
			all = append(all, entry{i, size})
		}
	}
	sort.SliceStable(all, func(a, b int) bool { return all[a].size > all[b].size })
	var out []int
	for _, e := range all[:min(n, len(all))] {
		out = append(out, e.i)
	}
	return out
}

// largest is the largest |Wave| of mode i after the start-up.
func largest(s *result.Series, i int) float64 {
	size := 0.0
	for k, z := range s.Modes[i].Wave[:min(len(s.Modes[i].Wave), len(s.U))] {
		if v := cmplx.Abs(z); s.U[k] >= s.JunkUntil && finite(v) {
			size = math.Max(size, v)
		}
	}
	return size
}

// span is the range of u that is drawn, or ok = false when there is none.
func span(s *result.Series) (lo, hi float64, ok bool) {
	if s == nil || len(s.U) < 2 || !(s.U[len(s.U)-1] > s.U[0]) {
		return 0, 0, false
	}
	return s.U[0], s.U[len(s.U)-1], true
}

func modeName(l, m int) string { return fmt.Sprintf("(%d,%d)", l, m) }

// parts splits a complex series.
func parts(w []complex128) (re, im, size []float64) {
	re, im, size = make([]float64, len(w)), make([]float64, len(w)), make([]float64, len(w))
	for i, z := range w {
		re[i], im[i], size[i] = real(z), imag(z), cmplx.Abs(z)
	}
	return re, im, size
}

// waveName is what the stored wave is called, with its unit.
func waveName(s *result.Series) string {
	if s.Prefix == "psi" {
		return "ψ"
	}
	return "r h/μ"
}

// startUpWords explains the hatched part of a picture that begins at u = lo.
func startUpWords(s *result.Series, lo float64) string {
	if !(s.JunkUntil > lo) {
		return ""
	}
	return " Hatched: the start-up of the evolution, up to u = " + settingNumber(s.JunkUntil) + " M, which is never compared."
}

// wavePicture draws real part and amplitude of the strongest modes between two
// retarded times, one panel a mode.
func wavePicture(s *result.Series, id, title string, lo, hi float64, count int) (picture, bool) {
	modes := strongest(s, count)
	if len(modes) == 0 {
		return picture{}, false
	}
	const high, gap, top = 116.0, 16.0, 14.0
	var names []string
	for _, i := range modes {
		names = append(names, modeName(s.Modes[i].L, s.Modes[i].M))
	}
	desc := fmt.Sprintf("Real part and amplitude of modes %s against retarded time u from %s to %s M.", strings.Join(names, ", "), settingNumber(lo), settingNumber(hi))
	h := top + float64(len(modes))*(high+gap) + 34
	c := newCanvas(id, pictureWidth, h, title, desc)
	hatch := c.hatch()
	for row, i := range modes {
		mode := &s.Modes[i]
		re, _, size := parts(mode.Wave)
		most := 0.0
		for k := range size[:min(len(size), len(s.U))] {
			if s.U[k] >= math.Max(lo, s.JunkUntil) && s.U[k] <= hi && finite(size[k]) {
				most = math.Max(most, size[k])
			}
		}
		if most == 0 {
			most = 1
		}
		y0 := top + float64(row)*(high+gap)
		x := axis{lo: lo, hi: hi, from: plotLeft, to: plotRight}
		y := axis{lo: -1.22 * most, hi: 1.22 * most, from: y0 + high, to: y0}
		xTitle := ""
		if row == len(modes)-1 {
			xTitle = "retarded time u  (M)"
		}
		p := newPanel(c, fmt.Sprint("frame", row), x, y, xTitle, "", 4)
		c.upright(16, y0+high/2, "name", waveName(s)+" "+names[row])
		minus := make([]float64, len(size))
		for k, v := range size {
			minus[k] = -v
		}
		p.curve(s.U, re, "wave")
		p.curve(s.U, size, "hull")
		p.curve(s.U, minus, "hull")
		p.startUp(hatch, s.JunkUntil, row == 0)
		c.text(plotRight+10, y0+high/2-14, "label strong", "start", names[row])
		c.line(plotRight+10, y0+high/2+2, plotRight+30, y0+high/2+2, "wave")
		c.text(plotRight+36, y0+high/2+6, "tick", "start", "real part")
		c.line(plotRight+10, y0+high/2+20, plotRight+30, y0+high/2+20, "hull")
		c.text(plotRight+36, y0+high/2+24, "tick", "start", "± amplitude")
	}
	p := picture{ID: "picture-" + id, Title: title, SVG: c.String()}
	p.Caption = "Real part (solid) and plus and minus the amplitude (dashed) at null infinity of the strongest modes." + startUpWords(s, lo)
	return p, true
}

// entry is one curve of an overview, with what tells it from the others.
type curveEntry struct {
	xs, ys []float64
	label  string
}

// overview draws several curves on a logarithmic axis into p, each with its
// own dash, marker and name at its end.
func overview(p *panel, curves []curveEntry) {
	type tag struct {
		y float64
		k int
	}
	var tags []tag
	for k, e := range curves {
		class := fmt.Sprintf("curve s%d", k%markers)
		p.curve(e.xs, e.ys, class)
		last := -1
		next := p.x.from + 30 + 13*float64(k)
		for i := range min(len(e.xs), len(e.ys)) {
			at, v := p.x.at(e.xs[i]), e.ys[i]
			if !finite(v) || at < p.x.from || at > p.x.to+0.5 {
				continue
			}
			last = i
			if at >= next && v > p.y.lo && v < p.y.hi {
				p.c.marker(k, at, p.y.at(v), 3.6, fmt.Sprintf("s%d", k%markers))
				next = at + (p.x.to-p.x.from)/5
			}
		}
		if last >= 0 {
			tags = append(tags, tag{math.Max(p.y.to, p.y.at(e.ys[last])), k})
		}
	}
	sort.SliceStable(tags, func(a, b int) bool { return tags[a].y < tags[b].y })
	spread := make([]float64, len(tags))
	for i, t := range tags {
		spread[i] = t.y
		if i > 0 {
			spread[i] = math.Max(spread[i], spread[i-1]+16)
		}
	}
	if n := len(tags); n > 0 && spread[n-1] > p.y.from {
		spread[n-1] = p.y.from
		for i := n - 2; i >= 0; i-- {
			spread[i] = math.Min(spread[i], spread[i+1]-16)
		}
	}
	for i, t := range tags {
		class := fmt.Sprintf("s%d", t.k%markers)
		p.c.line(p.x.to+3, t.y, p.x.to+12, spread[i], "leader")
		p.c.line(p.x.to+14, spread[i], p.x.to+40, spread[i], "curve "+class)
		p.c.marker(t.k, p.x.to+27, spread[i], 3.6, class)
		p.c.text(p.x.to+46, spread[i]+4, "label", "start", curves[t.k].label)
	}
}

// logRange widens [lo,hi] to whole decades, with at most depth decades shown.
func logRange(lo, hi float64, depth int) (float64, float64) {
	top := math.Ceil(math.Log10(hi) + 0.05)
	bottom := math.Floor(math.Log10(lo))
	bottom = math.Max(bottom, top-float64(depth))
	if bottom >= top {
		bottom = top - 1
	}
	return math.Pow(10, bottom), math.Pow(10, top)
}

// amplitudePicture draws the amplitudes of the strongest modes together on a
// logarithmic axis.
func amplitudePicture(s *result.Series) (picture, bool) {
	lo, hi, ok := span(s)
	if !ok {
		return picture{}, false
	}
	var curves []curveEntry
	small, big := math.Inf(1), 0.0
	for _, i := range strongest(s, markers) {
		_, _, size := parts(s.Modes[i].Wave)
		for k, v := range size[:min(len(size), len(s.U))] {
			if s.U[k] >= s.JunkUntil && v > 0 && finite(v) {
				small, big = math.Min(small, v), math.Max(big, v)
			}
		}
		curves = append(curves, curveEntry{s.U, size, modeName(s.Modes[i].L, s.Modes[i].M)})
	}
	if len(curves) == 0 || big == 0 {
		return picture{}, false
	}
	y := axis{from: 290, to: 14, log: true}
	y.lo, y.hi = logRange(small, big, 16)
	title := "Amplitudes on a logarithmic axis"
	c := newCanvas("amplitude", pictureWidth, 332, title, "Amplitude of the strongest modes against retarded time, logarithmic; "+endValues(curves))
	p := newPanel(c, "frame", axis{lo: lo, hi: hi, from: plotLeft, to: plotRight}, y, "retarded time u  (M)", "|"+waveName(s)+"|", 8)
	overview(p, curves)
	p.startUp(c.hatch(), s.JunkUntil, true)
	done := picture{ID: "picture-amplitude", Title: title, SVG: c.String()}
	done.Caption = "Each mode has its own dash and marker and is named at its end. The error bars have a picture of their own below." + startUpWords(s, lo)
	return done, true
}

// endValues says in words where each curve ends.
func endValues(curves []curveEntry) string {
	var out []string
	for _, e := range curves {
		for i := min(len(e.xs), len(e.ys)) - 1; i >= 0; i-- {
			if finite(e.ys[i]) {
				out = append(out, fmt.Sprintf("%s ends at %s", e.label, settingNumber(e.ys[i])))
				break
			}
		}
	}
	return strings.Join(out, ", ") + "."
}

// evidencePicture draws, for the strongest modes, the error bar of the stored
// samples as a band and, where it was kept, the difference between the two
// finest rungs in it.
func evidencePicture(s *result.Series) (picture, bool) {
	lo, hi, ok := span(s)
	if !ok {
		return picture{}, false
	}
	var modes []int
	compared := false
	for _, i := range strongest(s, len(s.Modes)) {
		mode := &s.Modes[i]
		if len(modes) < 3 && max(len(mode.Evidence), len(mode.WaveErr)) > 1 {
			modes = append(modes, i)
			compared = compared || len(mode.Evidence) > 1
		}
	}
	if len(modes) == 0 {
		return picture{}, false
	}
	const high, gap, top = 140.0, 18.0, 14.0
	title := "The error bar of the stored samples"
	desc := "For the strongest modes, a band that reaches up to the claimed error bar, against retarded time on a logarithmic axis."
	caption := "Dashed, with the band below it: the error bar claimed for the stored samples of |" + waveName(s) + "|."
	if compared {
		title = "Convergence: the difference between rungs"
		desc = "For the strongest modes, the absolute difference between the two finest rungs against retarded time, on a logarithmic axis, over a band that reaches up to the claimed error bar."
		caption = "Solid: absolute difference of " + waveName(s) + " between the two finest rungs. Dashed, with the band below it: the error bar claimed for the stored samples. The difference is about the error of the coarser of the two; the finer one’s is a tenth of that or less, where the scheme converges as it should."
	}
	c := newCanvas("evidence", pictureWidth, top+float64(len(modes))*(high+gap)+34, title, desc)
	hatch := c.hatch()
	for row, i := range modes {
		mode := &s.Modes[i]
		y0 := top + float64(row)*(high+gap)
		y := axis{from: y0 + high, to: y0, log: true}
		y.lo, y.hi = evidenceRange(s, mode)
		xTitle := ""
		if row == len(modes)-1 {
			xTitle = "retarded time u  (M)"
		}
		p := newPanel(c, fmt.Sprint("frame", row), axis{lo: lo, hi: hi, from: plotLeft, to: plotRight}, y, xTitle, "", 5)
		c.upright(16, y0+high/2, "name", waveName(s)+" "+modeName(mode.L, mode.M))
		band := thinned(p.x, p.y, s.U, mode.WaveErr)
		if n := min(len(s.U), len(mode.WaveErr)); strings.Count(band, "M") == 1 {
			c.path(band+"L"+px(p.x.at(s.U[n-1]))+" "+px(y.from)+"L"+px(p.x.at(s.U[0]))+" "+px(y.from)+"Z", "band", p.clip)
		}
		c.path(band, "bandedge", p.clip)
		p.curve(s.U, mode.Evidence, "wave")
		p.startUp(hatch, s.JunkUntil, row == 0)
		at := y0 + high/2
		c.text(plotRight+10, at-14, "label strong", "start", modeName(mode.L, mode.M))
		key := func(class, text string) {
			c.line(plotRight+10, at+2, plotRight+30, at+2, class)
			c.text(plotRight+36, at+6, "tick", "start", text)
			at += 18
		}
		if len(mode.Evidence) > 1 {
			key("wave", "difference")
		}
		if band != "" {
			key("bandedge", "error bar")
		}
	}
	return picture{ID: "picture-evidence", Title: title, SVG: c.String(), Caption: caption + startUpWords(s, lo)}, true
}

// evidenceRange is the range of the vertical axis that holds differences and
// bars after the start-up.
func evidenceRange(s *result.Series, mode *result.ModeSeries) (lo, hi float64) {
	small, big := math.Inf(1), 0.0
	for _, ys := range [][]float64{mode.Evidence, mode.WaveErr} {
		for k, v := range ys[:min(len(ys), len(s.U))] {
			if s.U[k] >= s.JunkUntil && v > 0 && finite(v) {
				small, big = math.Min(small, v), math.Max(big, v)
			}
		}
	}
	if big == 0 {
		small, big = 1e-16, 1e-15
	}
	return logRange(small, 3*big, 9)
}
