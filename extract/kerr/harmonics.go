package kerr

import (
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// Fit reads the amplitudes of a set of tones from series that are sampled alike:
// field(t) = SUM_j Z_j e^{-i omega_j t} by least squares with the weight
// sin^8(pi (t-from)/length) on [from, from+length]. Tones that lie whole
// multiples >= 5 of 1/length apart do not disturb each other at all; others are
// separated by the normal equations. It is not safe for concurrent use.
type Fit struct {
	first, samples int
	weighted       []complex128 // tone by tone, w e^{i omega t}/sum w, t from the middle
	back           []complex128 // e^{i omega mid}
	lu             mat.LU
	rhs, sol       *mat.VecDense
}

// NewFit prepares the fit for count samples, sample k at time start + k dt. It
// returns an error when the window leaves the samples or when two tones are too
// close for it.
func NewFit(count int, start, dt, from, length float64, omega []float64) (*Fit, error) {
	k0 := int(math.Ceil((from - start) / dt))
	k1 := int(math.Floor((from + length - start) / dt))
	if k0 < 0 || k1 >= count || k1-k0 < 16 {
		return nil, fmt.Errorf("kerr: the window [%g, %g] is not inside the samples [%g, %g]", from, from+length, start, start+float64(count-1)*dt)
	}
	n, size := len(omega), k1-k0+1
	f := &Fit{first: k0, samples: size, weighted: make([]complex128, n*size), back: make([]complex128, n),
		rhs: mat.NewVecDense(2*n, nil), sol: mat.NewVecDense(2*n, nil)}
	w := make([]float64, size)
	sum := 0.0
	for i := range w {
		s := math.Sin(math.Pi * (start + float64(k0+i)*dt - from) / length)
		s *= s
		s *= s
		w[i] = s * s
		sum += w[i]
	}
	mid := start + 0.5*float64(k0+k1)*dt
	turn := make([]complex128, n*size)
	for j, om := range omega {
		f.back[j] = cmplx.Exp(complex(0, om*mid))
		for i := range size {
			e := cmplx.Exp(complex(0, om*(float64(i)-0.5*float64(k1-k0))*dt))
			turn[j*size+i] = e
			f.weighted[j*size+i] = complex(w[i]/sum, 0) * e
		}
	}
	a := mat.NewDense(2*n, 2*n, nil)
	for i := range n {
		for j := range n {
			v := complex(1, 0)
			if i != j {
				v = 0
				for k, x := range f.weighted[i*size : (i+1)*size] {
					v += x * cmplx.Conj(turn[j*size+k])
				}
			}
			a.Set(i, j, real(v))
			a.Set(n+i, n+j, real(v))
			a.Set(i, n+j, -imag(v))
			a.Set(n+i, j, imag(v))
		}
	}
	f.lu.Factorize(a)
	if c := f.lu.Cond(); !(c < worstCondition) {
		return nil, fmt.Errorf("kerr: tones too close for a window of %g: the condition of their separation is %.1e", length, c)
	}
	return f, nil
}

// worstCondition of the normal equations leaves six digits.
const worstCondition = 1e10

// Read writes the amplitudes of the series into z, one a tone. It panics when the
// series is too short.
func (f *Fit) Read(z, values []complex128) {
	n := len(f.back)
	v := values[f.first : f.first+f.samples]
	for j := range n {
		var s complex128
		for i, w := range f.weighted[j*f.samples : (j+1)*f.samples] {
			s += w * v[i]
		}
		f.rhs.SetVec(j, real(s))
		f.rhs.SetVec(n+j, imag(s))
	}
	// The factors exist: NewFit has looked at their condition.
	_ = f.lu.SolveVecTo(f.sol, false, f.rhs)
	for j := range n {
		z[j] = complex(f.sol.AtVec(j), f.sol.AtVec(n+j)) * f.back[j]
	}
}

// Harmonics is a Fit of one series.
func Harmonics(values []complex128, start, dt, from, length float64, omega []float64) ([]complex128, error) {
	f, err := NewFit(len(values), start, dt, from, length, omega)
	if err != nil {
		return nil, err
	}
	z := make([]complex128, len(omega))
	f.Read(z, values)
	return z, nil
}
