// Package semi turns grid + slicing + equation + forcing into a right-hand
// side: the seam left of which nothing knows about time stepping and right of
// which nothing knows about black holes.
package semi

import (
	"fmt"
	"math"

	"nullmark/equations"
	"nullmark/grid"
	"nullmark/grid/march"
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
// It implements march.SecondOrder. A Master is not safe for concurrent use; its
// geometry tables are never written after NewMaster and may be shared.
type Master struct {
	geo     *Geometry
	diag    []float64 // -K V/L and the row's centre weight, per point and lane
	forcing Forcing
}

// Geometry is what all blocks on one grid share: difference weights combined
// with the slicing, point by point. It is never written after NewGeometry.
type Geometry struct {
	Grid   grid.Grid
	Order  int
	Points []hyperboloidal.Point
	ranges []rows // every row once, in order
	half   int
	centre []float64  // what a row adds to the potential in diag
	d1     [6]float64 // centred first-difference weights 1..6 (order 12)
	d2     []float64  // centred second-difference weights, half+1: 0..half
	k      []float64  // K
}

// rows is a range [lo, hi) of grid points that one kernel serves.
type rows struct {
	form         form
	lo, hi       int
	w            []float64 // weights as the kernel wants them
	width        int       // of rowsAny
	first, slide int
}

type form uint8

const (
	flatRows    form = iota // between the layers: the plain wave operator
	centredRows             // order 12 in a layer
	anyRows                 // another order in a layer, and the ends
)

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
	geo.k = make([]float64, n)
	geo.centre = make([]float64, n)
	geo.d2 = d2.Centre[d2.Half:]
	if geo.half == 6 {
		geo.d1 = [6]float64(d1.Centre[7:])
	}
	flatLo, flatHi := flatPart(geo.Points, d2.Half)
	for i, p := range geo.Points {
		geo.k[i] = 1 / (2 - p.Boost)
		inner := i >= d2.Half && i < n-d2.Half
		switch {
		case i >= flatLo && i < flatHi:
			geo.centre[i] = geo.d2[0]
			geo.add(rows{form: flatRows, lo: i, hi: i + 1})
		case inner && geo.half == 6:
			geo.addCentred(i, p)
		default:
			geo.addAny(i, p, d1, d2)
		}
	}
	return geo, nil
}

// add appends a row, to the last range where that is of the same sort and goes
// on in the same way.
func (g *Geometry) add(r rows) {
	if len(g.ranges) > 0 {
		l := &g.ranges[len(g.ranges)-1]
		same := l.form == r.form
		if r.form == anyRows && same {
			slide := r.first - (l.first + (l.hi-l.lo-1)*l.slide)
			same = l.width == r.width && (slide == 0 || slide == 1) && (l.hi-l.lo == 1 || slide == l.slide)
			if same {
				l.slide = slide
			}
		}
		if same {
			l.hi = r.hi
			l.w = append(l.w, r.w...)
			return
		}
	}
	g.ranges = append(g.ranges, r)
}

// addCentred appends a centred row of order 12; see rows13 for the layout. The
// first difference has no centre weight, and weights of opposite sign.
func (g *Geometry) addCentred(i int, p hyperboloidal.Point) {
	k := g.k[i]
	var w [rowStride]float64
	for q := 1; q <= 6; q++ {
		even, odd := k*p.Boost*g.d2[q], k*p.BoostPrime*g.d1[q-1]
		w[6-q], w[5+q] = even-odd, even+odd
	}
	w[12], w[13] = -2*k*p.Height, -k*p.HeightPrime
	g.centre[i] = k * p.Boost * g.d2[0]
	g.add(rows{form: centredRows, lo: i, hi: i + 1, w: w[:]})
}

// addAny appends a row of any shape; see rowsAny for the layout.
func (g *Geometry) addAny(i int, p hyperboloidal.Point, d1, d2 *stencil.Operator) {
	n, k := g.Grid.N, g.k[i]
	f1, w1 := d1.Row(i, n)
	f2, w2 := d2.Row(i, n)
	lo := min(f1, f2, i)
	hi := max(f1+len(w1), f2+len(w2), i+1)
	w := make([]float64, 2*(hi-lo))
	for j, v := range w2 {
		w[2*(f2-lo+j)] += k * p.Boost * v
	}
	for j, v := range w1 {
		w[2*(f1-lo+j)] += k * p.BoostPrime * v
		w[2*(f1-lo+j)+1] += -2 * k * p.Height * v
	}
	w[2*(i-lo)+1] += -k * p.HeightPrime
	g.add(rows{form: anyRows, lo: i, hi: i + 1, w: w, width: hi - lo, first: lo})
}

