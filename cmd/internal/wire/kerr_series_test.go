package wire

import (
	"math"
	"testing"

	"nullmark/cmd/internal/verify"
	"nullmark/equations/frequency"
	"nullmark/extract/kerr"
	"nullmark/hyperboloidal"
	"nullmark/source/worldline"
)

// TestKerrPostNewtonian: what the published series for the flux at infinity
// (through v^8) and at the horizon (through relative v^3) leave open falls with
// the next power of v, by the second opinion.
func TestKerrPostNewtonian(t *testing.T) {
	spins := []float64{0.9}
	if *long {
		spins = append(spins, -0.5)
	}
	for _, a := range spins {
		h, err := hyperboloidal.NewKerr(a)
		if err != nil {
			t.Fatal(err)
		}
		var vs []float64
		var left [2][]float64
		for _, r0 := range []float64{40, 80} {
			orb, err := worldline.NewKerrBound(h, r0, 0, 1, 0, 0, 0)
			if err != nil {
				t.Fatal(err)
			}
			var e [2]float64
			for m := 1; m <= 6; m++ {
				all, err := frequency.Circular(h, orb, -2, m, 5, 0)
				if err != nil {
					t.Fatal(err)
				}
				sp, err := kerr.NewSpheroidal(h, m, 5, all[0].Omega)
				if err != nil {
					t.Fatal(err)
				}
				for i, z := range all[0].Infinity {
					e[0] += 2 * kerr.Infinity(m, all[0].Omega, z).Energy
					e[1] += 2 * sp.Horizon(all[0].Horizon)[i].Energy
				}
			}
			v := math.Cbrt(orb.OmegaPhi)
			q := 32. / 5 * math.Pow(v, 10)
			series, _ := verify.KerrSeries(a, v)
			absorbed, _ := verify.KerrAbsorption(a, v)
			vs = append(vs, v)
			left[0] = append(left[0], e[0]/q-series)
			left[1] = append(left[1], e[1]/q/absorbed-1)
		}
		for end, least := range []float64{8.3, 3.3} {
			p := math.Log(left[end][0]/left[end][1]) / math.Log(vs[0]/vs[1])
			t.Logf("a = %g end %d: left %.2e and %.2e, power %.2f", a, end, left[end][0], left[end][1], p)
			if !(p > least && p < least+2.2) {
				t.Errorf("a = %g end %d: the residual falls with v^%.2f", a, end, p)
			}
		}
	}
}
