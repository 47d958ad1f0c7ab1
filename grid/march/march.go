// Package march advances u' = rhs(u, t) in time. A stepper sees a flat state
// vector and a right-hand side; it knows nothing of grids, holes or equations.
package march

// System is a right-hand side: RHS writes du/dt at (u, t) into dst. dst and u
// have equal length and do not overlap; u must not be modified.
type System interface {
	RHS(dst, u []float64, t float64)
}

// Linear is a system u' = A u + s(t) with a constant A, as the Taylor stepper
// wants it.
type Linear interface {
	System
	// Apply writes A u into dst.
	Apply(dst, u []float64)
	// Prepare is called once a step, before AddForce, with the step's start
	// and length: the place to evaluate what the derivatives of s need.
	Prepare(t, dt float64)
	// AddForce adds the j-th time derivative of s at the prepared time,
	// times scale, to dst.
	AddForce(dst []float64, j int, scale float64)
}

// SecondOrder is a linear system of second order in time: its state is two
// blocks of equal length, [x][y], and
//
//	x' = y,  y' = B x + C y + s(t).
//
// The derivatives of its flow are one sequence of blocks, a_0 = x, a_1 = y,
// a_{j+2} = B a_j + C a_{j+1} + s^(j), of which the Taylor stepper makes use.
type SecondOrder interface {
	Linear
	// Accelerate writes B x + C y into dst, which overlaps neither x nor y.
	// If sum is not nil, it adds x and y to it once on each index; the blocks
	// of the sum overlap none of the others.
	Accelerate(dst, x, y []float64, sum *Sum)
	// AddAcceleration adds the j-th time derivative of s at the prepared
	// time, times scale, to dst, which has the length of one block.
	AddAcceleration(dst []float64, j int, scale float64)
}

// Sum gathers pairs of blocks: X += XX x + XY y and Y += YX x + YY y.
type Sum struct {
	X, Y           []float64
	XX, XY, YX, YY float64
}

// Add adds x and y on the indices lo..hi-1. X, Y, x and y have equal length and
// do not overlap.
func (s *Sum) Add(x, y []float64, lo, hi int) {
	active.pair(s.X[lo:hi], s.Y[lo:hi], x[lo:hi], y[lo:hi], &[4]float64{s.XX, s.XY, s.YX, s.YY})
}

// Stepper advances u in place from t to t+dt.
type Stepper interface {
	Step(u []float64, t, dt float64)
	// Order is the order of the global error in dt.
	Order() int
	// ImaginaryLimit is the largest |z|, z = i y, for which all smaller ones
	// are not amplified (to 1e-6): dt times the largest frequency of the
	// system must stay below it.
	ImaginaryLimit() float64
}

// Taylor is the Taylor series of the flow of a linear system,
//
//	u(t+dt) = sum_{j=0}^{n} dt^j/j! v_j,  v_0 = u,  v_{j+1} = A v_j + s^(j)(t).
//
// It needs two scratch states, or three scratch blocks for a SecondOrder
// system: there every block of derivatives is worked out once and none is
// copied. Order 8 is stable on the imaginary axis to 3.40.
type Taylor struct {
	sys    Linear
	second SecondOrder // sys, where it is one
	n      int
	v, w   []float64
	a      [3][]float64 // a_j stands in a[j%3]
	sum    Sum
	limit  float64
}

// NewTaylor returns the stepper of the given order (1 to 12) for states of the
// given length.
func NewTaylor(sys Linear, order, length int) *Taylor {
	if order < 1 || order > 12 {
		panic("march: Taylor order must be 1 to 12")
	}
	poly := make([]float64, order+1)
	poly[0] = 1
	for j := 1; j <= order; j++ {
		poly[j] = poly[j-1] / float64(j)
	}
	s := &Taylor{sys: sys, n: order, limit: imaginaryLimit(poly)}
	if second, ok := sys.(SecondOrder); ok {
		if length%2 != 0 {
			panic("march: the state of a second-order system has two blocks of equal length")
		}
		s.second = second
		for i := range s.a {
			s.a[i] = make([]float64, length/2)
		}
		return s
	}
	s.v, s.w = make([]float64, length), make([]float64, length)
	return s
}

// Step implements Stepper.
func (s *Taylor) Step(u []float64, t, dt float64) {
	if s.second != nil {
		s.stepBlocks(u, t, dt)
		return
	}
	v, w := s.v, s.w
	copy(v, u)
	s.sys.Prepare(t, dt)
	// v carries dt^j/j! v_j, so that nothing overflows or is scaled late.
	coeff := 1.0
	for j := 0; j < s.n; j++ {
		s.sys.Apply(w, v)
		c := dt / float64(j+1)
		coeff *= c
		// w = A (dt^j/j! v_j); times c it is dt^{j+1}/(j+1)! A v_j.
		active.accumulate(u[:len(w)], w, c)
		s.sys.AddForce(u, j, coeff)
		s.sys.AddForce(w, j, coeff)
		v, w = w, v
	}
	s.v, s.w = v, w
}

// stepBlocks is Step for second order in time: with c_j = dt^j/j!,
//
//	x(t+dt) = sum_{j=0}^{n} c_j a_j,  y(t+dt) = sum_{j=0}^{n} c_j a_{j+1}.
//
// The blocks are summed in pairs, while they are at hand for the next one.
func (s *Taylor) stepBlocks(u []float64, t, dt float64) {
	half := len(s.a[0])
	x, y := u[:half:half], u[half:2*half]
	s.second.Prepare(t, dt)
	sum := &s.sum
	sum.X, sum.Y = x, y
	before, c := 0.0, 1.0 // c_{j-1} and c_j
	for j := 0; j < s.n; j++ {
		var p, q []float64 // a_j and a_{j+1}
		switch j {
		case 0:
			p, q = x, y
		case 1:
			p, q = y, s.a[2]
		default:
			p, q = s.a[j%3], s.a[(j+1)%3]
		}
		next := dt / float64(j+1) * c
		into := (*Sum)(nil)
		if j == 2 {
			// a_0 and a_1 have served, as x and y themselves.
			axpy(x, y, dt)
		}
		if j >= 2 && j%2 == 0 {
			sum.XX, sum.XY, sum.YX, sum.YY = c, next, before, c
			into = sum
		}
		dst := s.a[(j+2)%3]
		s.second.Accelerate(dst, p, q, into)
		s.second.AddAcceleration(dst, j, 1)
		before, c = c, next
	}
	// What no pair has taken.
	if s.n <= 2 {
		axpy(x, y, dt)
	}
	if last := s.a[(s.n+1)%3]; s.n%2 == 1 {
		axpy(y, last, c)
	} else {
		sum.XX, sum.XY, sum.YX, sum.YY = c, 0, before, c
		sum.Add(s.a[s.n%3], last, 0, half)
	}
	sum.X, sum.Y = nil, nil
}

// Order implements Stepper.
func (s *Taylor) Order() int { return s.n }

// ImaginaryLimit implements Stepper.
func (s *Taylor) ImaginaryLimit() float64 { return s.limit }

// imaginaryLimit scans |P(iy)| of the stability polynomial sum c_j z^j for the
// first y at which it exceeds 1 by 1e-6.
func imaginaryLimit(c []float64) float64 {
	const step = 1e-3
	for y := step; y < 50; y += step {
		var p complex128
		for j := len(c) - 1; j >= 0; j-- {
			p = p*complex(0, y) + complex(c[j], 0)
		}
		if real(p)*real(p)+imag(p)*imag(p) > 1+2e-6 {
			return y - step
		}
	}
	return 50
}
