package march

import "fmt"

// Compensated is Taylor with the state held to twice the working precision
// where it matters: the terms of a step are summed into an increment, which is
// added to the state with its rounding error carried along (compensated
// summation). Slow solutions, whose steps change the state by little, keep
// digits that a plain sum loses to round-off. A second increment (a filter's) may
// follow each step.
type Compensated struct {
	sys     Linear
	n       int
	v, w    []float64
	inc, lo []float64
	limit   float64
	// Increment, if set, is called after each step with inc = 0 and adds to it
	// the change that it wants of u; it must not modify u.
	Increment func(inc, u []float64)
}

// NewCompensated returns the stepper of the given order (1 to 12) for states of
// the given length. The error carried along starts at zero and belongs to the
// state that Step is called with: do not modify that state in between.
func NewCompensated(sys Linear, order, length int) *Compensated {
	if order < 1 || order > 12 {
		panic(fmt.Sprintf("march: Taylor order %d: want 1 to 12", order))
	}
	poly := make([]float64, order+1)
	poly[0] = 1
	for j := 1; j <= order; j++ {
		poly[j] = poly[j-1] / float64(j)
	}
	buf := func() []float64 { return make([]float64, length) }
	return &Compensated{sys: sys, n: order, v: buf(), w: buf(), inc: buf(), lo: buf(), limit: imaginaryLimit(poly)}
}

// Step implements Stepper.
func (s *Compensated) Step(u []float64, t, dt float64) {
	v, w, inc := s.v, s.w, s.inc
	copy(v, u)
	clear(inc)
	s.sys.Prepare(t, dt)
	coeff := 1.0
	for j := 0; j < s.n; j++ {
		s.sys.Apply(w, v)
		c := dt / float64(j+1)
		coeff *= c
		scale(w, c)
		s.sys.AddForce(w, j, coeff)
		v, w = w, v
		add(inc, v)
	}
	s.v, s.w = v, w
	apply(u, inc, s.lo)
	if s.Increment != nil {
		clear(inc)
		s.Increment(inc, u)
		apply(u, inc, s.lo)
	}
}

// apply adds inc to u, with lo the part of u that does not fit into it.
func apply(u, inc, lo []float64) {
	inc, lo = inc[:len(u)], lo[:len(u)]
	for i, a := range u {
		b := inc[i] + lo[i]
		x := a + b
		z := x - a
		lo[i] = (a - (x - z)) + (b - z)
		u[i] = x
	}
}

func scale(w []float64, c float64) {
	for i := range w {
		w[i] *= c
	}
}

func add(a, b []float64) {
	b = b[:len(a)]
	for i := range a {
		a[i] += b[i]
	}
}

// Order implements Stepper.
func (s *Compensated) Order() int { return s.n }

// ImaginaryLimit implements Stepper.
func (s *Compensated) ImaginaryLimit() float64 { return s.limit }
