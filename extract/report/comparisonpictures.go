package report

import (
	"fmt"
	"math"
	"sort"

	"nullmark/extract/result"
)

// comparisonPictures draws waveforms, differences with their bands, fluxes and
// balance, as far as there is data.
func comparisonPictures(c *result.Comparison, curves *result.Curves) []picture {
	var out []picture
	add := func(p picture, ok bool) {
		if ok {
			out = append(out, p)
		}
	}
	if curves != nil && len(curves.U) > 1 {
		lo, hi := curves.U[0], curves.U[len(curves.U)-1]
		add(bothWaves(c, curves, "both", "Both waveforms", lo, hi))
		if from, to, ok := aroundComparedPeaks(c, lo, hi); ok {
			add(bothWaves(c, curves, "both-peak", "Both waveforms around the peak", from, to))
		}
		add(differencePicture(c, curves, "phase", "Phase difference and error bar", "|Δφ|  (rad)", func(m *result.ModeCurves) ([]float64, []float64) { return m.Phase, m.PhaseBar }))
		add(differencePicture(c, curves, "size", "Amplitude difference and error bar", "|ΔA|/A", func(m *result.ModeCurves) ([]float64, []float64) { return m.Amp, m.AmpBar }))
		add(differencePicture(c, curves, "frequency", "Frequency difference and error bar", "|Δω|  (rad/M)", func(m *result.ModeCurves) ([]float64, []float64) { return m.Freq, m.FreqBar }))
	}
	if c.Flux != nil {
		for _, of := range []string{"energy", "angular momentum"} {
			add(fluxCurvePicture(c.Flux, of))
		}
	}
	if b := c.Balance; b != nil {
		add(balancePicture(b.Energy, "balance-energy", "Energy: lost by the orbit and measured", energyUnit(rate)))
		add(balancePicture(b.AngMom, "balance-angular", "Angular momentum: lost by the orbit and measured", angularUnit(rate)))
	}
	return out
}

// most is how many modes a picture of the comparison shows.
const mostCompared = 3

// mostTelling returns the indices of the modes to draw: those that differ most
// in units of their bar, then by order.
func mostTelling(c *result.Comparison, curves *result.Curves, has func(*result.ModeCurves) bool) []int {
	weight := map[[2]int]float64{}
	for _, m := range c.Modes {
		weight[[2]int{m.L, m.M}] = m.Significance
	}
	var all []int
	for i := range curves.Modes {
		if has(&curves.Modes[i]) {
			all = append(all, i)
		}
	}
	of := func(i int) float64 { return weight[[2]int{curves.Modes[i].L, curves.Modes[i].M}] }
	sort.SliceStable(all, func(a, b int) bool { return of(all[a]) > of(all[b]) })
	return all[:min(len(all), mostCompared)]
}

func aroundComparedPeaks(c *result.Comparison, lo, hi float64) (from, to float64, ok bool) {
	from, to = math.Inf(1), math.Inf(-1)
	for _, m := range c.Modes {
		if m.Peak != nil {
			u := m.Peak.Reference.U.Value
			from, to = math.Min(from, u-40), math.Max(to, u+40)
		}
	}
	from, to = math.Max(from, lo), math.Min(to, hi)
	return from, to, to > from && to-from < 0.8*(hi-lo)
}

// bothWaves draws the real parts of model and reference on top of each other.
func bothWaves(c *result.Comparison, curves *result.Curves, id, title string, lo, hi float64) (picture, bool) {
	modes := mostTelling(c, curves, func(m *result.ModeCurves) bool { return len(m.Model) == len(curves.U) })
	if len(modes) == 0 {
		return picture{}, false
	}
	const high, gap, top = 116.0, 16.0, 14.0
	cv := newCanvas(id, pictureWidth, top+float64(len(modes))*(high+gap)+34, title,
		fmt.Sprintf("Real part of model and reference against retarded time u from %s to %s M.", settingNumber(lo), settingNumber(hi)))
	for row, i := range modes {
		m := &curves.Modes[i]
		model, _, size1 := parts(m.Model)
		ref, _, size2 := parts(m.Reference)
		most := 0.0
		for k, u := range curves.U {
			if u >= lo && u <= hi {
				most = math.Max(most, math.Max(size1[k], size2[k]))
			}
		}
		if most == 0 {
			most = 1
		}
		y0 := top + float64(row)*(high+gap)
		xTitle := ""
		if row == len(modes)-1 {
			xTitle = "retarded time u  (M)"
		}
		p := newPanel(cv, fmt.Sprint("frame", row), axis{lo: lo, hi: hi, from: plotLeft, to: plotRight}, axis{lo: -1.15 * most, hi: 1.15 * most, from: y0 + high, to: y0}, xTitle, "", 4)
		cv.upright(16, y0+high/2, "name", "Re r h/μ "+modeName(m.L, m.M))
		p.curve(curves.U, ref, "curve s0")
		p.curve(curves.U, model, "curve s1")
		key(cv, y0+high/2, modeName(m.L, m.M), [2]string{"curve s0", "reference"}, [2]string{"curve s1", "model"})
	}
	return picture{ID: "picture-" + id, Title: title, SVG: cv.String(),
		Caption: "Real part of the reference (solid) and of the model (dashed), as read into the reference’s convention, of the modes that differ most in units of their error bar."}, true
}

