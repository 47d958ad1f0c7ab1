package grid

import (
	"math"
	"testing"
)

func TestPoints(t *testing.T) {
	for _, c := range []struct {
		start, end float64
		n          int
	}{{-20, 31, 256}, {0, 1, 2}, {-0.1, 0.2, 7}} {
		g := New(c.start, c.end, c.n)
		rho := g.Rho()
		if len(rho) != c.n || rho[0] != c.start || rho[c.n-1] != c.end {
			t.Errorf("%v: points %v", g, rho)
		}
		for i := 1; i < c.n; i++ {
			if d := rho[i] - rho[i-1]; math.Abs(d-g.Dx) > 1e-14*math.Max(math.Abs(c.start), math.Abs(c.end)) {
				t.Errorf("%v: step %d is %g", g, i, d)
			}
		}
	}
}

func TestPanics(t *testing.T) {
	for _, f := range []func(){
		func() { New(0, 1, 1) }, func() { New(1, 1, 5) }, func() { New(2, 1, 5) }, func() { New(0, math.NaN(), 5) },
	} {
		func() {
			defer func() {
				if recover() == nil {
					t.Error("no panic")
				}
			}()
			f()
		}()
	}
}
