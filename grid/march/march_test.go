package march

import (
	"fmt"
	"math"
	"testing"
)

// dense is u' = A u + s(t) with s given by its derivatives.
type dense struct {
	a     [][]float64
	force func(j int, t float64) []float64 // j-th derivative of s; nil = none
	t     float64
}

func (d *dense) Apply(dst, u []float64) {
	for i, row := range d.a {
		dst[i] = 0
		for j, w := range row {
			dst[i] += w * u[j]
		}
	}
}

func (d *dense) RHS(dst, u []float64, t float64) {
	d.Apply(dst, u)
	if d.force != nil {
		for i, v := range d.force(0, t) {
			dst[i] += v
		}
	}
}

func (d *dense) Prepare(t, _ float64) { d.t = t }

func (d *dense) AddForce(dst []float64, j int, scale float64) {
	if d.force != nil {
		for i, v := range d.force(j, d.t) {
			dst[i] += scale * v
		}
	}
}

// nonlinear is u' = f(u, t).
type nonlinear func(dst, u []float64, t float64)

func (f nonlinear) RHS(dst, u []float64, t float64) { f(dst, u, t) }

var (
	_ Linear = (*dense)(nil)
	_ System = nonlinear(nil)
)

// matrix3 couples three components; nothing about it is special.
func matrix3() [][]float64 {
	return [][]float64{{-0.3, 1.1, 0.2}, {-0.9, 0.1, -0.4}, {0.5, 0.3, -0.2}}
}

// falling is k (k-1) ... (k-j+1).
func falling(k, j int) float64 {
	p := 1.0
	for i := 0; i < j; i++ {
		p *= float64(k - i)
	}
	return p
}

// polynomial is the forced system whose solution is u_i = (i+1) (1 + t^degree):
// s = u' - A u.
func polynomial(degree int) (*dense, func(t float64) []float64) {
	a := matrix3()
	u := func(j int, t float64) []float64 { // j-th derivative
		x := 0.0
		if j <= degree {
			x = falling(degree, j) * math.Pow(t, float64(degree-j))
		}
		if j == 0 {
			x++
		}
		return []float64{x, 2 * x, 3 * x}
	}
	d := &dense{a: a, force: func(j int, t float64) []float64 {
		v, out := u(j, t), u(j+1, t)
		for i := range out {
			for k, w := range a[i] {
				out[i] -= w * v[k]
			}
		}
		return out
	}}
	return d, func(t float64) []float64 { return u(0, t) }
}

// TestTaylorExactness: one step of order n is exact where the solution is a
// polynomial of degree n and misses exactly dt^{n+1} of one of degree n+1
// (u^(n+1) dt^{n+1}/(n+1)!, Taylor's theorem). It holds only when every
// derivative of the forcing enters with the right factor.
func TestTaylorExactness(t *testing.T) {
	const t0, dt = 0.4, 0.7
	for order := 1; order <= 12; order++ {
		for degree := 1; degree <= order+1; degree++ {
			sys, exact := polynomial(degree)
			s := NewTaylor(sys, order, 3)
			u := exact(t0)
			s.Step(u, t0, dt)
			miss := 0.0
			if degree == order+1 {
				miss = math.Pow(dt, float64(degree))
			}
			for i, want := range exact(t0 + dt) {
				if got := (want - u[i]) / float64(i+1); math.Abs(got-miss) > 3e-15*(1+math.Abs(want)) {
					t.Errorf("order %d on degree %d: component %d misses by %.3g, want %.3g", order, degree, i, got, miss)
				}
			}
		}
	}
}

// swing is x” = B x + C x' + s(t) in two blocks, with s such that
// x_i = (i+1) (1 + t^degree).
type swing struct {
	degree int
	t      float64
}

func (w *swing) x(i, j int, t float64) float64 { // j-th derivative
	v := 0.0
	if j <= w.degree {
		v = falling(w.degree, j) * math.Pow(t, float64(w.degree-j))
	}
	if j == 0 {
		v++
	}
	return v * float64(i+1)
}

// rates are row i of B and C.
func (w *swing) rates(i int) (b, c [2]float64) {
	return [2][2]float64{{-1.1, 0.3}, {0.2, -0.7}}[i], [2][2]float64{{-0.2, 0.5}, {-0.4, 0.1}}[i]
}

func (w *swing) Accelerate(dst, x, y []float64, sum *Sum) {
	for i := range dst {
		b, c := w.rates(i)
		dst[i] = b[0]*x[0] + b[1]*x[1] + c[0]*y[0] + c[1]*y[1]
	}
	if sum != nil {
		sum.Add(x, y, 0, 2)
	}
}

func (w *swing) Apply(dst, u []float64) {
	copy(dst[:2], u[2:])
	w.Accelerate(dst[2:], u[:2], u[2:], nil)
}

