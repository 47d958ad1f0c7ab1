package wire

import (
	"math"

	"nullmark/configs"
	"nullmark/extract/certify"
	"nullmark/grid"
	"nullmark/hyperboloidal"
	"nullmark/source"
	"nullmark/source/worldline"
)

// numerics is every choice of the scheme; tests vary what case files cannot.
type numerics struct {
	order          int
	courant        float64 // dt/dx
	taylor         int     // order in time
	cells          float64 // kernel width in cells
	moments        int
	fast           bool    // the particle may near the speed of light
	inner          float64 // thickness of the layers, M
	outer          float64
	gap            float64 // extra flat room on both sides of the kernel, M
	profile        hyperboloidal.Profile
	ramp           source.Ramp
	rungs          int // how many rungs a bar is made from, 2 or 3
	maxRung        int
	fixedRung      int // >= 0: run exactly this rung as the finest, no climbing
	points         int // > 0: points of the finest rung
	until          float64
	filter         int // order of the filter applied once a step, 0 = none
	filterStrength float64
	widest         float64 // kernel width that the flat part makes room for, M
	domain         hyperboloidal.Layers
	coarsestDx     float64
	closed         bool                   // count the evolved range alone, without an estimate of what lies outside
	through        worldline.Continuation // of an inspiral's torque through the plunge
}

// choose gives the numerics of a case: measured defaults, overridden by what
// the case file says.
func choose(c *configs.Case) numerics {
	n := numerics{
		order: 12, courant: 1.15, taylor: 12, cells: 1.9, moments: 16,
		inner: 20, outer: 30, profile: hyperboloidal.Flat(2),
		ramp: source.Ramp{Centre: 80, Width: 17}, rungs: 3, maxRung: 8, fixedRung: -1,
	}
	if c.Orbit != nil {
		switch c.Orbit.Kind {
		case configs.Circular:
			n.outer = math.Max(n.outer, 1.6*c.Orbit.Radius)
		case configs.Eccentric:
			n.outer = math.Max(n.outer, 1.6*c.Orbit.P/(1+c.Orbit.E))
		case configs.Infall, configs.Scatter, configs.Inspiral, configs.Table:
			n.fast = true
			n.cells = n.kernelCells()
		}
	}
	m := c.Numerics
	if m.Order != nil {
		n.order = *m.Order
	}
	if m.Courant != nil {
		n.courant = *m.Courant
	}
	if m.KernelMoments != nil {
		n.moments = *m.KernelMoments
		n.cells = n.kernelCells()
	}
	if m.KernelWidth != nil {
		n.cells = *m.KernelWidth
	}
	if m.Layer != nil {
		n.inner = *m.Layer * n.inner / n.outer
		n.outer = *m.Layer
	}
	if m.Rungs != nil {
		n.rungs = *m.Rungs
	}
	if m.Points != nil {
		n.points = *m.Points
	}
	if c.Span.Until != nil {
		n.until = *c.Span.Until
	}
	return n
}

// kernelCells is the kernel width in cells. Under a particle that nears the
// horizon, grid waves of half a cell's length would be in step with it: its kernel
// is wider, which takes the noise of a plunge from 1e-8 of the peak to 1e-11 (see
// ORBITS.md).
func (n *numerics) kernelCells() float64 {
	if n.fast {
		return defaultCells(n.moments) + 0.3
	}
	return defaultCells(n.moments)
}

// defaultCells is the kernel width in cells below which aliasing takes over, by
// the number of moments.
func defaultCells(moments int) float64 {
	switch {
	case moments <= 8:
		return 1.5
	case moments <= 10:
		return 1.6
	case moments <= 12:
		return 1.7
	case moments <= 14:
		return 1.8
	}
	return 1.9
}

// place fixes the domain for a particle at rest in r_* (a circular orbit): one
// domain for all rungs, so that their amplitudes compare without a shift.
func (n *numerics) place(rstar float64) { n.placeBetween(rstar, rstar) }

// placeBetween fixes the domain for a particle that moves between two tortoise
// coordinates.
func (n *numerics) placeBetween(inner, outer float64) {
	n.coarsestDx = certify.CoarsestSpacing
	n.widest = n.cells * n.coarsestDx
	w := source.NewKernel(n.widest, n.moments).Reach() + n.gap
	// An inner layer that began far out would squeeze a large radius into its
	// thickness, and the stretched coordinate would be stiff.
	ri := math.Min(inner-w, 0)
	n.domain = hyperboloidal.Layers{Si: ri - n.inner, Ri: ri, Ro: outer + w, So: outer + w + n.outer, Profile: n.profile}
	if n.points > 0 {
		// The asked points are those of the finest rung, which is rung
		// rungs-1 of a ladder whose coarsest spacing follows.
		n.fixedRung = n.rungs - 1
		n.maxRung = n.fixedRung
		dx := (n.domain.So - n.domain.Si) / float64(n.points-1)
		n.coarsestDx = dx / math.Pow(certify.Ratio, float64(n.fixedRung))
	}
}

// stopAt turns span.until, a retarded time, into the slice that has it at null
// infinity; the domain must have been placed.
func (n *numerics) stopAt() {
	if n.until > 0 {
		n.until += n.domain.So
	}
}

// grid returns the grid of rung k.
func (n *numerics) grid(k int) grid.Grid {
	length := n.domain.So - n.domain.Si
	dx := n.coarsestDx * math.Pow(certify.Ratio, float64(k))
	return grid.New(n.domain.Si, n.domain.So, int(math.Round(length/dx))+1)
}

// on is the time at which the source has come to full strength.
func (n *numerics) on() float64 { return n.ramp.Centre + 2*n.ramp.Width }
