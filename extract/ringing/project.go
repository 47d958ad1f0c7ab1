package ringing

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// model evaluates y[k] = sum_j c_j exp(-i w_j k h) on n samples.
type model struct {
	omega []complex128 // w_j
	amp   []complex128 // c_j, at sample 0
	rss   float64      // sum |residual|^2
}

// leastSquares solves the complex problem min |A x - b| through its real
// embedding by QR; A is given by columns. ok is false where A is singular to
// working precision.
func leastSquares(cols [][]complex128, b []complex128) (x []complex128, ok bool) {
	n, m := len(b), len(cols)
	a := mat.NewDense(2*n, 2*m, nil)
	rhs := mat.NewVecDense(2*n, nil)
	for i := range n {
		for j := range m {
			v := cols[j][i]
			a.Set(i, j, real(v))
			a.Set(i, m+j, -imag(v))
			a.Set(n+i, j, imag(v))
			a.Set(n+i, m+j, real(v))
		}
		rhs.SetVec(i, real(b[i]))
		rhs.SetVec(n+i, imag(b[i]))
	}
	var qr mat.QR
	qr.Factorize(a)
	var s mat.VecDense
	if err := qr.SolveVecTo(&s, false, rhs); err != nil {
		if c, ill := err.(mat.Condition); !ill || math.IsInf(float64(c), 0) {
			return nil, false
		}
	}
	x = make([]complex128, m)
	for j := range m {
		x[j] = complex(s.AtVec(j), s.AtVec(m+j))
		if cmplx.IsNaN(x[j]) || cmplx.IsInf(x[j]) {
			return nil, false
		}
	}
	return x, true
}

// basis returns the columns exp(-i w_j k h).
func basis(omega []complex128, h float64, n int) [][]complex128 {
	cols := make([][]complex128, len(omega))
	for j, w := range omega {
		cols[j] = make([]complex128, n)
		for k := range n {
			cols[j][k] = cmplx.Exp(-1i * w * complex(float64(k)*h, 0))
		}
	}
	return cols
}

// amplitudes fits the linear part of the model at fixed frequencies.
func amplitudes(y []complex128, h float64, omega []complex128) (model, []complex128, bool) {
	cols := basis(omega, h, len(y))
	c, ok := leastSquares(cols, y)
	if !ok {
		return model{}, nil, false
	}
	res := make([]complex128, len(y))
	rss := 0.0
	for k := range y {
		v := y[k]
		for j := range c {
			v -= c[j] * cols[j][k]
		}
		res[k] = v
		rss += real(v)*real(v) + imag(v)*imag(v)
	}
	return model{append([]complex128(nil), omega...), c, rss}, res, true
}

// refine improves the frequencies by variable projection: the amplitudes are
// eliminated and Gauss–Newton steps act on the frequencies alone, solved
// together with the amplitudes' change so that the step is the projected one
// (G. H. Golub & V. Pereyra, SIAM J. Numer. Anal. 10, 413 (1973); L. Kaufman,
// BIT 15, 49 (1975)). A step that does not lower the residual is halved up to
// six times; the best model found is returned.
func refine(y []complex128, h float64, omega []complex128, steps int) (model, bool) {
	best, res, ok := amplitudes(y, h, omega)
	if !ok {
		return best, false
	}
	m, n := len(omega), len(y)
	for range steps {
		cols := basis(best.omega, h, n)
		for j := range m {
			d := make([]complex128, n)
			for k := range n {
				d[k] = best.amp[j] * complex(0, -float64(k)*h) * cols[j][k]
			}
			cols = append(cols, d)
		}
		step, ok := leastSquares(cols, res)
		if !ok {
			return best, true
		}
		improved := false
		size := 0.0
		for try := 0; try < 6 && !improved; try++ {
			scale := complex(math.Ldexp(1, -try), 0)
			trial := make([]complex128, m)
			size = 0
			for j := range m {
				d := scale * step[m+j]
				trial[j] = best.omega[j] + d
				size = math.Max(size, cmplx.Abs(d)/(1e-3+cmplx.Abs(trial[j])))
			}
			got, r, ok := amplitudes(y, h, trial)
			if ok && got.rss < best.rss {
				best, res, improved = got, r, true
			}
		}
		if !improved || size < 1e-14 {
			break
		}
	}
	return best, true
}