func (w *swing) RHS(dst, u []float64, t float64) {
	w.Apply(dst, u)
	w.t = t
	w.AddAcceleration(dst[2:], 0, 1)
}

func (w *swing) Prepare(t, _ float64) { w.t = t }

func (w *swing) AddForce(dst []float64, j int, scale float64) {
	w.AddAcceleration(dst[2:], j, scale)
}

func (w *swing) AddAcceleration(dst []float64, j int, scale float64) {
	for i := range dst {
		b, c := w.rates(i)
		s := w.x(i, j+2, w.t)
		for k := range b {
			s -= b[k]*w.x(k, j, w.t) + c[k]*w.x(k, j+1, w.t)
		}
		dst[i] += scale * s
	}
}

var _ SecondOrder = (*swing)(nil)

// TestTaylorExactnessOfSecondOrder is the same for the form in blocks: x and x'
// are exact while x has degree n; at n+1 x misses dt^{n+1} and x', of degree n,
// nothing; at n+2 x' misses (n+2) dt^{n+1} ((n+1)! and t taken out).
func TestTaylorExactnessOfSecondOrder(t *testing.T) {
	const t0, dt = 0, 0.7
	for order := 1; order <= 12; order++ {
		for degree := 1; degree <= order+2; degree++ {
			sys := &swing{degree: degree}
			s := NewTaylor(sys, order, 4)
			if s.second == nil {
				t.Fatal("the form in blocks is not in use")
			}
			u := make([]float64, 4)
			for i := range 2 {
				u[i], u[2+i] = sys.x(i, 0, t0), sys.x(i, 1, t0)
			}
			s.Step(u, t0, dt)
			missX, missY := 0.0, 0.0
			switch degree {
			case order + 1:
				missX = math.Pow(dt, float64(order+1))
			case order + 2:
				missX = math.Pow(dt, float64(order+2))
				missY = float64(order+2) * math.Pow(dt, float64(order+1))
			}
			for i := range 2 {
				x, y := (sys.x(i, 0, t0+dt)-u[i])/float64(i+1), (sys.x(i, 1, t0+dt)-u[2+i])/float64(i+1)
				if math.Abs(x-missX) > 1e-14 || math.Abs(y-missY) > 1e-14 {
					t.Errorf("order %d on degree %d: misses %.3g and %.3g, want %.3g and %.3g", order, degree, x, y, missX, missY)
				}
			}
		}
	}
}

// rotator is u” = -u + cos(w t) in first order; forced, its solution from rest
// is (cos w t - cos t)/(1-w^2).
func rotator(w float64, forced bool) (*dense, func(t float64) []float64) {
	d := &dense{a: [][]float64{{0, 1}, {-1, 0}}}
	if !forced {
		return d, func(t float64) []float64 { return []float64{math.Cos(t), -math.Sin(t)} }
	}
	d.force = func(j int, t float64) []float64 {
		return []float64{0, math.Pow(w, float64(j)) * math.Cos(w*t+float64(j)*math.Pi/2)}
	}
	return d, func(t float64) []float64 {
		return []float64{(math.Cos(w*t) - math.Cos(t)) / (1 - w*w), (math.Sin(t) - w*math.Sin(w*t)) / (1 - w*w)}
	}
}

// march goes from t = 0 to end in n steps and returns the largest error.
func march(s Stepper, u []float64, want []float64, end float64, n int) float64 {
	dt := end / float64(n)
	for k := 0; k < n; k++ {
		s.Step(u, float64(k)*dt, dt)
	}
	e := 0.0
	for i := range u {
		e = max(e, math.Abs(u[i]-want[i]))
	}
	return e
}

// checkOrder holds the errors at n and 2n steps to the order: not less, and not
// the next one either.
func checkOrder(t *testing.T, name string, order int, run func(n int) float64, n int) {
	t.Helper()
	a, b := run(n), run(2*n)
	got := math.Log2(a / b)
	// Measured in these problems: within 0.36 of the order (twelfth, unforced).
	if math.Abs(got-float64(order)) > 0.4 || b < 1e-14 {
		t.Errorf("%s: errors %.3g and %.3g at %d and %d steps, order %.2f instead of %d", name, a, b, n, 2*n, got, order)
	}
}

func TestTaylorConverges(t *testing.T) {
	for order := 1; order <= 12; order++ {
		for _, forced := range []bool{false, true} {
			sys, exact := rotator(1.7, forced)
			n := 64
			if order > 3 {
				n = 12
			}
			if order > 7 {
				n = 6
			}
			if order < 2 {
				n = 1024
			}
			checkOrder(t, fmt.Sprintf("Taylor %d, forced %v", order, forced), order, func(n int) float64 {
				return march(NewTaylor(sys, order, 2), exact(0), exact(6), 6, n)
			}, n)
		}
	}
}

