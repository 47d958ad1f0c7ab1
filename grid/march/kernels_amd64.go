package march

import "golang.org/x/sys/cpu"

// fastest is the best set of kernels for the processor at hand.
func fastest() instructions {
	switch {
	case cpu.X86.HasAVX512F:
		return avx512
	case cpu.X86.HasAVX2:
		return avx2
	}
	return goCode
}

// unit is what the vector kernels' lengths are multiples of; the plain kernels
// do the rest.
const unit = 8

// The vector kernels check nothing: the methods below do.

//go:noescape
func accumulateAVX512(u, w *float64, c float64, n int)

//go:noescape
func accumulateAVX2(u, w *float64, c float64, n int)

//go:noescape
func combineAVX512(y, u *float64, k *[]float64, c *float64, terms, n int)

//go:noescape
func combineAVX2(y, u *float64, k *[]float64, c *float64, terms, n int)

//go:noescape
func pairAVX512(x, y, p, q *float64, c *[4]float64, n int)

//go:noescape
func pairAVX2(x, y, p, q *float64, c *[4]float64, n int)

func (s instructions) accumulate(u, w []float64, c float64) {
	n := len(w) / unit * unit
	u = u[:len(w)]
	if s == goCode || n == 0 {
		accumulate(u, w, c)
		return
	}
	if s == avx512 {
		accumulateAVX512(&u[0], &w[0], c, n)
	} else {
		accumulateAVX2(&u[0], &w[0], c, n)
	}
	accumulate(u[n:], w[n:], c)
}

func (s instructions) combine(y, u []float64, k [][]float64, c []float64) {
	n := len(y) / unit * unit
	if s == goCode || n == 0 || len(k) == 0 {
		combine(y, u, k, c)
		return
	}
	u, c = u[:len(y)], c[:len(k)]
	for _, x := range k {
		_ = x[len(y)-1]
	}
	if s == avx512 {
		combineAVX512(&y[0], &u[0], &k[0], &c[0], len(k), n)
	} else {
		combineAVX2(&y[0], &u[0], &k[0], &c[0], len(k), n)
	}
	for i := n; i < len(y); i++ {
		a := u[i]
		for j, x := range k {
			a += float64(c[j] * x[i])
		}
		y[i] = a
	}
}

func (s instructions) pair(x, y, p, q []float64, c *[4]float64) {
	n := len(x) / unit * unit
	y, p, q = y[:len(x)], p[:len(x)], q[:len(x)]
	if s == goCode || n == 0 {
		pair(x, y, p, q, c)
		return
	}
	if s == avx512 {
		pairAVX512(&x[0], &y[0], &p[0], &q[0], c, n)
	} else {
		pairAVX2(&x[0], &y[0], &p[0], &q[0], c, n)
	}
	pair(x[n:], y[n:], p[n:], q[n:], c)
}
