// Package semi turns grid + slicing + equation + forcing into a right-hand
// side: the seam left of which nothing knows about time stepping and right of
// which nothing knows about black holes.
package semi

import (
	"fmt"
	"math"

	"nullmark/equations"
	"nullmark/grid"
	"nullmark/grid/stencil"
	"nullmark/hyperboloidal"
)

// Forcing is the source S of the equations of one block of modes. Values go to
// the second half of the state (the Pi equation), n*grid.Lanes numbers.
type Forcing interface {
	// Prepare is called once a step with its start and length.
	Prepare(t, dt float64)
	// AddDerivative adds scale times the j-th time derivative of the forcing
	// at the prepared time.
	AddDerivative(dst []float64, j int, scale float64)
	// Add adds the forcing at time t (for steppers without derivatives).
	Add(dst []float64, t float64)
}

// Master is the semi-discretised system of up to grid.Lanes real fields,
//
//	Psi_tau = Pi
//	Pi_tau  = K [ L D2 Psi + L' D Psi - 2 H D Pi - H' Pi - (V/L) Psi ] + forcing,
//
// K = 1/(2-L) in a layer and 1 between, from
// -d_t^2 Psi + d_{r_*}^2 Psi - V Psi = S, forcing = -K S/L.
// The state is [Psi block][Pi block], each n*grid.Lanes numbers, point by point.
// It implements march.Linear. A Master is not safe for concurrent use; its
// geometry tables are never written after NewMaster and may be shared.
type Master struct {
	geo     *Geometry
	pot     []float64 // -K V/L, per point and lane
	forcing Forcing
}

// Geometry is what all blocks on one grid share: difference weights combined
// with the slicing, point by point. It is never written after NewGeometry.
type Geometry struct {
	Grid   grid.Grid
	Order  int
	Points []hyperboloidal.Point
	// rows below flatLo and from flatHi on carry weights of their own
	flatLo, flatHi int
	first          []int       // first column of a row
	psi, pi        [][]float64 // weights on Psi and Pi
	half           int
	d2             []float64 // centred second-difference weights, half+1: 0..half
	k              []float64 // K
}

// NewGeometry samples the slicing on g and combines it with differences of the
// given even order. The grid must span [Si, So].
func NewGeometry(s hyperboloidal.Layers, g grid.Grid, order int) (*Geometry, error) {
	if err := s.Check(); err != nil {
		return nil, err
	}
	if g.Start != s.Si || g.End != s.So {
		return nil, fmt.Errorf("semi: grid [%g, %g] and slicing [%g, %g] differ", g.Start, g.End, s.Si, s.So)
	}
	d1 := stencil.New(1, order).Scaled(g.Dx)
	d2 := stencil.New(2, order).Scaled(g.Dx)
	if g.N < d2.MinPoints() {
		return nil, fmt.Errorf("semi: %d points are too few for order %d (at least %d)", g.N, order, d2.MinPoints())
	}
	geo := &Geometry{Grid: g, Order: order, Points: s.Sample(g.Rho()), half: d2.Half}
	n := g.N
	geo.first = make([]int, n)
	geo.psi = make([][]float64, n)
	geo.pi = make([][]float64, n)
	geo.k = make([]float64, n)
	geo.d2 = d2.Centre[d2.Half:]
	geo.flatLo, geo.flatHi = n, 0
	for i, p := range geo.Points {
		geo.k[i] = 1 / (2 - p.Boost)
		if flat(p) {
			geo.k[i] = 1
			if i >= d2.Half && i < n-d2.Half {
				geo.flatLo = min(geo.flatLo, i)
				geo.flatHi = max(geo.flatHi, i+1)
				continue
			}
		}
		f1, w1 := d1.Row(i, n)
		f2, w2 := d2.Row(i, n)
		lo := min(f1, f2, i)
		hi := max(f1+len(w1), f2+len(w2), i+1)
		psi := make([]float64, hi-lo)
		pi := make([]float64, hi-lo)
		k := geo.k[i]
		for j, w := range w2 {
			psi[f2-lo+j] += k * p.Boost * w
		}
		for j, w := range w1 {
			psi[f1-lo+j] += k * p.BoostPrime * w
			pi[f1-lo+j] += -2 * k * p.Height * w
		}
		pi[i-lo] += -k * p.HeightPrime
		geo.first[i], geo.psi[i], geo.pi[i] = lo, psi, pi
	}
	if geo.flatHi <= geo.flatLo {
		geo.flatLo, geo.flatHi = n, n
	}
	return geo, nil
}

func flat(p hyperboloidal.Point) bool {
	return p.Boost == 1 && p.BoostPrime == 0 && p.Height == 0 && p.HeightPrime == 0
}

// NewMaster returns the system of the given potentials, one a lane (at most
// grid.Lanes; empty lanes are zero fields). forcing may be nil.
func NewMaster(geo *Geometry, lanes []equations.Potential, forcing Forcing) *Master {
	if len(lanes) > grid.Lanes {
		panic(fmt.Sprintf("semi: %d fields in a block of %d lanes", len(lanes), grid.Lanes))
	}
	m := &Master{geo: geo, forcing: forcing, pot: make([]float64, geo.Grid.N*grid.Lanes)}
	for i, p := range geo.Points {
		for q, v := range lanes {
			if v != nil {
				m.pot[i*grid.Lanes+q] = -geo.k[i] * p.Stretch * v.Reduced(p.X)
			}
		}
	}
	return m
}

// Length is the length of a state vector.
func (m *Master) Length() int { return 2 * m.geo.Grid.N * grid.Lanes }

// Geometry returns the shared tables.
func (m *Master) Geometry() *Geometry { return m.geo }

// SpectralRadius bounds the frequencies of the system: dt times it must stay
// below the stepper's imaginary limit. It is the largest symbol of the second
// difference (speed 1 everywhere).
func (g *Geometry) SpectralRadius() float64 {
	s := g.d2[0]
	sign := -1.0
	for k := 1; k <= g.half; k++ {
		s += 2 * sign * g.d2[k]
		sign = -sign
	}
	return math.Sqrt(-s)
}

// Apply implements march.Linear.
func (m *Master) Apply(dst, u []float64) {
	n := m.geo.Grid.N * grid.Lanes
	if len(dst) != 2*n || len(u) != 2*n {
		panic(fmt.Sprintf("semi: states of length %d and %d, want %d", len(dst), len(u), 2*n))
	}
	copy(dst[:n], u[n:])
	g := m.geo
	psi, pi, out := u[:n], u[n:], dst[n:]
	rows(g, out, psi, pi, m.pot, 0, min(g.flatLo, g.Grid.N))
	if g.half == 6 {
		flat12(out, psi, m.pot, (*[7]float64)(g.d2), g.flatLo, g.flatHi)
	} else {
		flatAny(out, psi, m.pot, g.d2, g.flatLo, g.flatHi)
	}
	rows(g, out, psi, pi, m.pot, max(g.flatHi, min(g.flatLo, g.Grid.N)), g.Grid.N)
}

// RHS implements march.System.
func (m *Master) RHS(dst, u []float64, t float64) {
	m.Apply(dst, u)
	if m.forcing != nil {
		m.forcing.Add(dst[len(dst)/2:], t)
	}
}

// Prepare implements march.Linear.
func (m *Master) Prepare(t, dt float64) {
	if m.forcing != nil {
		m.forcing.Prepare(t, dt)
	}
}

// AddForce implements march.Linear.
func (m *Master) AddForce(dst []float64, j int, scale float64) {
	if m.forcing != nil {
		m.forcing.AddDerivative(dst[len(dst)/2:], j, scale)
	}
}
