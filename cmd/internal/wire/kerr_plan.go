package wire

import (
	"fmt"
	"math"

	"nullmark/configs"
	"nullmark/equations/coupled"
	"nullmark/extract/certify"
	"nullmark/extract/result"
)

// nsPerAngular is the cost of the coupled right-hand side for the estimate of a
// plan: nanoseconds per point and l.
const nsPerAngular = 40.0

// planKerrCircular foresees the rungs without evolving. How many l's the sums
// want is found by a short run; a plan takes l_max or, where the asked accuracy
// will want more, parts that fall by v^2 from one l to the next.
func planKerrCircular(c *configs.Case) (*Plan, error) {
	r, err := newKerrCircular(c, Options{})
	if err != nil {
		return nil, err
	}
	p := &Plan{Orbit: r.describe(), Warnings: Warnings(c)}
	f := newKerrForesight(p, &r.n)
	v2 := math.Pow(r.omega, 2./3)
	for _, t := range r.ms {
		falls := int(math.Ceil(math.Log(r.kerrClimb.asked)/math.Log(v2))) + 1
		t.last = max(t.last, lowest(t.m)+falls-1)
		r.carry(t)
		until := r.n.until
		if until == 0 {
			until = r.firstUntil(t) + 40
		}
		f.look(t.m, t.n, certify.Earliest(t.tone, 1)+60)
		f.book(t.m, t.n, t.asked, t.rung, until)
	}
	f.finish()
	return p, nil
}

// kerrForesight adds up what a plan of the Teukolsky equation costs.
type kerrForesight struct {
	p     *Plan
	n     *kerrNumerics
	rungs []result.Rung
}

func newKerrForesight(p *Plan, n *kerrNumerics) *kerrForesight {
	return &kerrForesight{p: p, n: n, rungs: make([]result.Rung, n.rungs)}
}

func (f *kerrForesight) cost(k, m, angular int, until float64) {
	g := f.n.rung(k, m, angular)
	sec := until / g.Dt * float64(g.Taylor*g.Points*angular) * nsPerAngular * 1e-9
	r := &f.rungs[k]
	if r.Points == 0 {
		*r = result.Rung{Points: g.Points, Dx: g.Dx(), Kernel: g.Kernel, Moments: g.Moments, Order: g.Order}
	}
	r.Dt, r.Angular, r.Until = math.Max(r.Dt, g.Dt), max(r.Angular, angular), math.Max(r.Until, until)
	r.CoreSeconds += sec
	f.p.CoreSeconds += sec
	f.p.MemoryBytes = max(f.p.MemoryBytes, uint64(until/g.Dt)*uint64(angular)*64*6)
}

// look is a short run on the coarsest rung, book a full ladder of one m.
func (f *kerrForesight) look(m, angular int, until float64) { f.cost(0, m, angular, until) }

func (f *kerrForesight) book(m, angular, last, rung int, until float64) {
	for k := rung; k > rung-f.n.rungs; k-- {
		f.cost(k, m, angular-(rung-k), until)
	}
	g := f.n.rung(rung, m, angular)
	for l := lowest(m); l <= last; l++ {
		f.p.Modes = append(f.p.Modes, PlannedMode{L: l, M: m, Points: g.Points, Dx: g.Dx(), Dt: g.Dt, Kernel: g.Kernel, Until: until, Rung: rung})
	}
}

func (f *kerrForesight) finish() {
	for _, r := range f.rungs {
		r.Modes = fmt.Sprintf("up to %d coupled l", r.Angular)
		f.p.Rungs = append(f.p.Rungs, r)
	}
	f.p.MemoryBytes += 40 << 20
}

// planKerrBound foresees an orbit with radial or polar motion.
func planKerrBound(c *configs.Case) (*Plan, error) {
	r, err := newKerrBound(c, Options{})
	if err != nil {
		return nil, err
	}
	p := &Plan{Orbit: r.describe(c), Warnings: Warnings(c)}
	f := newKerrForesight(p, &r.n)
	v2 := math.Pow(math.Abs(r.orbit.OmegaPhi), 2./3)
	for _, t := range r.ms {
		falls := int(math.Ceil(math.Log(r.asked)/math.Log(v2))) + 1
		t.last = max(t.last, lowest(t.m)+falls-1)
		r.carry(t)
		until := r.n.until
		if until == 0 {
			until = r.firstUntil(300)
		}
		f.look(t.m, t.n, r.firstUntil(60))
		f.book(t.m, t.n, t.asked, t.rung, until)
	}
	f.finish()
	return p, nil
}

// planKerrFall foresees a plunge.
func planKerrFall(c *configs.Case) (*Plan, error) {
	r, err := newKerrFall(c, Options{})
	if err != nil {
		return nil, err
	}
	p := &Plan{Orbit: r.describe(c), Warnings: Warnings(c)}
	f := newKerrForesight(p, &r.n)
	for _, t := range r.ms {
		n := max(t.last-lowest(t.m)+2, coupled.Angular(r.hole.Spin(), 0.3*float64(max(t.m, 1)), t.m, t.last, r.asked))
		f.look(t.m, n, r.ends)
		f.book(t.m, n, t.asked, t.rung, r.ends)
	}
	f.finish()
	return p, nil
}
