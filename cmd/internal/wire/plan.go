package wire

import (
	"fmt"
	"math"
	"sort"

	"nullmark/configs"
	"nullmark/extract/result"
	"nullmark/grid"
)

// nsPerPoint is the cost of the right-hand side for the estimate of a plan:
// nanoseconds per point and lane. The benchmarks of equations/semi give about 1
// with AVX-512, 3 with AVX2 and 25 without either.
const nsPerPoint = 2.0

// planCircular foresees the rungs without evolving. Sizes of modes are not
// known yet, so it plans each as if it counted fully: the run, which looks
// first, never wants more in its first round.
func planCircular(c *configs.Case, n numerics) (*Plan, error) {
	r := newCircularRun(c, n, Options{})
	for _, m := range r.modes {
		m.allow = [2]float64{r.asked, r.asked}
		m.rung = r.startRung(m)
	}
	p := &Plan{Orbit: r.describe(), Warnings: Warnings(c)}
	r.foresee(p, func(m *ladder) float64 {
		if r.n.until > 0 {
			return r.n.until
		}
		return r.firstUntil(m) + 250
	}, 1)
	return p, nil
}

// planBound and planBurst foresee an orbit with radial motion. Both look at the
// start-up by two more runs on the coarsest rung.
func planBound(c *configs.Case, n numerics) (*Plan, error) {
	r, err := newBoundRun(c, n, Options{})
	if err != nil {
		return nil, err
	}
	p := &Plan{Orbit: describePath(r.path), Warnings: Warnings(c)}
	r.foresee(p, r.firstUntil, 2)
	return p, nil
}

func planBurst(c *configs.Case, n numerics) (*Plan, error) {
	r, err := newBurstRun(c, n, Options{})
	if err != nil {
		return nil, err
	}
	p := &Plan{Orbit: describePath(r.path), Warnings: Warnings(c)}
	if r.table != nil {
		r.shiftMarkers(p.Orbit)
		p.Warnings = append(p.Warnings, r.table.notes()...)
	}
	r.foresee(p, r.firstUntil, 2)
	return p, nil
}

// foresee writes into p what the first round of the climb would run: every mode
// on its rung and the coarser ones that its bar needs, and before or after that
// the given number of runs on the coarsest.
func (r *climb) foresee(p *Plan, until func(*ladder) float64, looks int) {
	type lot struct {
		until float64
		modes int
	}
	lots := map[int]*lot{}
	all := &lot{}
	for _, m := range r.modes {
		g := r.n.grid(m.rung)
		t := until(m)
		p.Modes = append(p.Modes, PlannedMode{L: m.l, M: m.m, Points: g.N, Dx: g.Dx,
			Dt: r.n.courant * g.Dx, Kernel: r.n.cells * g.Dx, Until: t, Rung: m.rung})
		if lots[m.rung] == nil {
			lots[m.rung] = &lot{}
		}
		for _, l := range []*lot{lots[m.rung], all} {
			l.modes++
			l.until += t
		}
	}
	rungs := map[int]*result.Rung{}
	book := func(k int, l *lot, times int) {
		g := r.n.grid(k)
		mean := l.until / float64(l.modes)
		steps := mean / (r.n.courant * g.Dx)
		blocks := math.Ceil(float64(l.modes) / blockModes)
		sec := float64(times) * blocks * steps * float64(r.n.taylor) * float64(g.N*grid.Lanes) * nsPerPoint * 1e-9
		p.CoreSeconds += sec
		p.MemoryBytes += uint64(float64(l.modes) * steps * 64)
		if rungs[k] == nil {
			rungs[k] = &result.Rung{Points: g.N, Dx: g.Dx, Dt: r.n.courant * g.Dx, Kernel: r.n.cells * g.Dx, Moments: r.n.moments, Order: r.n.order}
		}
		rungs[k].CoreSeconds += sec
		rungs[k].Until = math.Max(rungs[k].Until, mean)
	}
	var ks []int
	for k := range lots {
		ks = append(ks, k)
	}
	sort.Ints(ks)
	for _, k := range ks {
		for j := k; j > k-r.n.rungs; j-- {
			book(j, lots[k], 1)
		}
	}
	if all.modes > 0 {
		book(0, all, looks)
	}
	ks = ks[:0]
	for k := range rungs {
		ks = append(ks, k)
	}
	sort.Ints(ks)
	for _, k := range ks {
		rungs[k].Modes = fmt.Sprintf("spacing %.3g M", rungs[k].Dx)
		p.Rungs = append(p.Rungs, *rungs[k])
	}
	p.MemoryBytes += 40 << 20
}
