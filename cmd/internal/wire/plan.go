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
	p := &Plan{Orbit: r.describe(), Warnings: Warnings(c)}
	type lot struct {
		until float64
		modes int
	}
	lots := map[int]*lot{}
	for _, m := range r.modes {
		m.allow = [2]float64{r.asked, r.asked}
		m.rung = r.startRung(m)
		g := r.n.grid(m.rung)
		until := r.firstUntil(m) + 250
		if r.n.until > 0 {
			until = r.n.until
		}
		p.Modes = append(p.Modes, PlannedMode{L: m.circ.tone.L, M: m.circ.tone.M, Points: g.N, Dx: g.Dx,
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
	return p, nil
}
