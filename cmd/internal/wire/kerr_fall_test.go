package wire

import (
	"math"
	"math/cmplx"
	"testing"
)

// TestKerrPlungeIsTheMasterPlunge: at a = 0 the plunge from the innermost stable
// orbit through the Teukolsky equation, whose strain is a double integral, is that
// of the master equations, phase and time label included.
func TestKerrPlungeIsTheMasterPlunge(t *testing.T) {
	sets := []string{"waves.modes=[[2,2]]", "accuracy.relative=1e-7"}
	a := run(t, readKerr(t, "plunge.yaml", sets...))
	b := run(t, readKerr(t, "plunge.yaml", append(sets, "waves.equation=teukolsky")...))
	x, y := a.Series, b.Series
	t.Log(b.Result.Orbit.Markers, b.Result.Conventions["totals"], b.Result.Rungs, b.Result.Warnings)
	peak, worst, j := 0.0, 0.0, 0
	for k, u := range y.U {
		for j < len(x.U) && x.U[j] < u-1e-9 {
			j++
		}
		if j == len(x.U) || math.Abs(x.U[j]-u) > 1e-9 {
			continue
		}
		h, g := y.Modes[0].Wave[k], x.Modes[0].Wave[j]
		peak = math.Max(peak, cmplx.Abs(g))
		d, bar := cmplx.Abs(h-g), y.Modes[0].WaveErr[k]+x.Modes[0].WaveErr[j]
		if k%40 == 0 {
			t.Logf("u = %g: %.3g, differ by %.1e, bars %.1e %.1e, %.1e", u, cmplx.Abs(g), d, y.Modes[0].WaveErr[k], x.Modes[0].WaveErr[j], y.Modes[0].Evidence[k])
		}
		worst = math.Max(worst, d)
		if d > bar {
			t.Errorf("u = %g: strains differ by %.1e, bars %.1e", u, d, bar)
		}
	}
	t.Logf("worst %.1e of the peak", worst/peak)
	if !(worst < 1e-7*peak) {
		t.Errorf("the strains differ by %.1e of the peak", worst/peak)
	}
}
