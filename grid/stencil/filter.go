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
	if lanes == 8 {
		f.eight(u, scratch, n)
		return
	}
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

// eight is Apply for eight lanes: the same sums in the same order, eight at a time.
func (f *Filter) eight(u, scratch []float64, n int) {
	const lanes = 8
	q := f.Half
	for i := q; i < n-q; i++ {
		var a0, a1, a2, a3, a4, a5, a6, a7 float64
		from := scratch[(i-q)*lanes : (i+q+1)*lanes]
		for _, w := range f.Weights {
			v := (*[lanes]float64)(from)
			a0 += w * v[0]
			a1 += w * v[1]
			a2 += w * v[2]
			a3 += w * v[3]
			a4 += w * v[4]
			a5 += w * v[5]
			a6 += w * v[6]
			a7 += w * v[7]
			from = from[lanes:]
		}
		to := (*[lanes]float64)(u[i*lanes:])
		to[0] += a0
		to[1] += a1
		to[2] += a2
		to[3] += a3
		to[4] += a4
		to[5] += a5
		to[6] += a6
		to[7] += a7
	}
}