// key writes the name of a panel and its curves to the right of it.
func key(c *canvas, middle float64, name string, entries ...[2]string) {
	c.text(plotRight+10, middle-14, "label strong", "start", name)
	for k, e := range entries {
		at := middle + 2 + 18*float64(k)
		c.line(plotRight+10, at, plotRight+34, at, e[0])
		c.text(plotRight+40, at+4, "tick", "start", e[1])
	}
}

// differencePicture draws the size of a difference over the band of its bar.
func differencePicture(c *result.Comparison, curves *result.Curves, id, title, yTitle string, of func(*result.ModeCurves) (y, bar []float64)) (picture, bool) {
	modes := mostTelling(c, curves, func(m *result.ModeCurves) bool { y, _ := of(m); return len(y) == len(curves.U) })
	if len(modes) == 0 {
		return picture{}, false
	}
	const high, gap, top = 150.0, 18.0, 14.0
	lo, hi := curves.U[0], curves.U[len(curves.U)-1]
	cv := newCanvas("difference-"+id, pictureWidth, top+float64(len(modes))*(high+gap)+34, title,
		"For the modes that differ most, the absolute difference against retarded time on a logarithmic axis, over a band that reaches up to its error bar.")
	for row, i := range modes {
		m := &curves.Modes[i]
		y, bar := of(m)
		size := make([]float64, len(y))
		small, big := math.Inf(1), 0.0
		for k, v := range y {
			size[k] = math.Abs(v)
			if !finite(v) {
				continue
			}
			for _, s := range []float64{size[k], bar[k]} {
				if s > 0 && finite(s) {
					small, big = math.Min(small, s), math.Max(big, s)
				}
			}
		}
		if big == 0 {
			small, big = 1e-16, 1e-15
		}
		y0 := top + float64(row)*(high+gap)
		ya := axis{from: y0 + high, to: y0, log: true}
		ya.lo, ya.hi = logRange(small, 2*big, 8)
		xTitle := ""
		if row == len(modes)-1 {
			xTitle = "retarded time u  (M)"
		}
		p := newPanel(cv, fmt.Sprint("frame", row), axis{lo: lo, hi: hi, from: plotLeft, to: plotRight}, ya, xTitle, "", 5)
		cv.upright(16, y0+high/2, "name", yTitle+" "+modeName(m.L, m.M))
		p.under(curves.U, bar, "band")
		p.curve(curves.U, bar, "bandedge")
		p.curve(curves.U, size, "wave")
		key(cv, y0+high/2, modeName(m.L, m.M), [2]string{"wave", "difference"}, [2]string{"bandedge", "error bar"})
	}
	return picture{ID: "picture-difference-" + id, Title: title, SVG: cv.String(),
		Caption: "Solid: size of the difference between model and reference. Dashed, with the band below it: the error bar. Where the curve stays inside the band, the reference cannot tell the two apart; gaps are where the reference’s bar exceeds a third of the signal. Signs stand in the tables."}, true
}

