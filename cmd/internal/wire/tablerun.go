package wire

import (
	"context"
	"fmt"
	"math"

	"nullmark/configs"
	"nullmark/extract/certify"
	"nullmark/extract/result"
	"nullmark/hyperboloidal"
	"nullmark/source"
	"nullmark/source/worldline"
)

// tooLong says that span.until lies beyond what a table's rows send out.
type tooLong struct{ last float64 }

func (e *tooLong) Error() string {
	return fmt.Sprintf("at most %.6g: the signals of the table's last row arrive then", e.last)
}

// averaging is how the fluxes of a bound table are averaged.
type averaging struct {
	cycle
	power int
}

// plan fixes the domain for a bound table, the slice at which the run ends
// (n.until), and what is averaged over: as many whole periods as the window
// wants, or as lie between the start-up and the end, but at least two.
func (p *tablePath) plan(n *numerics, c *configs.Case) (averaging, error) {
	if c.Numerics.Layer == nil {
		n.outer = math.Max(n.outer, 1.6*p.rmin)
	}
	inner, outer := hyperboloidal.TortoiseAt(p.rmin), hyperboloidal.TortoiseAt(p.rmax)
	n.placeBetween(inner, outer)
	end := lastSlice(p, n, p.last)
	asked := n.until > 0
	if asked {
		n.until += n.domain.So - p.origin
		if n.until > end+1e-9 {
			return averaging{}, &tooLong{last: n.domain.Retarded(end) + p.origin}
		}
		end = n.until
	}
	n.until = end
	// The start-up's signals arrive last at the end that is further away.
	quiet := n.on() + math.Max(n.domain.So-inner, outer-n.domain.Si)
	a := averaging{power: min(certify.WindowPower(c.Accuracy.Relative), 3)}
	to := math.Min(p.last, end)
	a.cycle = p.cycle(to, a.power+1)
	have := (end - quiet) / a.period
	if have < 2 {
		what := "azimuthal"
		if a.radial {
			what = "radial"
		}
		return a, &tooShort{what: what, have: math.Max(have, 0), need: 2*a.period - (end - quiet), untilKey: asked && lastSlice(p, n, p.last)-quiet >= 2*a.period}
	}
	if fits := int(have) - 1; fits < a.power {
		a.power = max(fits, 1)
		a.cycle = p.cycle(to, a.power+1)
	}
	return a, nil
}

// lastSlice is the slice up to which nothing of what the end of a path at time t
// sends out, where its source stops, has arrived at either end of the grid.
func lastSlice(w worldline.Worldline, n *numerics, t float64) float64 {
	var s worldline.State
	w.At(t, &s)
	reach := source.NewKernel(n.widest, n.moments).Reach()
	return t - reach + math.Min(n.domain.So-s.Rstar, s.Rstar-n.domain.Si)
}

// newTableRun is a bound table on its way up the ladder.
func newTableRun(c *configs.Case, n numerics, o Options, p *tablePath) (*boundRun, error) {
	a, err := p.plan(&n, c)
	if err != nil {
		return nil, err
	}
	r := &boundRun{climb: newClimb(n, o), path: p, numbers: numbersOf(p), asked: c.Accuracy.Relative, floor: c.Accuracy.Floor, power: a.power, period: a.period, table: p, cycle: a.cycle}
	r.kind = r
	r.origin = p.origin
	r.half, r.halved = p.thin()
	r.numbers["omega_phi"] = a.advance
	var modes [][2]int
	for _, lm := range c.ModeList() {
		if lm[1] == 0 && !a.radial {
			continue // as good as static
		}
		modes = append(modes, lm)
	}
	r.enter(modes)
	return r, nil
}

// moved bounds the relative changes of a mode's averaged fluxes that are left of
// the start-up and that the rows cause, from runs on the coarsest rung: as it is,
// switched on later, through every second row.
//
// A remainder of the start-up that falls like a power of the time since then is
// the change times the ratio of the two times, or less. Of the change that the
// missing rows make, their spacing leaves in the full table what its
// interpolation error is of the thinner one's, and their rounding all of it;
// half as much again is the margin.
func (r *boundRun) moved(m *ladder, runs []*certify.Samples) (start, path [2]float64) {
	late := math.Max((r.n.until-r.n.ramp.Centre)/r.delay(), 1)
	change := func(e int, a, b *certify.Samples) float64 {
		e0, s0, err0 := r.mean(a, m, certify.End(e), r.n.until)
		e1, s1, err1 := r.mean(b, m, certify.End(e), r.n.until)
		if err0 != nil || err1 != nil {
			return math.Inf(1)
		}
		d := math.Abs(e0-e1) / e0
		if s0 != 0 {
			d = math.Max(d, math.Abs((s0-s1)/s0))
		}
		return d
	}
	for e := range start {
		start[e] = math.Inf(1)
		if r.table != nil {
			start[e] = late * change(e, runs[0], runs[1])
		}
		if len(runs) > 2 {
			path[e] = 1.5 * r.halved * change(e, runs[0], runs[2])
		}
	}
	return start, path
}

// rough says whether the two finest rungs of a mode differ hardly less than the
// two before them: what they differ by is then the noise of the rows.
func (r *boundRun) rough(m *ladder, end certify.End) bool {
	a, b, c := m.runs[m.rung], m.runs[m.rung-1], m.runs[m.rung-2]
	if r.table == nil || c == nil {
		return false
	}
	d := func(x, y *certify.Samples) float64 {
		return certify.Distance(x, y, end, m.until, r.period, r.power)
	}
	return d(a, b) > 0.4*d(b, c)
}

