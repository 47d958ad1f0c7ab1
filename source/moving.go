package source

import (
	"fmt"
	"math/big"

	"nullmark/grid"
	"nullmark/grid/stencil"
	"nullmark/source/worldline"
)

// Path is what a forcing needs of a worldline: the state at coordinate time t,
// without allocating.
type Path interface {
	At(t float64, s *worldline.State)
}

// samples of the source in time: degree-8 interpolation through 9 nodes
// t + (k-nodesBefore) dt/perStep, of which perStep are new in each step.
const (
	nodes       = 9
	nodesBefore = 2
	perStep     = 4
)

// Moving is the forcing of a particle on any worldline, for up to
// grid.Lanes/2 complex modes:
//
//	-S(rho, t) = -ramp(t) [ G(t) delta(rho-r_*p(t)) + F(t) delta'(rho-r_*p(t)) ],
//
// valid while the kernel lies in the part of the slicing between the layers,
// where rho = r_*. Time derivatives come from the polynomial of degree 8 through
// 9 samples around the step. Outside the path's span, and where the particle is
// beyond the grid's flat part, the source is cut to zero: the caller chooses a
// flat part that ends where F and G have died away.
//
// A mode with m = 0 is real and may take a single lane: see NewMoving. A Moving
// is not safe for concurrent use.
type Moving struct {
	path     Path
	ramp     Ramp
	kernel   Kernel
	modes    []MasterSource
	start    float64 // grid
	dx       float64
	points   int
	t0, t1   float64 // span in which the source acts
	from, to float64 // range of r_* in which it acts

	step   float64 // spacing of the nodes
	ring   [nodes]nodeSample
	spare  nodeSample
	diff   [nodes][nodes]float64 // diff[j][k]: weight of node k in the j-th derivative, unit spacing
	deriv  [nodes][]float64      // per derivative, width*grid.Lanes
	width  int                   // points of a kernel's support, upper bound
	lo, hi int                   // union of the supports of the present nodes
	state  worldline.State
	motion Motion
}

// nodeSample is the source at one instant on the points lo..hi-1.
type nodeSample struct {
	index  int64 // time = index * step
	valid  bool
	lo, hi int
	values []float64 // (hi-lo)*grid.Lanes
}

// Range says where a moving source acts.
type Range struct {
	From, To      float64 // coordinate time, M
	Inner, Outer  float64 // r_* of the particle, M
	GridStart, Dx float64
	GridPoints    int
}

// NewMoving returns the forcing of the given modes, mode q in lanes 2q and 2q+1.
// steps must all have the same length dt.
func NewMoving(path Path, k Kernel, ramp Ramp, modes []MasterSource, where Range, dt float64) *Moving {
	if len(modes) > grid.Lanes/2 {
		panic(fmt.Sprintf("source: %d modes in a block of %d", len(modes), grid.Lanes/2))
	}
	s := &Moving{
		path: path, ramp: ramp, kernel: k, modes: append([]MasterSource(nil), modes...),
		start: where.GridStart, dx: where.Dx, points: where.GridPoints,
		t0: where.From, t1: where.To, from: where.Inner, to: where.Outer,
		step: dt / perStep,
	}
	// A step moves the particle by at most dt, so the union of the supports of
	// all nodes spans two steps more than one kernel.
	single := int(2*k.Reach()/s.dx) + 3
	s.width = single + int(2*dt/s.dx) + 4
	for i := range s.ring {
		s.ring[i].values = make([]float64, single*grid.Lanes)
	}
	s.spare.values = make([]float64, single*grid.Lanes)
	for j := range s.deriv {
		s.deriv[j] = make([]float64, s.width*grid.Lanes)
		at := make([]int64, nodes)
		for k := range at {
			at[k] = int64(k - nodesBefore)
		}
		for k, w := range stencil.Weights(0, at, j) {
			s.diff[j][k], _ = new(big.Rat).Set(w).Float64()
		}
	}
	return s
}

// sample evaluates the source at node index i.
func (s *Moving) sample(n *nodeSample, i int64) {
	n.index, n.valid = i, true
	s.evaluate(n, float64(i)*s.step)
}

