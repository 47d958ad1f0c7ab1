package source

import "math"

// Ramp switches the source on smoothly: (1 + erf((t-Centre)/Width))/2. Before
// Centre - 6 Width it is zero to double precision.
type Ramp struct{ Centre, Width float64 }

// On returns a ramp that has always been on.
func On() Ramp { return Ramp{} }

// Jet writes the ramp and its first len(dst)-1 time derivatives at t.
func (r Ramp) Jet(dst []float64, t float64) {
	for i := range dst {
		dst[i] = 0
	}
	if r.Width == 0 {
		dst[0] = 1
		return
	}
	z := (t - r.Centre) / r.Width
	dst[0] = 0.5 * math.Erfc(-z)
	if len(dst) == 1 {
		return
	}
	// d^n/dz^n erf/2 = e^{-z^2}/sqrt(pi) (-1)^{n-1} H_{n-1}(z).
	g := math.Exp(-z*z) / math.Sqrt(math.Pi)
	h0, h1 := 1.0, 2*z
	w := 1 / r.Width
	for n := 1; n < len(dst); n++ {
		dst[n] = g * h0 * w
		w *= -1 / r.Width
		h0, h1 = h1, 2*z*h1-2*float64(n)*h0
	}
}
