package signal_test

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"nullmark/extract/signal"
)

// chirp is a Gaussian burst of rising frequency about u0, with its first three
// derivatives: h = exp(g), g = -((u-u0)/w)^2 - i (a (u-u0) + b (u-u0)^2).
func chirp(u, u0, w, a, b float64) [4]complex128 {
	x := u - u0
	h := cmplx.Exp(complex(-x*x/(w*w), -(a*x + b*x*x)))
	g1 := complex(-2*x/(w*w), -(a + 2*b*x))
	g2 := complex(-2/(w*w), -2*b)
	return [4]complex128{h, g1 * h, (g1*g1 + g2) * h, (g1*g1*g1 + 3*g1*g2) * h}
}

// TestJetBoundsHold: value and derivatives of known signals at random times,
// samplings and errors of the samples lie inside the bounds, and the bounds are
// not idle.
func TestJetBoundsHold(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 11))
	const trials = 1500
	inside, ratios := [4]int{}, [4][]float64{}
	for range trials {
		w, a, b := 6+14*r.Float64(), 0.1+0.8*r.Float64(), 0.005*r.Float64()
		dt := math.Exp(math.Log(0.02) + r.Float64()*math.Log(30))
		noise := math.Pow(10, -14+8*r.Float64())
		n := int(80 / dt)
		s := signal.Series{Start: -40, Dt: dt, Values: make([]complex128, n), Err: make([]float64, n)}
		ph := 2 * math.Pi * r.Float64()
		slow := r.Float64() < 0.5
		for k := range s.Values {
			s.Err[k] = noise
			e := cmplx.Rect(noise*r.Float64(), 2*math.Pi*r.Float64())
			if slow { // errors of a scheme are smooth
				e = cmplx.Rect(noise, ph+0.7*s.Time(k))
			}
			s.Values[k] = chirp(s.Time(k), 0, w, a, b)[0] + e
		}
		u := -15 + 30*r.Float64()
		j, err := s.At(u)
		if err != nil {
			t.Fatal(err)
		}
		want := chirp(u, 0, w, a, b)
		for d := range want {
			var only [4]complex128
			only[d] = 1
			bound := j.Linear(only)
			miss := cmplx.Abs(j.D[d] - want[d])
			if miss <= bound {
				inside[d]++
			}
			ratios[d] = append(ratios[d], bound/(miss+1e-17))
		}
	}
	for d := range inside {
		if inside[d] < trials*999/1000 {
			t.Errorf("derivative %d: %d of %d inside the bound", d, inside[d], trials)
		}
		if m := median(ratios[d]); m > 100 {
			t.Errorf("derivative %d: the bound is %g times the error in the median", d, m)
		}
	}
}

func median(x []float64) float64 {
	y := append([]float64(nil), x...)
	for i := 1; i < len(y); i++ {
		for k := i; k > 0 && y[k] < y[k-1]; k-- {
			y[k], y[k-1] = y[k-1], y[k]
		}
	}
	return y[len(y)/2]
}

func TestJetExactForPolynomials(t *testing.T) {
	s := signal.Series{Start: -1, Dt: 0.1, Values: make([]complex128, 21)}
	f := func(x float64, n float64) float64 { return math.Pow(x, n) }
	for k := range s.Values {
		s.Values[k] = complex(f(s.Time(k), 12), f(s.Time(k), 5))
	}
	j, err := s.At(0.03)
	if err != nil {
		t.Fatal(err)
	}
	x := 0.03
	want := 5 * 4 * 3 * f(x, 2)
	if got := imag(j.D[3]); math.Abs(got-want) > 1e-9 {
		t.Errorf("third derivative of x^5: %g, want %g", got, want)
	}
	if got, want := real(j.D[1]), 12*f(x, 11); math.Abs(got-want) > 1e-12 {
		t.Errorf("first derivative of x^12: %g, want %g", got, want)
	}
	if _, err := s.At(1.2); err == nil {
		t.Error("a time outside the samples was accepted")
	}
}

