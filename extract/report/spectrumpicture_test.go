package report

import (
	"math"
	"strings"
	"testing"

	"nullmark/extract/result"
)

// TestSpectrumPicture: the curve, the mark of the peak and its words are drawn, and
// nothing where there is no spectrum.
func TestSpectrumPicture(t *testing.T) {
	s := &result.Spectrum{}
	for i := range 200 {
		w := float64(i) * 0.01
		s.Omega = append(s.Omega, w)
		s.Density = append(s.Density, math.Exp(-(w-0.3)*(w-0.3)/0.01))
		s.Err = append(s.Err, 0.01)
	}
	r := &result.Result{Total: &result.Total{SpectrumPeak: &result.Q{Value: 0.3, Error: 1e-4}}}
	p, ok := spectrumPicture(r, s)
	if !ok || strings.Count(p.SVG, `class="wave"`) != 1 || strings.Count(p.SVG, `class="border"`) != 1 || !strings.Contains(p.Caption, "ω = 0.30000 ± ") {
		t.Errorf("%v %q", ok, p.Caption)
	}
	if strings.Contains(p.SVG, "NaN") {
		t.Error("a coordinate that is no number")
	}
	if _, ok := spectrumPicture(r, nil); ok {
		t.Error("a picture of nothing")
	}
	if _, ok := spectrumPicture(r, &result.Spectrum{Omega: []float64{0, 1}, Density: []float64{0, 0}, Err: []float64{0, 0}}); ok {
		t.Error("a picture of a spectrum that vanishes")
	}
}