// flatPart returns the longest run of flat points with half neighbours on both
// sides. Where a layer sets in smoothly, roundings make single points of it
// flat, which are better served as part of the layer.
func flatPart(points []hyperboloidal.Point, half int) (lo, hi int) {
	from := half
	for i := half; i < len(points)-half; i++ {
		if !flat(points[i]) {
			from = i + 1
		} else if i+1-from > hi-lo {
			lo, hi = from, i+1
		}
	}
	return lo, hi
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
	m := &Master{geo: geo, forcing: forcing, diag: make([]float64, geo.Grid.N*grid.Lanes)}
	for i, p := range geo.Points {
		for q := range grid.Lanes {
			m.diag[i*grid.Lanes+q] = geo.centre[i]
			if q < len(lanes) && lanes[q] != nil {
				m.diag[i*grid.Lanes+q] += -geo.k[i] * p.Stretch * lanes[q].Reduced(p.X)
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
// below the stepper's imaginary limit. It is the root of the largest symbol of
// the second difference (speed 1 everywhere) plus the largest K V/L of its lanes.
func (m *Master) SpectralRadius() float64 {
	v := 0.0
	for i, d := range m.diag {
		v = max(v, m.geo.centre[i/grid.Lanes]-d)
	}
	return math.Hypot(m.geo.SpectralRadius(), math.Sqrt(v))
}

// SpectralRadius is that of the wave operator alone: the root of the largest
// symbol of the second difference. Potentials add to it (Master.SpectralRadius).
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
	m.Accelerate(dst[n:], u[:n], u[n:], nil)
}

// Accelerate implements march.SecondOrder: x is Psi and y is Pi.
func (m *Master) Accelerate(dst, x, y []float64, sum *march.Sum) {
	n := m.geo.Grid.N * grid.Lanes
	if len(dst) != n || len(x) != n || len(y) != n {
		panic(fmt.Sprintf("semi: blocks of length %d, %d and %d, want %d", len(dst), len(x), len(y), n))
	}
	for k := range m.geo.ranges {
		r := &m.geo.ranges[k]
		if sum == nil {
			m.apply(r, dst, x, y, r.lo, r.hi)
			continue
		}
		// The sum follows piece by piece, while the piece is in the cache.
		for lo := r.lo; lo < r.hi; lo += piece {
			hi := min(lo+piece, r.hi)
			m.apply(r, dst, x, y, lo, hi)
			sum.Add(x, y, lo*grid.Lanes, hi*grid.Lanes)
		}
	}
}

// piece is how many points Accelerate does between two parts of a sum: eight
// arrays of so many points take half of a small first-level cache.
const piece = 32

// apply runs the kernel of a range on its rows lo..hi-1.
func (m *Master) apply(r *rows, dst, psi, pi []float64, lo, hi int) {
	skip := lo - r.lo
	switch r.form {
	case flatRows:
		if m.geo.half == 6 {
			active.flat12(dst, psi, m.diag, (*[7]float64)(m.geo.d2), lo, hi)
		} else {
			active.flatAny(dst, psi, m.diag, m.geo.d2, lo, hi)
		}
	case centredRows:
		active.rows13(dst, psi, pi, m.diag, r.w[skip*rowStride:], &m.geo.d1, lo, hi)
	case anyRows:
		active.rowsAny(dst, psi, pi, m.diag, r.w[skip*2*r.width:], r.width, r.first+skip*r.slide, r.slide, lo, hi)
	}
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
	m.AddAcceleration(dst[len(dst)/2:], j, scale)
}

// AddAcceleration implements march.SecondOrder.
func (m *Master) AddAcceleration(dst []float64, j int, scale float64) {
	if m.forcing != nil {
		m.forcing.AddDerivative(dst, j, scale)
	}
}
