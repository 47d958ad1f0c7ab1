package ringing

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// subspace holds the signal space of one window: the left singular vectors of
// the Hankel matrix Y[i][j] = y[i+j], from which the poles of every model order
// follow without another decomposition.
type subspace struct {
	real  bool       // the signal has no imaginary part
	rows  int        // rows of the (complex) Hankel matrix
	u     *mat.Dense // rows x k (real signal) or 2 rows x 2k (real embedding)
	sigma []float64  // singular values, largest first, one a complex direction
}

// newSubspace decomposes the Hankel matrix of y. A third of the samples makes
// the columns, the rest the rows, near the choice of least variance for the
// matrix pencil: Y. Hua & T. K. Sarkar, IEEE Trans. Acoust. Speech Signal
// Process. 38, 814 (1990). A complex Hankel matrix is embedded as
// [[Re, -Im], [Im, Re]], which doubles every singular value.
func newSubspace(y []complex128) (*subspace, bool) {
	cols := len(y) / 3
	rows := len(y) - cols + 1
	s := &subspace{real: true, rows: rows}
	for _, v := range y {
		if imag(v) != 0 {
			s.real = false
			break
		}
	}
	var h *mat.Dense
	if s.real {
		h = mat.NewDense(rows, cols, nil)
		for i := range rows {
			for j := range cols {
				h.Set(i, j, real(y[i+j]))
			}
		}
	} else {
		h = mat.NewDense(2*rows, 2*cols, nil)
		for i := range rows {
			for j := range cols {
				v := y[i+j]
				h.Set(i, j, real(v))
				h.Set(i, cols+j, -imag(v))
				h.Set(rows+i, j, imag(v))
				h.Set(rows+i, cols+j, real(v))
			}
		}
	}
	var svd mat.SVD
	if !svd.Factorize(h, mat.SVDThinU) {
		return nil, false
	}
	s.u = new(mat.Dense)
	svd.UTo(s.u)
	all := svd.Values(nil)
	step := 1
	if !s.real {
		step = 2
	}
	for i := 0; i < len(all); i += step {
		s.sigma = append(s.sigma, all[i])
	}
	return s, true
}

// poles returns the order values z of the model y[k] = sum c_j z_j^k from the
// shift invariance of the leading singular vectors: U1 A = U2, z = eig(A). For
// a complex signal the embedding has every z and its conjugate; an eigenvector
// (x; w) with w = -i x belongs to z, one with w = +i x to the conjugate.
// ok is false where the decomposition fails or the order is too large.
func (s *subspace) poles(order int) (z []complex128, ok bool) {
	if order < 1 || order > len(s.sigma) || order >= s.rows {
		return nil, false
	}
	k, halves := order, 1
	if !s.real {
		k, halves = 2*order, 2
	}
	r := s.rows
	u1 := mat.NewDense(halves*(r-1), k, nil)
	u2 := mat.NewDense(halves*(r-1), k, nil)
	for h := range halves {
		for i := range r - 1 {
			for j := range k {
				u1.Set(h*(r-1)+i, j, s.u.At(h*r+i, j))
				u2.Set(h*(r-1)+i, j, s.u.At(h*r+i+1, j))
			}
		}
	}
	var a mat.Dense
	if err := a.Solve(u1, u2); err != nil {
		if _, ill := err.(mat.Condition); !ill {
			return nil, false
		}
	}
	var eig mat.Eigen
	kind := mat.EigenNone
	if !s.real {
		kind = mat.EigenRight
	}
	if !eig.Factorize(&a, kind) {
		return nil, false
	}
	values := eig.Values(nil)
	if s.real {
		return finite(values)
	}
	var w mat.CDense
	eig.VectorsTo(&w)
	type candidate struct {
		z     complex128
		share float64
	}
	list := make([]candidate, k)
	for e := range k {
		var own, other float64
		for i := range r {
			var x, y complex128
			for j := range k {
				c := w.At(j, e)
				x += complex(s.u.At(i, j), 0) * c
				y += complex(s.u.At(r+i, j), 0) * c
			}
			p, q := x+1i*y, x-1i*y
			own += real(p)*real(p) + imag(p)*imag(p)
			other += real(q)*real(q) + imag(q)*imag(q)
		}
		list[e] = candidate{values[e], own / (own + other)}
	}
	// The half with the larger shares is the signal's own.
	for i := 1; i < k; i++ {
		for j := i; j > 0 && list[j].share > list[j-1].share; j-- {
			list[j], list[j-1] = list[j-1], list[j]
		}
	}
	for _, c := range list[:order] {
		z = append(z, c.z)
	}
	return finite(z)
}

// finite passes z on unless a value is zero or not finite.
func finite(z []complex128) ([]complex128, bool) {
	for _, v := range z {
		if v == 0 || cmplx.IsNaN(v) || cmplx.IsInf(v) || math.IsNaN(cmplx.Abs(v)) {
			return nil, false
		}
	}
	return z, true
}