// under fills the region between the bottom of the panel and a curve.
func (p *panel) under(xs, ys []float64, class string) {
	held := make([]float64, len(ys))
	last := math.NaN()
	for i, v := range ys { // bridge gaps, so that the region is one
		if finite(v) {
			last = v
		}
		held[i] = last
	}
	d := thinned(p.x, p.y, xs, held)
	if d == "" {
		return
	}
	first := 0
	for first < len(held) && !finite(held[first]) {
		first++
	}
	from, to := p.x.at(xs[first]), p.x.at(xs[len(held)-1])
	p.c.path(d+"L"+px(to)+" "+px(p.y.from)+"L"+px(from)+" "+px(p.y.from)+"Z", class, p.clip)
}

// fluxCurvePicture draws the fluxes over their leading power of x, and below
// it the model's departure in per cent.
func fluxCurvePicture(f *result.FluxComparison, of string) (picture, bool) {
	var curves []result.FluxCurve
	xs := [2]float64{math.Inf(1), math.Inf(-1)}
	ys, rs := xs, [2]float64{0, 0}
	stretch := func(r *[2]float64, v float64) {
		if finite(v) {
			r[0], r[1] = math.Min(r[0], v), math.Max(r[1], v)
		}
	}
	for _, c := range f.Curves {
		if c.Of != of || len(curves) == markers {
			continue
		}
		curves = append(curves, c)
		for i, x := range c.X {
			stretch(&xs, x)
			stretch(&ys, c.Newtonian[i].Value)
			stretch(&ys, c.Newtonian[i].Value*c.Ratio[i].Value)
			r := c.Ratio[i]
			stretch(&rs, 100*(r.Value-1+r.Error))
			stretch(&rs, 100*(r.Value-1-r.Error))
		}
	}
	if len(curves) == 0 {
		return picture{}, false
	}
	for _, c := range f.Model {
		if c.Of == of && len(c.X) > 1 {
			stretch(&xs, c.X[0])
			stretch(&xs, c.X[len(c.X)-1])
			for _, q := range c.Newtonian {
				stretch(&ys, q.Value)
			}
		}
	}
	pad := func(r *[2]float64) {
		w := r[1] - r[0]
		if w == 0 {
			w = math.Max(math.Abs(r[0])*0.1, 1e-12)
		}
		r[0], r[1] = r[0]-0.08*w, r[1]+0.08*w
	}
	pad(&xs)
	pad(&ys)
	pad(&rs)
	id := "flux-energy"
	title := "Energy flux against x"
	if of != "energy" {
		id, title = "flux-angular", "Angular-momentum flux against x"
	}
	cv := newCanvas(id, pictureWidth, 420, title, "Above: fluxes divided by their leading power of x, of the reference and of published expansions. Below: departure of the model from the reference in per cent, with error bars.")
	x := axis{lo: xs[0], hi: xs[1], from: plotLeft, to: plotRight}
	up := newPanel(cv, "up", x, axis{lo: ys[0], hi: ys[1], from: 190, to: 14}, "", "flux / leading power", 5)
	down := newPanel(cv, "down", x, axis{lo: rs[0], hi: rs[1], from: 376, to: 212}, "x = (M Ω)^(2/3)", "model − reference  (%)", 5)
	cv.line(plotLeft, down.y.at(0), plotRight, down.y.at(0), "asked")
	label := 24.0
	for _, c := range f.Model {
		if c.Of == of {
			y := make([]float64, len(c.X))
			for i := range y {
				y[i] = c.Newtonian[i].Value
			}
			up.curve(c.X, y, "hull")
		}
	}
	cv.line(plotRight+8, label, plotRight+28, label, "hull")
	cv.text(plotRight+34, label+4, "tick", "start", "model")
	label += 18
	for k, c := range curves {
		class := fmt.Sprintf("s%d", k%markers)
		name := "all modes"
		if c.L > 0 {
			name = modeName(c.L, c.M)
		}
		cv.marker(k, plotRight+18, label, 3.6, class)
		cv.text(plotRight+34, label+4, "tick", "start", name)
		label += 18
		for i, v := range c.X {
			at, r := x.at(v), c.Ratio[i]
			cv.marker(k, at, up.y.at(c.Newtonian[i].Value), 3.6, class)
			cv.line(at, down.y.at(100*(r.Value-1-r.Error)), at, down.y.at(100*(r.Value-1+r.Error)), "whisker "+class)
			cv.marker(k, at, down.y.at(100*(r.Value-1)), 3.6, class)
		}
	}
	if of == "energy" {
		for k, c := range f.Context {
			class := fmt.Sprintf("curve s%d", (k+1)%markers)
			y := make([]float64, len(c.X))
			for i := range y {
				y[i] = c.Newtonian[i].Value
			}
			up.curve(c.X, y, class)
			cv.line(plotRight+8, label, plotRight+28, label, class)
			cv.text(plotRight+34, label+4, "tick", "start", clean(c.Name))
			label += 18
		}
	}
	return picture{ID: "picture-" + id, Title: title, SVG: cv.String(),
		Caption: "Above: markers are the reference’s flux over (32/5) x⁵ (energy) or (32/5) x^(7/2) (angular momentum), the dashed black line is the model; further lines are published post-Newtonian expansions of the test-particle flux, for context. Below: how far the model is off, in per cent of the reference, with error bars; the dashed line is agreement."}, true
}

