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
// It needs two scratch states. Order 8 is stable on the imaginary axis to 3.40.
type Taylor struct {
	sys   Linear
	n     int
	v, w  []float64
	limit float64
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
	return &Taylor{sys: sys, n: order, v: make([]float64, length), w: make([]float64, length), limit: imaginaryLimit(poly)}
}

// Step implements Stepper.
func (s *Taylor) Step(u []float64, t, dt float64) {
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
		accumulate(u, w, c)
		s.sys.AddForce(u, j, coeff)
		s.sys.AddForce(w, j, coeff)
		v, w = w, v
	}
	s.v, s.w = v, w
}

// accumulate scales w by c and adds it to u.
func accumulate(u, w []float64, c float64) {
	u = u[:len(w)]
	for i, x := range w {
		x *= c
		w[i] = x
		u[i] += x
	}
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