// thin is the path through every second row, with the fraction of its error
// that the full table has; nil when there are too few rows or they are too far
// apart for it.
func (p *tablePath) thin() (worldline.Worldline, float64) {
	var s worldline.Samples
	for i := 0; i < len(p.samples.T); i++ {
		if i%2 == 0 || i == len(p.samples.T)-1 {
			s.T, s.R, s.Phi = append(s.T, p.samples.T[i]), append(s.R, p.samples.R[i]), append(s.Phi, p.samples.Phi[i])
		}
	}
	w, err := worldline.NewTable(s, false)
	if err != nil {
		return nil, 0
	}
	dr, dphi := p.Uncertainty()
	hr, hphi := w.Uncertainty()
	return w, math.Min(1, math.Max(dr/hr, dphi/hphi))
}

// runTable measures rates or totals, as the table's motion is.
func runTable(ctx context.Context, c *configs.Case, n numerics, o Options) (*result.Bundle, error) {
	clock := startClock()
	p, err := newTablePath(c.Orbit)
	if err != nil {
		return nil, err
	}
	if p.transient() {
		return runBurst(ctx, c, n, o)
	}
	r, err := newTableRun(c, n, o, p)
	if err != nil {
		return nil, err
	}
	return r.finish(ctx, c, clock)
}

func planTable(c *configs.Case, n numerics) (*Plan, error) {
	p, err := newTablePath(c.Orbit)
	if err != nil {
		return nil, err
	}
	if p.transient() {
		return planBurst(c, n)
	}
	r, err := newTableRun(c, n, Options{}, p)
	if err != nil {
		return nil, err
	}
	out := &Plan{Orbit: r.describe(), Warnings: append(Warnings(c), r.notes()...)}
	r.foresee(out, r.firstUntil, 2)
	return out, nil
}

// describe is the orbit of a bound run with the numbers that it found.
func (r *boundRun) describe() *result.Orbit {
	o := describePath(r.path)
	if r.table != nil {
		o.Numbers["omega_phi"] = r.cycle.advance
		if r.cycle.radial {
			o.Numbers["period_r"] = r.period
		} else {
			o.Numbers["period_phi"] = r.period
		}
		r.shiftMarkers(o)
	}
	return o
}

// shiftMarkers turns the times of markers into the orbit's own.
func (r *climb) shiftMarkers(o *result.Orbit) {
	for k := range o.Markers {
		o.Markers[k] += r.origin
	}
}

// notes are the warnings that belong to the table of a run.
func (r *boundRun) notes() []string {
	if r.table == nil {
		return nil
	}
	w := append([]string{}, r.table.warnings...)
	if r.cycle.note != "" {
		w = append(w, r.cycle.note)
	}
	return w
}

// choice compares, on the coarsest rung and for the strongest modes, the energy
// radiated with the table's own E and L with that from its velocity. It returns
// the relative difference, own minus velocity's.
func (r *climb) choice(ctx context.Context, p *tablePath, until float64, energy func(*certify.Samples, *ladder) float64) (float64, error) {
	own, err := worldline.NewTable(p.samples, true)
	if err != nil {
		return 0, p.faults(err, p.samples.T)
	}
	r.meter.stage("the table's own E and L")
	group := leading(r.modes)
	if len(group) == 0 {
		return 0, nil
	}
	var list []blockMode
	for _, m := range group {
		list = append(list, m.blockMode)
	}
	r.expect(0, 2*until)
	var sum [2]float64
	for i, w := range []worldline.Worldline{p, own} {
		b, err := kept(r.o.Keep, fmt.Sprintf("choice-%d", i), func() (*blockRun, error) {
			return r.n.evolveBlock(ctx, list, movingForce(w, r.n.ramp, group), 0, until, nil, r.meter.did)
		})
		if err != nil {
			return 0, err
		}
		for q, m := range group {
			sum[i] += energy(&b.Samples[q], m)
		}
	}
	return sum[1]/sum[0] - 1, nil
}

// tellChoice writes the difference that the choice of E and L makes into a
// result.
func tellChoice(c *configs.Case, res *result.Result, difference float64) {
	res.Orbit.Numbers["own_energy_difference"] = difference
	if math.Abs(difference) > c.Accuracy.Relative {
		res.Warnings = append(res.Warnings, fmt.Sprintf("the table's E and L are not those of its velocity, which are used here: with the table's own the radiated energy of the strongest modes would change by %+.2g of itself", difference))
	}
	res.Conventions["constants"] = "E and L of the source are those of the momentary velocity, u^t from its norm; own_energy_difference is what the table's own columns would change, relative"
}

// tellDrift says how much the averaged flux of the strongest mode changes from
// one period to the next, where the start-up does not explain it.
func (r *boundRun) tellDrift(res *result.Result) {
	var top *ladder
	for _, m := range r.modes {
		if top == nil || m.mov.flux[0].energy > top.mov.flux[0].energy {
			top = m
		}
	}
	if r.table == nil || top == nil {
		return
	}
	e0, _, err0 := r.mean(top.runs[top.rung], top, certify.Infinity, r.n.until)
	e1, _, err1 := r.mean(top.runs[top.rung], top, certify.Infinity, r.n.until-r.period)
	if err0 != nil || err1 != nil {
		return
	}
	change := (e0 - e1) / e0
	res.Orbit.Numbers["flux_change_per_period"] = change
	if math.Abs(change) > 2*math.Max(r.starts[top].moved[0], top.mov.flux[0].energyBar.Bar()) {
		res.Warnings = append(res.Warnings, fmt.Sprintf("the orbit changes: the averaged flux of the mode (%d,%d) grows by %.2g of itself in one period, and the averages hold for their window (see conventions)", top.l, top.m, change))
	}
}
