package stencil

import (
	"fmt"
	"math/big"
)

// Filter damps grid-scale noise: u_i += -strength (-1)^q (delta^{2q} u)_i / 4^q
// on interior points, delta^2 the second difference. A wave of k·dx = pi loses
// the fraction strength a call; a resolved one (k dx)^{2q}/4^q of it. Rows
// within q points of an end are left alone.
type Filter struct {
	Half    int       // q
	Weights []float64 // at offsets -q..q, strength included
}

// NewFilter returns the filter of 2q = order (even, 2 to 20) with the given
// strength in (0, 1]. It panics on other arguments.
func NewFilter(order int, strength float64) *Filter {
	if order < 2 || order > 20 || order%2 != 0 || !(strength > 0 && strength <= 1) {
		panic(fmt.Sprintf("stencil: filter of order %d and strength %g", order, strength))
	}
	q := order / 2
	f := &Filter{Half: q, Weights: make([]float64, order+1)}
	scale := new(big.Rat).SetFrac(big.NewInt(1), new(big.Int).Lsh(big.NewInt(1), uint(order)))
	for j := 0; j <= order; j++ {
		// delta^{2q} has weights (-1)^j C(2q,j); with (-1)^q in front the
		// centre is positive.
		b := new(big.Int).Binomial(int64(order), int64(j))
		if (j+q)%2 != 0 {
			b.Neg(b)
		}
		w, _ := new(big.Rat).Mul(new(big.Rat).SetInt(b), scale).Float64()
		f.Weights[j] = -strength * w
	}
	return f
}

// Apply filters the points of u in place; u holds lanes numbers a point and
// scratch has the same length as u.
func (f *Filter) Apply(u, scratch []float64, lanes int) {
	n := len(u) / lanes
	q := f.Half
	if n <= 2*q {
		return
	}
	copy(scratch, u)
	for i := q; i < n-q; i++ {
		for l := 0; l < lanes; l++ {
			var a float64
			at := (i-q)*lanes + l
			for _, w := range f.Weights {
				a += w * scratch[at]
				at += lanes
			}
			u[i*lanes+l] += a
		}
	}
}
