// Package source holds what a point particle puts on the right-hand side: the
// smoothed delta, the switch-on ramp, the source coefficients of each equation
// along a worldline, and the forcings that carry them onto a grid. It knows no
// evolution. Units G = c = M = 1, particle mass 1.
package source

import (
	"fmt"
	"math"
)

// Kernel is a Gaussian delta whose moments 1 to Moments-1 vanish,
//
//	delta(x) = e^{-z^2}/(sqrt(2 pi) sigma) sum_{j<p/2} (-1)^j/(4^j j!) H_2j(z),  z = x/(sqrt2 sigma),
//
// H the physicists' Hermite polynomials, p = Moments. The far field of a source
// smeared by it differs from the point source's by O(sigma^p).
//
// Source: the Gaussian (Hermite) kernels of higher order, e.g. M. P. Wand and
// W. R. Schucany, Canad. J. Statist. 18, 197 (1990), from memory.
type Kernel struct {
	Sigma   float64
	Moments int
	c       []float64 // (-1)^j/(4^j j!)
}

// NewKernel returns the kernel of width sigma > 0 with an even number of
// moments from 2 to 16. It panics on other arguments.
func NewKernel(sigma float64, moments int) Kernel {
	if !(sigma > 0) || moments < 2 || moments > 16 || moments%2 != 0 {
		panic(fmt.Sprintf("source: kernel of width %g with %d moments", sigma, moments))
	}
	k := Kernel{Sigma: sigma, Moments: moments}
	c := 1.0
	for j := 0; j < moments/2; j++ {
		if j > 0 {
			c *= -1 / (4 * float64(j))
		}
		k.c = append(k.c, c)
	}
	return k
}

// Reach is the distance beyond which the kernel counts as zero: there it is
// below 1e-16 of its peak for every number of moments (the Hermite series makes
// the tail fall more slowly than the bare Gaussian's, hence the second term).
func (k Kernel) Reach() float64 {
	return k.Sigma * (9.2 + 0.14*float64(k.Moments))
}

// At returns delta(x) and its derivative in x.
func (k Kernel) At(x float64) (d, d1 float64) {
	z := x / (math.Sqrt2 * k.Sigma)
	g := math.Exp(-z*z) / (math.Sqrt(2*math.Pi) * k.Sigma)
	// H_0, H_1, ... by the three-term recursion.
	h0, h1 := 1.0, 2*z
	for j, c := range k.c {
		d += c * h0
		d1 -= c * h1
		n := float64(2*j + 1)
		h2 := 2*z*h1 - 2*n*h0
		h3 := 2*z*h2 - 2*(n+1)*h1
		h0, h1 = h2, h3
	}
	return g * d, g * d1 / (math.Sqrt2 * k.Sigma)
}
