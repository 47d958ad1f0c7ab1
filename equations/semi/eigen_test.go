package semi

import (
	"fmt"
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/mat"

	"nullmark/equations"
	"nullmark/grid"
	"nullmark/hyperboloidal"
)

// spectrum returns the eigenvalues of the semi-discrete operator of one real
// field: the matrix is read off Apply, column by column, in one lane.
func spectrum(t *testing.T, lay hyperboloidal.Layers, n, order int, pot equations.Potential) []complex128 {
	t.Helper()
	geo, err := NewGeometry(lay, grid.New(lay.Si, lay.So, n), order)
	if err != nil {
		t.Fatal(err)
	}
	m := NewMaster(geo, []equations.Potential{pot}, nil)
	a := mat.NewDense(2*n, 2*n, nil)
	u, d := make([]float64, m.Length()), make([]float64, m.Length())
	for j := 0; j < 2*n; j++ {
		u[j*grid.Lanes] = 1
		m.Apply(d, u)
		for i := 0; i < 2*n; i++ {
			a.Set(i, j, d[i*grid.Lanes])
		}
		u[j*grid.Lanes] = 0
	}
	var e mat.Eigen
	if !e.Factorize(a, mat.EigenNone) {
		t.Fatal("no eigenvalues")
	}
	return e.Values(nil)
}

// TestNoGrowingMode: no eigenvalue of the semi-discrete operator lies to the
// right of the imaginary axis, for every order, l = 2 and 8, both parities,
// layers thin and thick and of several profiles; and none lies beyond the bound
// that the time step is chosen by.
func TestNoGrowingMode(t *testing.T) {
	flat := hyperboloidal.Flat(2)
	layers := func(inner, mid, outer float64, p hyperboloidal.Profile) hyperboloidal.Layers {
		return hyperboloidal.Layers{Si: -inner, Ri: 0, Ro: mid, So: mid + outer, Profile: p}
	}
	type setup struct {
		lay   hyperboloidal.Layers
		n     int
		order int
		l     int
		p     equations.Parity
	}
	var all []setup
	for _, order := range []int{4, 6, 8, 10, 12} {
		all = append(all,
			setup{layers(20, 12, 30, flat), 100, order, 2, equations.Even},
			setup{layers(20, 12, 30, flat), 100, order, 2, equations.Odd},
			setup{layers(20, 12, 30, flat), 100, order, 8, equations.Even},
			setup{layers(15, 10, 15, flat), 80, order, 8, equations.Odd},
		)
	}
	for _, p := range profiles() {
		all = append(all, setup{layers(20, 12, 60, p), 110, 12, 2, equations.Even})
	}
	for _, s := range all {
		name := fmt.Sprintf("order %d, l = %d %s, %d points on [%g, %g], %s", s.order, s.l, s.p, s.n, s.lay.Si, s.lay.So, s.lay.Profile)
		geo, err := NewGeometry(s.lay, grid.New(s.lay.Si, s.lay.So, s.n), s.order)
		if err != nil {
			t.Fatal(err)
		}
		bound := NewMaster(geo, []equations.Potential{equations.Master(s.p, s.l)}, nil).SpectralRadius()
		growth, radius := math.Inf(-1), 0.0
		for _, v := range spectrum(t, s.lay, s.n, s.order, equations.Master(s.p, s.l)) {
			growth = max(growth, real(v))
			radius = max(radius, cmplx.Abs(v))
		}
		// Measured: the least damped decay at 3e-6 (l = 8, order 4) or faster.
		if growth >= 0 {
			t.Errorf("%s: a mode grows at the rate %.3g", name, growth)
		}
		if radius > bound || radius < 0.95*bound {
			t.Errorf("%s: spectral radius %.6g, bound %.6g", name, radius, bound)
		}
	}
}

func profiles() []hyperboloidal.Profile {
	return []hyperboloidal.Profile{hyperboloidal.Power(4), hyperboloidal.Power(6), hyperboloidal.Flat(1), hyperboloidal.Flat(3)}
}

// TestQuasinormalFrequencies: the least damped eigenvalues -i omega contain the
// fundamental quasinormal frequency, in both parities, which share it: M omega =
// 0.373671684418 - 0.088962315689 i for l = 2 (E. W. Leaver, Proc. R. Soc. A
// 402, 285 (1985), table 1, there with 2M = 1 and six digits; more digits by a
// continued fraction in 33 digits), 0.599443288437 - 0.092703047945 i for l = 3.
func TestQuasinormalFrequencies(t *testing.T) {
	lay := hyperboloidal.Layers{Si: -18, Ri: -2, Ro: 7, So: 29, Profile: hyperboloidal.Flat(2)}
	for _, c := range []struct {
		l     int
		omega complex128
		bound float64
	}{{2, 0.373671684418 - 0.088962315689i, 1e-10}, {3, 0.599443288437 - 0.092703047945i, 6e-9}} {
		for _, p := range []equations.Parity{equations.Even, equations.Odd} {
			miss := func(n, order int) float64 {
				best := math.Inf(1)
				for _, v := range spectrum(t, lay, n, order, equations.Master(p, c.l)) {
					best = min(best, cmplx.Abs(v*1i-c.omega))
				}
				return best
			}
			// Measured for order 12: 2e-11 (l = 2) and 2e-9 (l = 3) on 110 points,
			// 1.4e-10 and 3e-11 on 150, where round-off in a matrix far from
			// normal takes over; for order 6 1e-5 and 1e-4 on 110.
			first, fine, low := miss(110, 12), miss(150, 12), miss(110, 6)
			if first > c.bound || fine > 5e-10 {
				t.Errorf("l = %d %s: the nearest eigenvalues miss by %.3g and %.3g", c.l, p, first, fine)
			}
			if low < 1e3*first {
				t.Errorf("l = %d %s: order 6 misses by %.3g, order 12 by %.3g", c.l, p, low, first)
			}
		}
	}
}
