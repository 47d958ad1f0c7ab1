package stencil

import "fmt"

// HighPass is Filter by repeated second differences: it adds
// -strength (-1)^q (delta^{2q} u)/4^q on interior points to an increment. The
// first differences of a smooth field are all but exact, so that it adds far
// less round-off than a weighted sum of 2q+1 values does.
type HighPass struct {
	half     int
	strength float64
	a, b     []float64
}

// NewHighPass returns the operator of 2q = order (even, 2 to 20) with strength
// in (0, 1] for fields of the given length (points times lanes).
func NewHighPass(order int, strength float64, length int) *HighPass {
	if order < 2 || order > 20 || order%2 != 0 || !(strength > 0 && strength <= 1) {
		panic(fmt.Sprintf("stencil: filter of order %d and strength %g", order, strength))
	}
	return &HighPass{half: order / 2, strength: strength, a: make([]float64, length), b: make([]float64, length)}
}

// Add adds the filter's change of u to inc; u, inc hold lanes numbers a point.
func (f *HighPass) Add(inc, u []float64, lanes int) {
	n := len(u)
	if len(inc) != n || n > len(f.a) {
		panic(fmt.Sprintf("stencil: filter of %d numbers into %d, room for %d", n, len(inc), len(f.a)))
	}
	q := f.half
	if n/lanes <= 2*q {
		return
	}
	src, dst, spare := u, f.a[:n], f.b[:n]
	for k := 1; k <= q; k++ {
		// -(delta^2)/4 each time; valid from k points inside each end
		lo, hi := k*lanes, n-k*lanes
		s, d := src[lo-lanes:hi+lanes], dst[lo:hi]
		for i := range d {
			m := s[i+lanes]
			d[i] = 0.25 * ((m - s[i]) - (s[i+2*lanes] - m))
		}
		src, dst, spare = dst, spare, dst
	}
	lo, hi := q*lanes, n-q*lanes
	in, s := inc[lo:hi], src[lo:hi]
	for i := range in {
		in[i] -= f.strength * s[i]
	}
}
