package source

import (
	"fmt"
	"math"
	"testing"
)

// moment is the j-th moment of the kernel and of its derivative about zero. The
// trapezoidal sum of a function this smooth is exact to round-off; size is the
// sum of the absolute terms.
func moment(k Kernel, j int) (m, m1, size, size1 float64) {
	h := k.Sigma / 16
	n := int(1.2 * k.Reach() / h)
	for i := -n; i <= n; i++ {
		x := float64(i) * h
		d, d1 := k.At(x)
		w := math.Pow(x, float64(j)) * h
		m += w * d
		m1 += w * d1
		size += math.Abs(w * d)
		size1 += math.Abs(w * d1)
	}
	return
}

// TestMoments: the moments 0 to p-1 are 1, 0, ..., 0 and the p-th is
// -(-1)^{p/2} p!/(p/2)! (sigma^2/2)^{p/2}, from the kernel's Fourier transform
// e^{-q} sum_{j<p/2} q^j/j! = 1 - q^{p/2}/(p/2)! + ..., q = (k sigma)^2/2. Those
// of the derivative follow by parts.
func TestMoments(t *testing.T) {
	for p := 2; p <= 16; p += 2 {
		for _, sigma := range []float64{0.3, 1, 2.5} {
			k := NewKernel(sigma, p)
			last := -1.0
			if p/2%2 == 1 {
				last = 1
			}
			last *= math.Gamma(float64(p+1)) / math.Gamma(float64(p/2+1)) * math.Pow(sigma*sigma/2, float64(p/2))
			want := func(j int) float64 {
				switch j {
				case 0:
					return 1
				case p:
					return last
				}
				return 0
			}
			for j := 0; j <= p+1; j++ {
				m, m1, size, size1 := moment(k, j)
				// The Hermite sum itself cancels: measured up to 5e-15 of size.
				if j <= p && math.Abs(m-want(j)) > 2e-14*size {
					t.Errorf("p = %d, sigma = %g: moment %d is %.17g, want %.17g (size %.3g)", p, sigma, j, m, want(j), size)
				}
				by := 0.0
				if j > 0 {
					by = -float64(j) * want(j-1)
				}
				if math.Abs(m1-by) > 2e-14*size1 {
					t.Errorf("p = %d, sigma = %g: moment %d of the derivative is %.17g, want %.17g (size %.3g)", p, sigma, j, m1, by, size1)
				}
			}
			if _, _, size, _ := moment(k, p); math.Abs(last) < 1e3*2e-14*size {
				t.Errorf("p = %d: the moment that should not vanish is hidden in round-off", p)
			}
		}
	}
}

// TestKernelDerivative against central differences of order 6.
func TestKernelDerivative(t *testing.T) {
	for p := 2; p <= 16; p += 2 {
		k := NewKernel(1.3, p)
		f := func(x float64) float64 { d, _ := k.At(x); return d }
		peak := f(0)
		for x := -8.0; x <= 8; x += 0.23 {
			_, d1 := k.At(x)
			if want := slope(f, x, 0.01); math.Abs(d1-want) > 1e-9*peak {
				t.Errorf("p = %d: derivative at %g is %.12g, want %.12g", p, x, d1, want)
			}
			a, a1 := k.At(-x)
			if b, b1 := k.At(x); a != b || a1 != -b1 {
				t.Errorf("p = %d: the kernel is not even at %g", p, x)
			}
		}
	}
}

// slope is a central difference of order 6.
func slope(f func(float64) float64, x, h float64) float64 {
	return (45*(f(x+h)-f(x-h)) - 9*(f(x+2*h)-f(x-2*h)) + f(x+3*h) - f(x-3*h)) / (60 * h)
}

// TestReach: beyond it the kernel is below 1e-16 of its peak, and not already
// everywhere at four fifths of it.
func TestReach(t *testing.T) {
	for p := 2; p <= 16; p += 2 {
		k := NewKernel(0.7, p)
		peak, _ := k.At(0)
		before := 0.0
		for s := 0.8; s < 3; s += 0.001 {
			d, d1 := k.At(s * k.Reach())
			if s >= 1 && (math.Abs(d) > 1e-16*peak || math.Abs(d1)*k.Sigma > 1e-14*peak) {
				t.Errorf("p = %d: %.3g and %.3g of the peak at %.3f reaches", p, d/peak, d1*k.Sigma/peak, s)
				break
			}
			if s < 1 {
				before = max(before, math.Abs(d)/peak)
			}
		}
		if before < 1e-15 {
			t.Errorf("p = %d: only %.3g of the peak at 0.8 reaches", p, before)
		}
	}
}

func TestKernelPanics(t *testing.T) {
	for _, c := range []struct {
		sigma   float64
		moments int
	}{{0, 4}, {-1, 4}, {math.NaN(), 4}, {1, 0}, {1, 3}, {1, 18}} {
		if !panics(func() { NewKernel(c.sigma, c.moments) }) {
			t.Errorf("sigma %g with %d moments: no panic", c.sigma, c.moments)
		}
	}
}

func panics(f func()) (did bool) {
	defer func() { did = recover() != nil }()
	f()
	return
}

// TestRamp: (1+erf)/2 by the standard library's erf; each derivative against
// differences of the one before; closed values at the centre, where the n-th
// derivative of erf is 2/sqrt(pi) (-1)^k (2k)!/k! for n = 2k+1 and 0 for even n
// (Abramowitz and Stegun 7.1.19 and 22.4.8, from memory).
func TestRamp(t *testing.T) {
	r := Ramp{Centre: 80, Width: 17}
	jet := func(t float64) []float64 { d := make([]float64, MaxDerivative+1); r.Jet(d, t); return d }
	for x := -20.0; x <= 180; x += 7.3 {
		d := jet(x)
		if want := (1 + math.Erf((x-80)/17)) / 2; math.Abs(d[0]-want) > 2e-16 {
			t.Errorf("ramp at %g: %.17g, want %.17g", x, d[0], want)
		}
		for n := 1; n < len(d); n++ {
			want := slope(func(x float64) float64 { return jet(x)[n-1] }, x, 0.05)
			// The largest value of the n-th derivative is below 2 sqrt((2n)!/n!)/17^n.
			size := 2 * math.Sqrt(math.Gamma(float64(2*n+1))/math.Gamma(float64(n+1))) / math.Pow(17, float64(n))
			if math.Abs(d[n]-want) > 1e-11*size {
				t.Errorf("derivative %d at %g: %.12g, want %.12g (size %.3g)", n, x, d[n], want, size)
			}
		}
	}
	c := jet(80)
	for n := 1; n < len(c); n++ {
		want := 0.0
		if n%2 == 1 {
			k := float64(n / 2)
			want = math.Gamma(2*k+1) / math.Gamma(k+1) / math.Sqrt(math.Pi) / math.Pow(17, float64(n))
			if n/2%2 == 1 {
				want = -want
			}
		}
		if math.Abs(c[n]-want) > 1e-15*math.Abs(want) {
			t.Errorf("derivative %d at the centre: %.17g, want %.17g", n, c[n], want)
		}
	}
	// Zero to double precision, relative to one, before Centre - 6 Width; the
	// tail keeps its relative precision.
	if d := jet(80 - 6*17); !(d[0] > 0 && d[0] < 2e-17) {
		t.Errorf("the ramp starts at %g", d[0])
	}
	on := make([]float64, 4)
	for i := range on {
		on[i] = 9
	}
	On().Jet(on, -1e9)
	if fmt.Sprint(on) != "[1 0 0 0]" {
		t.Errorf("a source that has always been on: %v", on)
	}
}
