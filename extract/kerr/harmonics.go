package kerr

import (
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// Harmonics fits field(t) = SUM_j Z_j e^{-i omega_j t} to the uniformly sampled
// values (sample k at time start + k dt) by least squares with the weight
// sin^8(pi (t-from)/length) on [from, from+length], and returns the Z_j. Tones
// that lie whole multiples >= 5 of 1/length apart do not disturb each other at
// all; others are separated by the normal equations, whose conditioning it
// checks. It returns an error when the window leaves the samples or when two
// tones are too close for it.
func Harmonics(values []complex128, start, dt, from, length float64, omega []float64) ([]complex128, error) {
	k0 := int(math.Ceil((from - start) / dt))
	k1 := int(math.Floor((from + length - start) / dt))
	if k0 < 0 || k1 >= len(values) || k1-k0 < 16 {
		return nil, fmt.Errorf("kerr: the window [%g, %g] is not inside the samples [%g, %g]", from, from+length, start, start+float64(len(values)-1)*dt)
	}
	n := len(omega)
	w := make([]float64, k1-k0+1)
	sum := 0.0
	for i := range w {
		t := start + float64(k0+i)*dt
		s := math.Sin(math.Pi * (t - from) / length)
		s *= s
		s *= s
		w[i] = s * s
		sum += w[i]
	}
	mid := start + 0.5*float64(k0+k1)*dt
	// moment(w, f) = sum w f e^{i omega t}/sum w, t from the middle.
	moment := func(om float64, f func(i int) complex128) complex128 {
		var z complex128
		t0 := start + float64(k0)*dt - mid
		for i := range w {
			z += complex(w[i], 0) * f(i) * cmplx.Exp(complex(0, om*(t0+float64(i)*dt)))
		}
		return z / complex(sum, 0)
	}
	b := make([]complex128, n)
	g := make([]complex128, n*n)
	for i := range n {
		b[i] = moment(omega[i], func(k int) complex128 { return values[k0+k] })
		for j := range i {
			v := moment(omega[i]-omega[j], func(int) complex128 { return 1 })
			g[i*n+j], g[j*n+i] = v, cmplx.Conj(v)
		}
		g[i*n+i] = 1
	}
	z, err := solveComplex(g, b)
	if err != nil {
		return nil, fmt.Errorf("kerr: tones too close for a window of %g: %w", length, err)
	}
	for i := range z {
		z[i] *= cmplx.Exp(complex(0, omega[i]*mid))
	}
	return z, nil
}

// solveComplex solves the n x n system g z = b through its real form.
func solveComplex(g, b []complex128) ([]complex128, error) {
	n := len(b)
	a := mat.NewDense(2*n, 2*n, nil)
	rhs := mat.NewVecDense(2*n, nil)
	for i := range n {
		rhs.SetVec(i, real(b[i]))
		rhs.SetVec(n+i, imag(b[i]))
		for j := range n {
			v := g[i*n+j]
			a.Set(i, j, real(v))
			a.Set(n+i, n+j, real(v))
			a.Set(i, n+j, -imag(v))
			a.Set(n+i, j, imag(v))
		}
	}
	var x mat.VecDense
	if err := x.SolveVec(a, rhs); err != nil {
		return nil, err
	}
	out := make([]complex128, n)
	for i := range out {
		out[i] = complex(x.AtVec(i), x.AtVec(n+i))
	}
	return out, nil
}
