package report

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"

	"nullmark/extract/result"
)

// faintest is the part of a mode's peak down to which its ringing is drawn.
const faintest = 1e-12

// ringingPicture draws, for the strongest modes, the amplitude of the field, that of
// the fitted tones and what the two differ by, on a logarithmic axis.
func ringingPicture(r *result.Result, s *result.Series) (picture, bool) {
	if s == nil {
		return picture{}, false
	}
	var modes []int
	for _, i := range strongest(s, len(s.Modes)) {
		if len(s.Modes[i].Tones) > 1 && len(modes) < 3 {
			modes = append(modes, i)
		}
	}
	if len(modes) == 0 {
		return picture{}, false
	}
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, i := range modes {
		from, to := toneSpan(s, i)
		lo, hi = math.Min(lo, from), math.Max(hi, to)
	}
	if !(hi > lo) {
		return picture{}, false
	}
	const high, gap, top = 190.0, 18.0, 14.0
	title := "Ringing: the field, the fitted tones, and what is left"
	var names []string
	for _, i := range modes {
		names = append(names, modeName(s.Modes[i].L, s.Modes[i].M))
	}
	desc := fmt.Sprintf("Amplitude of the field at null infinity, of the sum of the fitted damped oscillations and of their difference, for modes %s, on a logarithmic axis.", strings.Join(names, ", "))
	c := newCanvas("ringing", pictureWidth, top+float64(len(modes))*(high+gap)+34, title, desc)
	for row, i := range modes {
		mode := &s.Modes[i]
		n := min(len(mode.Wave), len(mode.Tones), len(s.U))
		_, _, field := parts(mode.Wave[:n])
		_, _, tones := parts(mode.Tones[:n])
		left := make([]float64, n)
		big, small := 0.0, math.Inf(1)
		for k := range n {
			left[k] = cmplx.Abs(mode.Wave[k] - mode.Tones[k])
			if s.U[k] < lo || s.U[k] > hi {
				continue
			}
			big = math.Max(big, field[k])
			if finite(left[k]) && left[k] > 0 {
				small = math.Min(small, left[k])
			}
		}
		y0 := top + float64(row)*(high+gap)
		y := axis{from: y0 + high, to: y0, log: true}
		y.lo, y.hi = logRange(math.Min(small, big), big, 14)
		xTitle := ""
		if row == len(modes)-1 {
			xTitle = "retarded time u  (M)"
		}
		p := newPanel(c, fmt.Sprint("frame", row), axis{lo: lo, hi: hi, from: plotLeft, to: plotRight}, y, xTitle, "", 7)
		c.upright(16, y0+high/2, "name", "|"+waveName(s)+"| "+modeName(mode.L, mode.M))
		p.curve(s.U, field, "wave")
		p.curve(s.U, left, "curve s1")
		p.curve(s.U, tones, "hull")
		at := y0 + high/2 - 30
		c.text(plotRight+10, at-14, "label strong", "start", modeName(mode.L, mode.M))
		for _, k := range [][2]string{{"wave", "field"}, {"hull", "fit"}, {"curve s1", "difference"}} {
			c.line(plotRight+10, at+2, plotRight+30, at+2, k[0])
			c.text(plotRight+36, at+6, "tick", "start", k[1])
			at += 18
		}
		for _, g := range r.Ringing {
			if g.L == mode.L && g.M == mode.M && g.Where == "infinity" {
				c.text(plotRight+10, at+12, "small", "start", fmt.Sprintf("n %d: %.3f − %.3f i", g.N, g.Re.Value, -g.Im.Value))
				at += 15
			}
		}
	}
	return picture{ID: "picture-ringing", Title: title, SVG: c.String(),
		Caption: "The fit is the sum of the damped oscillations listed above, with the amplitudes found, from the earliest window of the fit on. What is left holds the overtones that are not listed, at first, and the tail of the field, which the ringing sinks into."}, true
}

// toneSpan is the range of u over which the tones of mode i are worth drawing: from
// a little before the fit begins to where they have faded.
func toneSpan(s *result.Series, i int) (from, to float64) {
	mode := &s.Modes[i]
	peak := largest(s, i)
	from, to = math.Inf(1), math.Inf(-1)
	for k := range min(len(mode.Tones), len(s.U)) {
		v := cmplx.Abs(mode.Tones[k])
		if !finite(v) {
			continue
		}
		from = math.Min(from, s.U[k])
		if v > faintest*peak {
			to = s.U[k]
		}
	}
	return math.Max(s.U[0], from-30), to
}

