package stencil

import (
	"math"
	"testing"
)

// HighPass does what Filter does, by another route, and leaves polynomials below
// its degree and the points near the ends alone.
func TestHighPassEqualsFilter(t *testing.T) {
	const n, lanes = 60, 3
	for _, order := range []int{2, 8, 12, 16} {
		u := make([]float64, n*lanes)
		for i := range u {
			u[i] = math.Sin(float64(i*i)) + 0.2*float64(i%7)
		}
		want := append([]float64(nil), u...)
		NewFilter(order, 0.5).Apply(want, make([]float64, len(u)), lanes)
		inc := make([]float64, len(u))
		f := NewHighPass(order, 0.5, len(u))
		f.Add(inc, u, lanes)
		for i := range u {
			if d := math.Abs(u[i] + inc[i] - want[i]); d > 1e-15 {
				t.Fatalf("order %d, point %d: differs by %.1e", order, i/lanes, d)
			}
			if p := i / lanes; (p < order/2 || p >= n-order/2) && inc[i] != 0 {
				t.Fatalf("order %d touches point %d", order, p)
			}
		}
		for deg := range order {
			for i := range u {
				u[i] = math.Pow(float64(i/lanes)/n, float64(deg))
			}
			clear(inc)
			f.Add(inc, u, lanes)
			for i := range inc {
				if math.Abs(inc[i]) > 1e-15 {
					t.Fatalf("order %d: changes a polynomial of degree %d by %.1e", order, deg, inc[i])
				}
			}
		}
	}
}
