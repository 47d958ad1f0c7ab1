package wire

import (
	"fmt"
	"math"
	"path/filepath"
	"testing"

	"nullmark/extract/flux"
	"nullmark/extract/result"
	"nullmark/source/worldline"
)

// fluxTable reads the shipped table of circular fluxes.
func fluxTable(t testing.TB) *worldline.FluxTable {
	t.Helper()
	path, err := filepath.Abs(filepath.Join("..", "..", "..", "configs", "fluxtable.csv"))
	if err != nil {
		t.Fatal(err)
	}
	f, err := driveOf(path)
	if err != nil {
		t.Fatal(err)
	}
	return f.(*worldline.FluxTable)
}

// TestFluxTableAgainstPublished: the shipped table at the radii of the
// independent one, which it does not hold as rows.
func TestFluxTableAgainstPublished(t *testing.T) {
	f := fluxTable(t)
	t.Logf("interpolation error %.1e", f.Uncertainty())
	for _, ref := range references(t) {
		x := 1 / ref.R0
		got := 6.4 * math.Pow(x, 5) * f.Ratio(x)
		want := ref.Total.Infinity + ref.Total.Horizon
		t.Logf("r0 = %g: %.12g, independent %.12g, apart by %.1e", ref.R0, got, want, got/want-1)
		if math.Abs(got/want-1) > 2e-8 {
			t.Errorf("r0 = %g: the table gives %.12g, independent %.12g", ref.R0, got, want)
		}
	}
}

// slopes are the derivatives of equidistant samples, by differences of order 8.
func slopes(v []complex128, h float64) []complex128 {
	out := make([]complex128, len(v))
	c := [...]float64{4. / 5, -1. / 5, 4. / 105, -1. / 280}
	for i := 4; i+4 < len(v); i++ {
		for k, w := range c {
			out[i] += complex(w/h, 0) * (v[i+k+1] - v[i-k-1])
		}
	}
	return out
}

// measuredAt returns the flux of a run's series against time at one end, with the
// estimated rest in l, at times start + k step.
func measuredAt(s *result.Series, end int, lMax int) []float64 {
	at := s.U
	if end == 1 {
		at = s.V
	}
	h := at[1] - at[0]
	byL := make([][]float64, len(at))
	for i := range byL {
		byL[i] = make([]float64, lMax+1)
	}
	for _, m := range s.Modes {
		v, c := m.Wave, 1/(16*math.Pi)
		if end == 1 {
			v, c = m.Horizon, flux.Norm(m.L)/(64*math.Pi)
		}
		if m.M > 0 {
			c *= 2
		}
		for i, d := range slopes(v, h) {
			byL[i][m.L] += c * (real(d)*real(d) + imag(d)*imag(d))
		}
	}
	out := make([]float64, len(at))
	for i := range out {
		for _, e := range byL[i] {
			out[i] += e
		}
		if rest, ok := flux.Tail(byL[i][2:], 0); ok {
			out[i] += rest.Value
		}
	}
	return out
}

// averageAt is the mean of samples around x with the window sin^4 of the given
// length.
func averageAt(at, v []float64, x, length float64) float64 {
	var sum, weight float64
	for i, t := range at {
		if z := (t - x) / length; z > -0.5 && z < 0.5 {
			c := math.Cos(math.Pi * z)
			sum += c * c * c * c * v[i]
			weight += c * c * c * c
		}
	}
	return sum / weight
}

// imbalance is measured flux over the orbit's loss, less 1, around time x. The
// radiation of low multipoles comes from the whole near zone, centred on the
// hole: what the orbit loses at time t is set against the flux at u = t and v = t,
// to which the times t -+ r_* of a ray from the particle are inferior.
func imbalance(s *result.Series, w worldline.Worldline, loss func(*worldline.State) float64, lMax int, x, length float64) float64 {
	var st worldline.State
	var loses []float64
	for _, u := range s.U {
		w.At(u, &st)
		loses = append(loses, loss(&st))
	}
	measured := averageAt(s.U, measuredAt(s, 0, lMax), x, length) + averageAt(s.V, measuredAt(s, 1, lMax), x, length)
	return measured/averageAt(s.U, loses, x, length) - 1
}

// TestBalance (long): the flux measured from an inspiral driven by the shipped
// table against what its orbit loses, on stretches that go in as rows. What is
// left of the balance is proportional to the mass ratio: energy under way in the
// near zone, as if the flux were late by a few M. For small mass ratios the
// balance holds to 1e-5 of the flux altogether.
func TestBalance(t *testing.T) {
	if !*long {
		return
	}
	f := fluxTable(t)
	for _, from := range []float64{10, 8.2, 7.2, 6.6} {
		var per [3]float64 // imbalance over mass ratio
		for i, nu := range []float64{1e-3, 1e-4, 1e-5} {
			w, err := worldline.NewInspiral(worldline.InspiralOrbit{MassRatio: nu, From: from, Drive: f})
			if err != nil {
				t.Fatal(err)
			}
			file := writeTable(t, w, 0, 1300, 0.5, 0, 17, false)
			b := run(t, mustTable(t, file, "waves.l_max=8", "accuracy.relative=1e-7", "accuracy.floor=1e-9"))
			loss := func(s *worldline.State) float64 { return -s.Omega() * w.Torque(s) / nu }
			line := fmt.Sprintf("nu = %g:", nu)
			var st, later worldline.State
			for x := 650.0; x <= 1050; x += 400 {
				w.At(x, &st)
				w.At(x+1, &later)
				d := imbalance(b.Series, w, loss, 8, x, 4*math.Pi/st.Omega())
				lag := -d / math.Log(loss(&later)/loss(&st))
				line += fmt.Sprintf("  r = %.4f: %+.2e (%.2f M)", st.R, d, lag)
				if nu <= 1e-4 && math.Abs(d) > 1e-5 {
					t.Errorf("nu = %g, r = %g: imbalance %.1e", nu, st.R, d)
				}
				if x == 650 {
					per[i] = lag
				}
			}
			t.Log(line)
		}
		if math.Abs(per[1]-per[2]) > 0.5 {
			t.Errorf("from r = %g: the imbalance is not that of a lag: %.3g M, %.3g M", from, per[1], per[2])
		}
	}
}