// balancePicture draws losses and fluxes, and their residual with its band.
func balancePicture(b *result.BalanceOf, id, title, unit string) (picture, bool) {
	if b == nil || len(b.U) < 2 {
		return picture{}, false
	}
	n := len(b.U)
	model, measured, residual, low, high := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	ys, rs := [2]float64{math.Inf(1), math.Inf(-1)}, [2]float64{0, 0}
	// Powers of ten go into the axis titles, so that the ticks stay short.
	ten, tenBelow := power(b.Measured), power(b.Residual)
	for i := range b.U {
		model[i], measured[i] = b.Model[i].Value/ten, b.Measured[i].Value/ten
		residual[i], low[i], high[i] = b.Residual[i].Value/tenBelow, -b.Residual[i].Error/tenBelow, b.Residual[i].Error/tenBelow
		ys[0], ys[1] = math.Min(ys[0], math.Min(model[i], measured[i])), math.Max(ys[1], math.Max(model[i], measured[i]))
		rs[0], rs[1] = math.Min(rs[0], math.Min(residual[i], low[i])), math.Max(rs[1], math.Max(residual[i], high[i]))
	}
	for _, r := range []*[2]float64{&ys, &rs} {
		w := r[1] - r[0]
		if !(w > 1e-9*math.Abs(r[1])) {
			w = math.Max(0.1*math.Abs(r[1]), 1e-3)
		}
		r[0], r[1] = r[0]-0.1*w, r[1]+0.1*w
	}
	cv := newCanvas(id, pictureWidth, 420, title, "Above: what the model’s dynamics lose and what was measured. Below: the residual, model minus measured, with the band of its error bar around zero.")
	x := axis{lo: b.U[0], hi: b.U[n-1], from: plotLeft, to: plotRight}
	up := newPanel(cv, "up", x, axis{lo: ys[0], hi: ys[1], from: 190, to: 14}, "", "per u  ("+scaled(ten, unit)+")", 5)
	up.curve(b.U, measured, "curve s0")
	up.curve(b.U, model, "curve s1")
	key(cv, 90, "", [2]string{"curve s0", "measured"}, [2]string{"curve s1", "model"})
	down := newPanel(cv, "down", x, axis{lo: rs[0], hi: rs[1], from: 376, to: 212}, "retarded time u  (M)", "residual  ("+scaled(tenBelow, unit)+")", 5)
	down.curve(b.U, low, "bandedge")
	down.curve(b.U, high, "bandedge")
	down.curve(b.U, residual, "wave")
	key(cv, 290, "", [2]string{"wave", "residual"}, [2]string{"bandedge", "± error bar"})
	return picture{ID: "picture-" + id, Title: title, SVG: cv.String(),
		Caption: "Above: what the orbit loses by the model’s force (dashed) and what arrives at infinity and at the horizon (solid), both per unit of u. Below: the residual; a solid line between the dashed ones is agreement inside the error bar."}, true
}

// power is the power of ten at or below the largest |value|, 1 where all vanish.
func power(q []result.Q) float64 {
	top := 0.0
	for _, v := range q {
		if finite(v.Value) && finite(v.Error) {
			top = math.Max(top, math.Max(math.Abs(v.Value), v.Error))
		}
	}
	if top == 0 {
		return 1
	}
	return math.Pow(10, math.Floor(math.Log10(top)))
}

// scaled names a unit times a power of ten.
func scaled(ten float64, unit string) string {
	if ten == 1 {
		return unit
	}
	return tidyExponent(fmt.Sprintf("%.0e", ten)) + " " + unit
}
