// Package grid holds the uniform grid in the compactified coordinate rho and
// the layout of fields on it.
package grid

import "fmt"

// Lanes is how many real fields a block of modes carries side by side: the
// field values of one grid point are contiguous, u[i*Lanes+lane]. A complex
// mode takes two lanes (real, imaginary).
const Lanes = 8

// Grid is N points rho_i = Start + i Dx, the ends included.
type Grid struct {
	Start, End float64
	N          int
	Dx         float64
}

// New returns the grid of n >= 2 points on [start, end]; it panics on others.
func New(start, end float64, n int) Grid {
	if n < 2 || !(start < end) {
		panic(fmt.Sprintf("grid: %d points on [%g, %g]", n, start, end))
	}
	return Grid{Start: start, End: end, N: n, Dx: (end - start) / float64(n-1)}
}

// Rho returns the coordinates of all points; the last is End exactly.
func (g Grid) Rho() []float64 {
	out := make([]float64, g.N)
	for i := range out {
		out[i] = g.Start + float64(i)*g.Dx
	}
	out[g.N-1] = g.End
	return out
}
