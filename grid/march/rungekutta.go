package march

import (
	"fmt"
	"math"
)

// Tableau is an explicit Runge–Kutta scheme as data: stage i is evaluated at
// t + C[i] dt from u + dt sum_j A[i][j] k_j, and the step is u + dt sum B[i] k_i.
type Tableau struct {
	Name   string
	Source string
	Order  int
	C      []float64
	A      [][]float64
	B      []float64
}

// RungeKutta advances any system with an explicit tableau.
type RungeKutta struct {
	sys   System
	tab   *Tableau
	k     [][]float64
	y     []float64
	limit float64
	// the stages that a sum takes, and their factors
	terms  [][]float64
	coeffs []float64
}

// NewRungeKutta returns the stepper for states of the given length. It panics
// when the tableau is not explicit or not consistent in its lengths.
func NewRungeKutta(sys System, tab *Tableau, length int) *RungeKutta {
	n := len(tab.B)
	if len(tab.C) != n || len(tab.A) != n {
		panic(fmt.Sprintf("march: tableau %s has %d, %d, %d rows", tab.Name, len(tab.C), len(tab.A), n))
	}
	rk := &RungeKutta{sys: sys, tab: tab, y: make([]float64, length),
		terms: make([][]float64, 0, n), coeffs: make([]float64, 0, n)}
	for i := 0; i < n; i++ {
		if len(tab.A[i]) > i {
			panic(fmt.Sprintf("march: tableau %s is not explicit in stage %d", tab.Name, i+1))
		}
		rk.k = append(rk.k, make([]float64, length))
	}
	// Stability polynomial: 1 + sum_i b_i z k_i(z), k_i = 1 + z sum a_ij k_j.
	ks := make([][]float64, n)
	poly := make([]float64, n+1)
	poly[0] = 1
	for i := range ks {
		ks[i] = make([]float64, n)
		ks[i][0] = 1
		for j, a := range tab.A[i] {
			for d := 0; d+1 < n; d++ {
				ks[i][d+1] += a * ks[j][d]
			}
		}
		for d := 0; d < n; d++ {
			poly[d+1] += tab.B[i] * ks[i][d]
		}
	}
	rk.limit = imaginaryLimit(poly)
	return rk
}

// Step implements Stepper.
func (s *RungeKutta) Step(u []float64, t, dt float64) {
	for i := range s.tab.B {
		y := u
		if i > 0 {
			y = s.y
			s.add(y, u, s.tab.A[i], dt)
		}
		s.sys.RHS(s.k[i], y, t+s.tab.C[i]*dt)
	}
	s.add(u, u, s.tab.B, dt)
}

// add writes u + dt sum_j a_j k_j into y, which may be u, in one sweep.
func (s *RungeKutta) add(y, u, a []float64, dt float64) {
	s.terms, s.coeffs = s.terms[:0], s.coeffs[:0]
	for j, v := range a {
		if v != 0 {
			s.terms = append(s.terms, s.k[j])
			s.coeffs = append(s.coeffs, v*dt)
		}
	}
	active.combine(y, u, s.terms, s.coeffs)
}

// Order implements Stepper.
func (s *RungeKutta) Order() int { return s.tab.Order }

// ImaginaryLimit implements Stepper.
func (s *RungeKutta) ImaginaryLimit() float64 { return s.limit }

// RK4 is the classical scheme of fourth order.
//
// Source: W. Kutta, Z. Math. Phys. 46, 435 (1901).
func RK4() *Tableau {
	return &Tableau{
		Name: "rk4", Source: "Kutta 1901", Order: 4,
		C: []float64{0, .5, .5, 1},
		A: [][]float64{{}, {.5}, {0, .5}, {0, 0, 1}},
		B: []float64{1. / 6, 1. / 3, 1. / 3, 1. / 6},
	}
}

// RK8 is the eleven-stage scheme of eighth order.
//
// Source: G. J. Cooper and J. H. Verner, SIAM J. Numer. Anal. 9, 389 (1972);
// coefficients from memory, held by the order test.
func RK8() *Tableau {
	s := math.Sqrt(21)
	return &Tableau{
		Name: "rk8", Source: "Cooper and Verner 1972", Order: 8,
		C: []float64{0, .5, .5, (7 + s) / 14, (7 + s) / 14, .5, (7 - s) / 14, (7 - s) / 14, .5, (7 + s) / 14, 1},
		A: [][]float64{
			{},
			{.5},
			{.25, .25},
			{1. / 7, (-7 - 3*s) / 98, (21 + 5*s) / 49},
			{(11 + s) / 84, 0, (18 + 4*s) / 63, (21 - s) / 252},
			{(5 + s) / 48, 0, (9 + s) / 36, (-231 + 14*s) / 360, (63 - 7*s) / 80},
			{(10 - s) / 42, 0, (-432 + 92*s) / 315, (633 - 145*s) / 90, (-504 + 115*s) / 70, (63 - 13*s) / 35},
			{1. / 14, 0, 0, 0, (14 - 3*s) / 126, (13 - 3*s) / 63, 1. / 9},
			{1. / 32, 0, 0, 0, (91 - 21*s) / 576, 11. / 72, (-385 - 75*s) / 1152, (63 + 13*s) / 128},
			{1. / 14, 0, 0, 0, 1. / 9, (-733 - 147*s) / 2205, (515 + 111*s) / 504, (-51 - 11*s) / 56, (132 + 28*s) / 245},
			{0, 0, 0, 0, (-42 + 7*s) / 18, (-18 + 28*s) / 45, (-273 - 53*s) / 72, (301 + 53*s) / 72, (28 - 28*s) / 45, (49 - 7*s) / 18},
		},
		B: []float64{1. / 20, 0, 0, 0, 0, 0, 0, 49. / 180, 16. / 45, 49. / 180, 1. / 20},
	}
}