func tableaux() []*Tableau { return []*Tableau{RK4(), RK8()} }

// TestRungeKuttaConverges on problems with closed solutions: linear and forced;
// nonlinear and dependent on t; a Kepler orbit (a nonlinear system), whose
// solution is periodic.
func TestRungeKuttaConverges(t *testing.T) {
	for _, tab := range tableaux() {
		n := 48
		if tab.Order == 8 {
			n = 10
		}
		lin, exact := rotator(1.7, true)
		checkOrder(t, tab.Name+" linear", tab.Order, func(n int) float64 {
			return march(NewRungeKutta(lin, tab, 2), exact(0), exact(6), 6, n)
		}, n)
		// u' = -2 t u^2, u = 1/(1+t^2); u' = (cos t/2)(1+u^2), u = tan(sin(t)/2).
		checkOrder(t, tab.Name+" nonlinear", tab.Order, func(n int) float64 {
			f := nonlinear(func(dst, u []float64, t float64) {
				dst[0] = -2 * t * u[0] * u[0]
				dst[1] = 0.5 * math.Cos(t) * (1 + u[1]*u[1])
			})
			const end = 3.0
			return march(NewRungeKutta(f, tab, 2), []float64{1, 0}, []float64{1 / (1 + end*end), math.Tan(math.Sin(end) / 2)}, end, n)
		}, 2*n)
		checkOrder(t, tab.Name+" Kepler", tab.Order, func(n int) float64 {
			f := nonlinear(func(dst, u []float64, _ float64) {
				r3 := math.Pow(u[0]*u[0]+u[1]*u[1], 1.5)
				dst[0], dst[1], dst[2], dst[3] = u[2], u[3], -u[0]/r3, -u[1]/r3
			})
			const e = 0.2
			start := []float64{1 - e, 0, 0, math.Sqrt((1 + e) / (1 - e))}
			return march(NewRungeKutta(f, tab, 4), append([]float64(nil), start...), start, 2*math.Pi, n)
		}, 5*n)
	}
}

// TestQuadratureConditions: sum b_i c_i^k = 1/(k+1) for k below the order and
// not at the order (J. C. Butcher, Numerical Methods for Ordinary Differential
// Equations, the conditions of the bushy trees, from memory); stages are
// consistent, sum_j a_ij = c_i.
func TestQuadratureConditions(t *testing.T) {
	for _, tab := range tableaux() {
		for k := 0; k <= tab.Order; k++ {
			s := 0.0
			for i, b := range tab.B {
				s += b * math.Pow(tab.C[i], float64(k))
			}
			off := math.Abs(s - 1/float64(k+1))
			if k < tab.Order && off > 2e-16 {
				t.Errorf("%s: sum b c^%d is off by %g", tab.Name, k, off)
			}
			if k == tab.Order && off < 1e-6 {
				t.Errorf("%s: sum b c^%d holds, so the order is more than stated", tab.Name, k)
			}
		}
		for i, row := range tab.A {
			s := 0.0
			for _, a := range row {
				s += a
			}
			// Coefficients near 7 cancel to 0.17 in RK8's seventh stage.
			if math.Abs(s-tab.C[i]) > 3e-15 {
				t.Errorf("%s: stage %d sums to %g, not %g", tab.Name, i+1, s, tab.C[i])
			}
		}
	}
}

// growthRoot is the smallest y > 0 with |P(iy)|^2 = 1 + slack for the Taylor
// polynomial of order n, from the coefficients of |P|^2-1 in y^2, whose terms up
// to y^n vanish.
func growthRoot(n int, slack float64) float64 {
	c := make([]float64, 2*n+1)
	for j := 0; j <= n; j++ {
		for k := n + 1 - j; k <= n; k++ {
			if (j+k)%2 == 0 { // i^j (-i)^k = i^{j-k}
				s := 1.0
				if ((j-k)/2)%2 != 0 {
					s = -1
				}
				c[j+k] += s / (math.Gamma(float64(j+1)) * math.Gamma(float64(k+1)))
			}
		}
	}
	grows := func(y float64) bool {
		v := 0.0
		for m := 2 * n; m > n; m-- {
			v += c[m] * math.Pow(y, float64(m))
		}
		return v > slack
	}
	lo, hi := 0.0, 1e-3
	for !grows(hi) {
		lo, hi = hi, hi+0.01
	}
	for i := 0; i < 60; i++ {
		if mid := (lo + hi) / 2; grows(mid) {
			hi = mid
		} else {
			lo = mid
		}
	}
	return lo
}