// evaluate fills n with the source at time t.
func (s *Moving) evaluate(n *nodeSample, t float64) {
	n.lo, n.hi = 0, 0
	if t < s.t0 || t > s.t1 {
		return
	}
	s.path.At(t, &s.state)
	x := s.state.Rstar
	if x < s.from || x > s.to {
		return
	}
	reach := s.kernel.Reach()
	lo := max(0, int((x-reach-s.start)/s.dx)+1)
	hi := min(s.points, int((x+reach-s.start)/s.dx)+1)
	if hi <= lo {
		return
	}
	var jet [1]float64
	s.ramp.Jet(jet[:], t)
	if jet[0] == 0 {
		return
	}
	w := &s.motion
	w.R, w.Y, w.P, w.Phi, w.E, w.L = s.state.R, s.state.Y, s.state.P, s.state.Phase, s.state.E, s.state.L
	var f, g [grid.Lanes / 2]complex128
	for q, m := range s.modes {
		a, b := m.At(w)
		f[q], g[q] = complex(-jet[0], 0)*a, complex(-jet[0], 0)*b
	}
	n.lo, n.hi = lo, hi
	for p := lo; p < hi; p++ {
		d, d1 := s.kernel.At(s.start + float64(p)*s.dx - x)
		v := (*[grid.Lanes]float64)(n.values[(p-lo)*grid.Lanes : (p-lo+1)*grid.Lanes])
		for q := range s.modes {
			v[2*q] = real(g[q])*d + real(f[q])*d1
			v[2*q+1] = imag(g[q])*d + imag(f[q])*d1
		}
		for l := 2 * len(s.modes); l < grid.Lanes; l++ {
			v[l] = 0
		}
	}
}

// Prepare implements the forcing of a linear system: t must be a whole number
// of steps dt.
func (s *Moving) Prepare(t, dt float64) {
	base := int64(t/s.step + 0.5)
	lo, hi := s.points, 0
	for k := range nodes {
		i := base + int64(k-nodesBefore)
		n := &s.ring[((i%nodes)+nodes)%nodes]
		if !n.valid || n.index != i {
			s.sample(n, i)
		}
		if n.hi > n.lo {
			lo, hi = min(lo, n.lo), max(hi, n.hi)
		}
	}
	s.lo, s.hi = lo, hi
	if hi <= lo {
		return
	}
	if hi-lo > s.width {
		panic("source: the particle moves more than its step allows")
	}
	size := (hi - lo) * grid.Lanes
	for j := range s.deriv {
		clear(s.deriv[j][:size])
	}
	for k := range nodes {
		i := base + int64(k-nodesBefore)
		n := &s.ring[((i%nodes)+nodes)%nodes]
		if n.hi <= n.lo {
			continue
		}
		off := (n.lo - lo) * grid.Lanes
		values := n.values[:(n.hi-n.lo)*grid.Lanes]
		scale := 1.0
		for j := range s.deriv {
			w := s.diff[j][k] * scale
			scale /= s.step
			if w == 0 {
				continue
			}
			d := s.deriv[j][off : off+len(values)]
			for i, v := range values {
				d[i] += w * v
			}
		}
	}
}

// AddDerivative adds scale times the j-th derivative at the prepared time to the
// block dst; above the eighth it is zero.
func (s *Moving) AddDerivative(dst []float64, j int, scale float64) {
	if j >= nodes || s.hi <= s.lo {
		return
	}
	d := dst[s.lo*grid.Lanes : s.hi*grid.Lanes]
	for i, v := range s.deriv[j][:len(d)] {
		d[i] += scale * v
	}
}

// Add adds the forcing at time t itself.
func (s *Moving) Add(dst []float64, t float64) {
	n := &s.spare
	s.evaluate(n, t)
	for p := n.lo; p < n.hi; p++ {
		for l := range grid.Lanes {
			dst[p*grid.Lanes+l] += n.values[(p-n.lo)*grid.Lanes+l]
		}
	}
}
