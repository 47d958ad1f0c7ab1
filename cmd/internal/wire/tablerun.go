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
		return a, &tooShort{what: what, have: math.Max(have, 0), need: 2*a.period - (end - quiet), untilKey: asked && end < lastSlice(p, n, p.last)-2*a.period}
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
		res.Warnings = append(res.Warnings, fmt.Sprintf("the table's E and L are not those of its velocity, which are used here: with the table's own the radiated energy of the strongest modes changes by %.2g of it", difference))
	}
	res.Conventions["constants"] = "E and L of the source are those of the momentary velocity, u^t from its norm; own_energy_difference is what the table's own columns would change, relative"
}
