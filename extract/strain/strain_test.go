package strain

import (
	"math"
	"math/cmplx"
	"testing"

	"nullmark/extract/flux"
)

// TestFactor: |factor|^2 = (l+2)!/(l-2)!/4, so that the energy in the strain,
// w^2 |h|^2/(8 pi) with m and -m together, is the one in the master function;
// even modes keep the phase, odd ones turn by a quarter.
func TestFactor(t *testing.T) {
	for l := 2; l < 12; l++ {
		for _, odd := range []bool{false, true} {
			f := Factor(l, odd)
			const w, psi = 0.2, 1.3
			e := w * w * real(f*cmplx.Conj(f)) * psi * psi / (8 * math.Pi)
			if want := flux.Steady(l, l, w, psi, 0).Energy.Value; math.Abs(e-want) > 1e-14*want {
				t.Errorf("l = %d: energy %g, want %g", l, e, want)
			}
			if odd && (real(f) != 0 || imag(f) <= 0) || !odd && (imag(f) != 0 || real(f) <= 0) {
				t.Errorf("l = %d, odd %v: factor %v", l, odd, f)
			}
		}
	}
	if f := Factor(2, false); math.Abs(real(f)-math.Sqrt(6)) > 1e-15 {
		t.Errorf("l = 2: %v, want sqrt 6", f)
	}
}

func sampled(start, dt float64, n int, f func(float64) complex128) []complex128 {
	out := make([]complex128, n)
	for k := range out {
		out[k] = f(start + float64(k)*dt)
	}
	return out
}

func between(start, end float64, n int) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = start + (end-start)*float64(i)/float64(n-1)
	}
	return out
}

// TestResampleExactness: polynomials up to degree 9 are reproduced, the tenth is
// not: in the middle of the stencil it misses the node polynomial's value,
// prod (k+1/2)^2, k = 0..4.
func TestResampleExactness(t *testing.T) {
	const start, dt, n = 3.0, 0.5, 14
	at := between(start, start+dt*(n-1), 101)
	for degree := 0; degree <= 10; degree++ {
		f := func(x float64) complex128 {
			y := math.Pow((x-start)/dt-6.5, float64(degree))
			return complex(y, -2*y)
		}
		got := Resample(sampled(start, dt, n, f), start, dt, at)
		size := math.Pow(6.5, float64(degree))
		worst := 0.0
		for i, x := range at {
			worst = max(worst, cmplx.Abs(got[i]-f(x)))
		}
		if degree <= 9 && worst > 1e-13*size {
			t.Errorf("degree %d: off by %.3g of %.3g", degree, worst, size)
		}
		if degree == 10 && worst < 1e-7*size {
			t.Errorf("degree 10 is exact to %.3g of %.3g", worst, size)
		}
	}
	// At the middle between two samples, the stencil centred there.
	f := func(x float64) complex128 { return complex(math.Pow((x-start)/dt-6.5, 10), 0) }
	got := Resample(sampled(start, dt, n, f), start, dt, []float64{start + 6.5*dt})
	want := 1.0
	for k := 0.5; k < 5; k++ {
		want *= k * k
	}
	if d := real(got[0]); math.Abs(math.Abs(d)-want) > 1e-9*want {
		t.Errorf("degree 10 in the middle misses by %g, want %g", d, want)
	}
}

// TestResampleOrder: on a tone the error falls with the tenth power of the step,
// in the interior and at the ends apart.
func TestResampleOrder(t *testing.T) {
	f := func(x float64) complex128 { return cmplx.Exp(complex(0, -x)) }
	miss := func(dt float64, n int, from, to float64) float64 {
		worst := 0.0
		at := between(from*dt, to*dt, 400)
		for i, v := range Resample(sampled(0, dt, n, f), 0, dt, at) {
			worst = max(worst, cmplx.Abs(v-f(at[i])))
		}
		return worst
	}
	for name, c := range map[string][2]float64{"interior": {8, 9}, "start": {0, 1}, "end": {19, 20}} {
		a, b := miss(0.8, 21, c[0], c[1]), miss(0.4, 21, c[0], c[1])
		// Measured: 9.9 to 10.0.
		if got := math.Log2(a / b); math.Abs(got-10) > 0.3 {
			t.Errorf("%s: errors %.3g and %.3g, order %.2f instead of 10", name, a, b, got)
		}
	}
}

func TestResampleAtSamples(t *testing.T) {
	v := sampled(-2, 0.25, 20, func(x float64) complex128 { return complex(math.Sin(5*x), x) })
	for k := range v {
		if got := Resample(v, -2, 0.25, []float64{-2 + 0.25*float64(k)}); got[0] != v[k] {
			t.Errorf("sample %d comes back as %v, not %v", k, got[0], v[k])
		}
	}
	// A rounding outside the samples is accepted, and continues smoothly.
	for _, x := range []float64{-2 - 1e-9, -2 + 0.25*19 + 1e-9} {
		Resample(v, -2, 0.25, []float64{x})
	}
	if got := Resample(v, -2, 0.25, nil); len(got) != 0 {
		t.Errorf("no times give %v", got)
	}
}

func TestResamplePanics(t *testing.T) {
	v := make([]complex128, 12)
	for name, f := range map[string]func(){
		"too few": func() { Resample(v[:9], 0, 1, []float64{1}) },
		"before":  func() { Resample(v, 0, 1, []float64{-0.01}) },
		"after":   func() { Resample(v, 0, 1, []float64{11.01}) },
	} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("%s: no panic", name)
				}
			}()
			f()
		}()
	}
}