// decayPicture draws the local power index of every tail against time, with its bar
// as a band and the limit found.
func decayPicture(r *result.Result, s *result.Series) (picture, bool) {
	if s == nil {
		return picture{}, false
	}
	type entry struct {
		d     *result.LocalIndex
		limit result.Q
	}
	var all []entry
	for i := range s.Decay {
		d := &s.Decay[i]
		for _, g := range r.Tail {
			if len(all) < 6 && len(d.Times) > 1 && g.L == d.L && g.M == d.M && g.Where == d.Where {
				all = append(all, entry{d, g.Exponent})
			}
		}
	}
	if len(all) == 0 {
		return picture{}, false
	}
	const high, gap, top = 150.0, 34.0, 14.0
	title := "Decay: the local power index and its limit"
	var words []string
	first, last := math.Inf(1), math.Inf(-1)
	for _, e := range all {
		first, last = math.Min(first, e.d.Times[0]), math.Max(last, e.d.Times[len(e.d.Times)-1])
		words = append(words, fmt.Sprintf("%s at %s tends to %s", modeName(e.d.L, e.d.M), e.d.Where, write(e.limit, readable).Value))
	}
	c := newCanvas("decay", pictureWidth, top+float64(len(all))*(high+gap)+14, title, "Local power index, minus d ln |psi| over d ln t, against time: "+strings.Join(words, ", ")+".")
	for row, e := range all {
		y0 := top + float64(row)*(high+gap)
		n := min(len(e.d.Times), len(e.d.Index), len(e.d.Error))
		lo, hi := indexRange(e.d, n, e.limit)
		x := axis{lo: first, hi: last, from: plotLeft, to: plotRight}
		y := axis{lo: lo, hi: hi, from: y0 + high, to: y0}
		xTitle := ""
		if row == len(all)-1 {
			xTitle = "time  (M)"
		}
		p := newPanel(c, fmt.Sprint("frame", row), x, y, xTitle, "", 5)
		c.upright(16, y0+high/2, "name", "index "+modeName(e.d.L, e.d.M))
		var band strings.Builder
		for k := range n {
			band.WriteString(map[bool]string{true: "M", false: "L"}[k == 0] + px(x.at(e.d.Times[k])) + " " + px(within(y, e.d.Index[k]+e.d.Error[k])))
		}
		for k := n - 1; k >= 0; k-- {
			band.WriteString("L" + px(x.at(e.d.Times[k])) + " " + px(within(y, e.d.Index[k]-e.d.Error[k])))
		}
		c.path(band.String()+"Z", "band", p.clip)
		c.path("M"+px(x.from)+" "+px(y.at(e.limit.Value))+"L"+px(x.to)+" "+px(y.at(e.limit.Value)), "asked", p.clip)
		p.curve(e.d.Times[:n], e.d.Index[:n], "wave")
		at := y0 + high/2 - 28
		c.text(plotRight+10, at-14, "label strong", "start", modeName(e.d.L, e.d.M)+" "+e.d.Where)
		for _, k := range [][2]string{{"wave", "local index"}, {"asked", "limit"}} {
			c.line(plotRight+10, at+2, plotRight+30, at+2, k[0])
			c.text(plotRight+36, at+6, "tick", "start", k[1])
			at += 18
		}
		c.text(plotRight+10, at+8, "tick", "start", write(e.limit, readable).Value)
	}
	return picture{ID: "picture-decay", Title: title, SVG: c.String(),
		Caption: "Solid, with its bar as a band: the local index of the field against the time that belongs to the place, u at null infinity, v on the horizon, t at a fixed radius. Dashed: the limit for late times with which the table above states the exponent."}, true
}

// within keeps a coordinate near the frame, so that a huge bar stays drawable.
func within(y axis, v float64) float64 {
	if !finite(v) {
		v = y.hi
	}
	return math.Max(math.Min(y.at(v), y.from+2000), y.to-2000)
}

// indexRange is the range of the vertical axis that holds the limit and the index
// where its bar is below one half.
func indexRange(d *result.LocalIndex, n int, limit result.Q) (lo, hi float64) {
	lo, hi = limit.Value-limit.Error, limit.Value+limit.Error
	for k := range n {
		if finite(d.Index[k]) && d.Error[k] < 0.5 {
			lo, hi = math.Min(lo, d.Index[k]), math.Max(hi, d.Index[k])
		}
	}
	pad := 0.08*(hi-lo) + 1e-3
	return lo - pad, hi + pad
}