func TestPhase(t *testing.T) {
	// 0.9 turn a sample at the end: only a tracked rate gets the branch right.
	n := 4000
	s := signal.Series{Dt: 1, Values: make([]complex128, n), Err: make([]float64, n)}
	want := make([]float64, n)
	r := rand.New(rand.NewPCG(3, 5))
	for k := range want {
		x := float64(k)
		want[k] = 0.02*x + 0.9*math.Pi*x*x/float64(n)
		s.Err[k] = 1e-4
		a := 1.0
		if k > 1500 && k < 1520 {
			a = 0 // only noise
		}
		s.Values[k] = cmplx.Rect(a, -want[k]) + cmplx.Rect(1e-4*r.Float64(), 6.3*r.Float64())
	}
	phi, sure := signal.Phase(s)
	for k := range phi {
		faint := k > 1500 && k < 1520
		if sure[k] == faint {
			t.Fatalf("sample %d: sure is %v", k, sure[k])
		}
		if !faint && math.Abs(phi[k]-want[k]) > 2e-4 {
			t.Fatalf("sample %d: phase %g, want %g", k, phi[k], want[k])
		}
	}
}

func TestIntegral(t *testing.T) {
	for _, n := range []int{17, 30, 101} {
		f := make([]float64, n)
		dt := 2 / float64(n-1)
		for k := range f {
			f[k] = math.Pow(float64(k)*dt, 6)
		}
		want := math.Pow(2, 7) / 7
		v, bar := signal.Integral(f, dt)
		if math.Abs(v-want) > 1e-12*want || bar < math.Abs(v-want) {
			t.Errorf("n = %d: the integral of x^6 is %.15g +- %g, want %.15g", n, v, bar, want)
		}
		for k := range f {
			f[k] = math.Exp(float64(k) * dt)
		}
		v, bar = signal.Integral(f, dt)
		if want := math.Exp(2) - 1; math.Abs(v-want) > bar || bar > 1e-5 {
			t.Errorf("n = %d: the integral of exp is off by %g with bar %g", n, v-want, bar)
		}
	}
}

func TestRest(t *testing.T) {
	const dt = 0.1
	n := 3000
	f := make([]float64, n)
	for _, c := range []struct {
		name string
		f    func(x float64) float64
		rest float64
	}{
		{"exponential", func(x float64) float64 { return math.Exp(-x / 50) }, 50 * math.Exp(-6)},
		{"power", func(x float64) float64 { return math.Pow(x+20, -4) }, math.Pow(320, -3) / 3},
	} {
		for k := range f {
			f[k] = c.f(float64(k) * dt)
		}
		got, ok := signal.Rest(f, nil, dt, 500, 20/dt)
		if !ok || got < c.rest || got > 4*c.rest {
			t.Errorf("%s: bound %g of the rest %g, ok %v", c.name, got, c.rest, ok)
		}
	}
	for k := range f {
		f[k] = 1
	}
	if _, ok := signal.Rest(f, nil, dt, 500, 0); ok {
		t.Error("a constant is said to fall")
	}
}

func TestFaultsAreNamed(t *testing.T) {
	good := signal.Series{Dt: 1, Values: make([]complex128, 40)}
	if err := good.Check(); err != nil {
		t.Fatal(err)
	}
	for name, s := range map[string]signal.Series{
		"short":        {Dt: 1, Values: make([]complex128, 5)},
		"step":         {Dt: 0, Values: make([]complex128, 40)},
		"bars":         {Dt: 1, Values: make([]complex128, 40), Err: make([]float64, 3)},
		"not a bar":    {Dt: 1, Values: make([]complex128, 40), Err: append(make([]float64, 39), math.NaN())},
		"not a number": {Dt: 1, Values: append(make([]complex128, 39), cmplx.NaN())},
	} {
		if s.Check() == nil {
			t.Errorf("%s: no fault found", name)
		}
	}
	if _, _, err := good.Span(30, 50); err == nil {
		t.Error("an interval outside the samples was accepted")
	}
}
