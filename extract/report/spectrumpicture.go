package report

import (
	"fmt"
	"math"

	"nullmark/extract/result"
)

// spectrumPicture draws dE/domega of a burst against frequency, up to where it has
// fallen to a thousandth of its largest, with its bars as two thin curves and the
// measured peak as a line. ok is false where there is no spectrum.
func spectrumPicture(r *result.Result, s *result.Spectrum) (p picture, ok bool) {
	if s == nil {
		return p, false
	}
	n := min(len(s.Omega), len(s.Density), len(s.Err))
	top := 0.0
	for _, v := range s.Density[:n] {
		if finite(v) {
			top = math.Max(top, v)
		}
	}
	if n < 2 || !(top > 0) {
		return p, false
	}
	last := n - 1
	for last > 1 && !(s.Density[last] > 1e-3*top) {
		last--
	}
	const high, y0 = 230.0, 14.0
	hi := s.Omega[last] * 1.05
	desc := fmt.Sprintf("dE/dω of all modes together against ω from 0 to %s per M.", settingNumber(hi))
	c := newCanvas("spectrum", pictureWidth, y0+high+46, "Energy spectrum", desc)
	x := axis{lo: 0, hi: hi, from: plotLeft, to: plotRight}
	y := axis{lo: 0, hi: 1.1 * top, from: y0 + high, to: y0}
	pan := newPanel(c, "frame", x, y, "frequency ω  (1/M)", "dE/dω  (μ²)", 6)
	low, up := make([]float64, n), make([]float64, n)
	for i := range n {
		low[i], up[i] = math.Max(0, s.Density[i]-s.Err[i]), s.Density[i]+s.Err[i]
	}
	pan.curve(s.Omega[:n], low, "bandedge")
	pan.curve(s.Omega[:n], up, "bandedge")
	pan.curve(s.Omega[:n], s.Density[:n], "wave")
	p = picture{ID: "picture-spectrum", Title: "Energy spectrum"}
	p.Caption = "Solid: energy per frequency radiated to null infinity, all modes that were run, both signs of ω and m. Dashed: its error bars, where they are wide enough to be seen."
	if r.Total != nil && r.Total.SpectrumPeak != nil {
		at := x.at(r.Total.SpectrumPeak.Value)
		c.line(at, y.from, at, y.to, "border")
		p.Caption += " The vertical line marks the peak, ω = " + plusMinus(*r.Total.SpectrumPeak, readable) + " per M."
	}
	p.SVG = c.String()
	return p, true
}