// TestImaginaryLimits against closed values, sqrt 3 for the third and 2 sqrt 2
// for the fourth order (e.g. E. Hairer and G. Wanner, Solving Ordinary
// Differential Equations II, section IV.2, from memory), and against the exact
// polynomial for every order, with the growth of 1e-6 that is tolerated.
func TestImaginaryLimits(t *testing.T) {
	limit := func(order int) float64 { return NewTaylor(&dense{}, order, 1).ImaginaryLimit() }
	rk4 := NewRungeKutta(&dense{}, RK4(), 1).ImaginaryLimit()
	check := func(name string, got, want float64) {
		t.Helper()
		if math.Abs(got-want) > 1.5e-3 { // the scan steps by 1e-3
			t.Errorf("%s: limit %.4f, want %.4f", name, got, want)
		}
	}
	check("Taylor 3", limit(3), math.Sqrt(3))
	check("Taylor 4", limit(4), 2*math.Sqrt2)
	check("RK4", rk4, 2*math.Sqrt2)
	check("the test's own Taylor 3", growthRoot(3, 0), math.Sqrt(3))
	check("the test's own Taylor 4", growthRoot(4, 0), 2*math.Sqrt2)
	for order := 1; order <= 12; order++ {
		check(fmt.Sprintf("Taylor %d", order), limit(order), growthRoot(order, 2e-6))
	}
	check("Taylor 8, strictly", limit(8), growthRoot(8, 0))
}

// TestLimitsHold marches u' = i u at the limit (bounded) and 5 % beyond (grows).
func TestLimitsHold(t *testing.T) {
	sys, _ := rotator(1, false)
	var all []Stepper
	for order := 1; order <= 12; order++ {
		all = append(all, NewTaylor(sys, order, 2))
	}
	for _, tab := range tableaux() {
		all = append(all, NewRungeKutta(sys, tab, 2))
	}
	for i, s := range all {
		size := func(dt float64) float64 {
			u := []float64{1, 0}
			for k := 0; k < 4000; k++ {
				s.Step(u, 0, dt)
			}
			return math.Hypot(u[0], u[1])
		}
		lim := s.ImaginaryLimit()
		// Growth of 1e-6 a step is what the limit permits: e^0.004.
		if v := size(lim); v > 1.005 {
			t.Errorf("stepper %d (order %d): grows to %g at its limit %g", i, s.Order(), v, lim)
		}
		beyond := 1.05*lim + 2e-3
		if v := size(beyond); v < 1.005 {
			t.Errorf("stepper %d (order %d): only %g at %g, beyond its limit %g", i, s.Order(), v, beyond, lim)
		}
	}
}

// TestStabilityPolynomial: a Runge–Kutta step on u' = z u is e^z up to the order
// and not beyond.
func TestStabilityPolynomial(t *testing.T) {
	for _, tab := range tableaux() {
		rest := func(z float64) float64 {
			s := NewRungeKutta(&dense{a: [][]float64{{z}}}, tab, 1)
			u := []float64{1}
			s.Step(u, 0, 1)
			sum, term := 1.0, 1.0
			for j := 1; j <= tab.Order; j++ {
				term *= z / float64(j)
				sum += term
			}
			return u[0] - sum
		}
		// What is left of the Taylor sum is c z^{p+1} + ..., c != 1/(p+1)!.
		z := 0.05
		if tab.Order == 8 {
			z = 0.5
		}
		bound := math.Pow(z, float64(tab.Order+1))
		if r := rest(z); math.Abs(r) > bound || math.Abs(r-bound/math.Gamma(float64(tab.Order+2))) < 1e-3*bound/math.Gamma(float64(tab.Order+2)) {
			t.Errorf("%s: z = %g leaves %g, bound %g", tab.Name, z, r, bound)
		}
	}
}

func TestStepsDoNotAllocate(t *testing.T) {
	sys, _ := rotator(1, false)
	u := []float64{1, 0}
	for _, s := range []Stepper{NewTaylor(sys, 7, 2), NewTaylor(sys, 12, 2), NewRungeKutta(sys, RK4(), 2), NewRungeKutta(sys, RK8(), 2)} {
		if n := testing.AllocsPerRun(50, func() { s.Step(u, 0, 0.01) }); n != 0 {
			t.Errorf("order %d: %g allocations a step", s.Order(), n)
		}
	}
}

func panics(f func()) (did bool) {
	defer func() { did = recover() != nil }()
	f()
	return
}

func TestPanics(t *testing.T) {
	short := RK4()
	short.C = short.C[:3]
	implicit := RK4()
	implicit.A[1] = []float64{.25, .25}
	for name, f := range map[string]func(){
		"order 0":       func() { NewTaylor(&dense{}, 0, 1) },
		"order 13":      func() { NewTaylor(&dense{}, 13, 1) },
		"short tableau": func() { NewRungeKutta(&dense{}, short, 1) },
		"implicit":      func() { NewRungeKutta(&dense{}, implicit, 1) },
	} {
		if !panics(f) {
			t.Errorf("%s: no panic", name)
		}
	}
}
