// Package equations holds the coefficients of the perturbation equations as
// functions of x = 1/r. It knows no grids, no loops over time and no sources.
// Units G = c = M = 1.
package equations

import "fmt"

// Parity of a mode of the master functions.
type Parity int

// Even modes obey the Zerilli, odd ones the Regge–Wheeler equation.
const (
	Even Parity = iota
	Odd
)

func (p Parity) String() string {
	if p == Even {
		return "even"
	}
	return "odd"
}

// EquatorialParity returns the parity that a particle in the equatorial plane
// excites at (l,m): even when l+m is even.
func EquatorialParity(l, m int) Parity {
	if (l+m)%2 == 0 {
		return Even
	}
	return Odd
}

// Potential is a potential divided by f/r^2: Reduced(x) = V r^2/f, x = 1/r,
// finite from the horizon (x = 1/2) to null infinity (x = 0).
type Potential interface {
	Reduced(x float64) float64
}

// Master returns the potential of gravitational perturbations of the given
// parity and l >= 2. It panics for l < 2.
func Master(p Parity, l int) Potential {
	if l < 2 {
		panic(fmt.Sprintf("equations: gravitational modes have l >= 2, not %d", l))
	}
	if p == Even {
		return Zerilli{L: l}
	}
	return ReggeWheeler{L: l, Spin: 2}
}
