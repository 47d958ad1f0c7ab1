package wire

import (
	"fmt"
	"math"
	"sort"

	"nullmark/configs"
	"nullmark/extract/certify"
	"nullmark/extract/result"
	"nullmark/grid"
)

// Cost of the right-hand side on a machine of today, for the estimate of plan:
// nanoseconds per point and lane (see the benchmarks of equations/semi).
const nsPerPoint = 4.0

// planCircular foresees the rungs without evolving. Sizes of modes are not
// known yet, so it plans each as if it counted fully: the run, which looks
// first, never wants more in its first round.
func planCircular(c *configs.Case, n numerics) (*Plan, error) {
	r := newCircularRun(c, n, Options{})
	for _, m := range r.modes {
		m.allow = [2]float64{r.asked, r.asked}
		m.rung = r.startRung(m)
	}
	return planOf(c, r.climb, r.describe(), 250), nil
}

// planBound foresees a bound orbit with radial motion.
func planBound(c *configs.Case, n numerics) (*Plan, error) {
	r, err := newBoundRun(c, n, Options{})
	if err != nil {
		return nil, err
	}
	return planOf(c, r.climb, describePath(r.path), r.period), nil
}

// planBurst foresees a transient; its end is fixed by the orbit.
func planBurst(c *configs.Case, n numerics) (*Plan, error) {
	r, err := newBurstRun(c, n, Options{})
	if err != nil {
		return nil, err
	}
	return planOf(c, r.climb, describePath(r.path), 0), nil
}

// planOf books the first round of a climb; wait is how much longer than its first
// try a mode runs on average until its start-up has decayed.
func planOf(c *configs.Case, r *climb, orbit *result.Orbit, wait float64) *Plan {
	p := &Plan{Orbit: orbit, Warnings: Warnings(c)}
	type lot struct {
		until float64
		modes int
	}
	lots := map[int]*lot{}
	for _, m := range r.modes {
		g := r.n.grid(m.rung)
		until := r.firstUntil(m) + wait
		if r.n.until > 0 {
			until = r.n.until
		}
		p.Modes = append(p.Modes, PlannedMode{L: m.l, M: m.m, Points: g.N, Dx: g.Dx,
			Dt: r.n.courant * g.Dx, Kernel: r.n.cells * g.Dx, Until: until, Rung: m.rung})
		if lots[m.rung] == nil {
			lots[m.rung] = &lot{}
		}
		lots[m.rung].modes++
		lots[m.rung].until += until
	}
	rungs := map[int]*result.Rung{}
	for k, lt := range lots {
		mean := lt.until / float64(lt.modes)
		blocks := math.Ceil(float64(lt.modes) / blockModes)
		for j := k; j > k-r.n.rungs; j-- {
			g := r.n.grid(j)
			steps := mean / (r.n.courant * g.Dx)
			sec := blocks * steps * float64(r.n.taylor) * float64(g.N*grid.Lanes) * nsPerPoint * 1e-9
			p.CoreSeconds += sec
			p.MemoryBytes += uint64(float64(lt.modes) * steps * 64)
			if rungs[j] == nil {
				rungs[j] = &result.Rung{Points: g.N, Dx: g.Dx, Dt: r.n.courant * g.Dx, Kernel: r.n.cells * g.Dx, Moments: r.n.moments, Order: r.n.order}
			}
			rungs[j].CoreSeconds += sec
			rungs[j].Until = math.Max(rungs[j].Until, mean)
		}
	}
	var ks []int
	for k := range rungs {
		ks = append(ks, k)
	}
	sort.Ints(ks)
	for _, k := range ks {
		rungs[k].Modes = fmt.Sprintf("spacing %.3g M", certify.CoarsestSpacing*math.Pow(certify.Ratio, float64(k)))
		p.Rungs = append(p.Rungs, *rungs[k])
	}
	p.MemoryBytes += 40 << 20
	return p
}
