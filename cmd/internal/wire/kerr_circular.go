package wire

import (
	"context"
	"fmt"
	"math"
	"strings"

	"nullmark/configs"
	"nullmark/equations/coupled"
	"nullmark/extract/certify"
	"nullmark/extract/flux"
	"nullmark/extract/kerr"
	"nullmark/extract/result"
	"nullmark/hyperboloidal"
	"nullmark/source/worldline"
)

// kerrCircular is a circular equatorial orbit on Kerr on its way up the ladder.
type kerrCircular struct {
	*kerrClimb
	r0, omega float64
	state     worldline.KerrState
	power     int
	ms        []*kerrTone
	whole     bool // all m up to l_max are there
}

// kerrTone is one m of it.
type kerrTone struct {
	m, n    int // n l's carried on the finest rung
	last    int // the largest l that is reported and summed
	asked   int // the largest l that the case names
	tone    certify.Tone
	rung    int
	until   float64
	runs    map[int]*blockRun
	out     *kerr.Certified
	parts   [2][]*result.Flux // by end and l, both signs of m
	sums    [2]*result.Flux
	tails   [2]float64 // estimated |part| of l > last over the sum
	met     bool
	why     string
	settled bool
}

// kerrSpacing is the spacing of the finest rung that the ladder starts with, by
// the asked accuracy of the flux per m and the radius (see DEVELOPERS.md).
func kerrSpacing(asked, rmin float64) float64 {
	dx := 0.40 * math.Pow(math.Max(asked, 1e-11)/1e-9, 1./13)
	return math.Min(dx*math.Min(math.Max(math.Pow(rmin/6, 0.35), 0.6), 1.3), kerrCoarsest)
}

func newKerrCircular(c *configs.Case, o Options) (*kerrCircular, error) {
	h, err := hyperboloidal.NewKerr(c.Hole.Spin)
	if err != nil {
		return nil, err
	}
	r := &kerrCircular{kerrClimb: newKerrClimb(c, o, h), r0: c.Orbit.Radius, power: certify.WindowPower(c.Accuracy.Relative)}
	r.state, r.omega, err = coupled.CircularState(h, r.r0, 0)
	if err != nil {
		return nil, err
	}
	r.n = chooseKerr(c, h, r.r0, r.r0, kerrSpacing(r.kerrClimb.asked, r.r0))
	ms, top := kerrMs(c, false)
	r.whole = len(c.Waves.Modes) == 0
	for _, m := range ms {
		if m == 0 {
			continue
		}
		t := &kerrTone{m: m, asked: top[m], last: top[m], rung: r.n.rungs - 1, runs: map[int]*blockRun{},
			tone: certify.Tone{L: lowest(m), M: m, Omega: float64(m) * r.omega, On: r.n.domain.On()}}
		r.ms = append(r.ms, t)
	}
	return r, nil
}

// carry sets how many l's the finest rung has for sums up to t.last.
func (r *kerrCircular) carry(t *kerrTone) {
	t.n = coupled.Angular(r.hole.Spin(), t.tone.Omega, t.m, t.last, r.kerrClimb.asked)
	t.n = max(t.n, t.last-lowest(t.m)+1+r.n.rungs-1)
	if r.hole.Spin() != 0 {
		t.n++ // what the coarser rungs lack would rule the bars of the weak modes
	}
	if r.n.angular > 0 {
		t.n = max(r.n.angular, r.n.rungs)
		t.last = min(t.last, lowest(t.m)+t.n-1)
	}
}

func runKerrCircular(ctx context.Context, c *configs.Case, o Options) (*result.Bundle, error) {
	clock := startClock()
	r, err := newKerrCircular(c, o)
	if err != nil {
		return nil, err
	}
	r.meter.stage(fmt.Sprintf("%d azimuthal numbers", len(r.ms)))
	err = each(ctx, o.Workers, len(r.ms), func(ctx context.Context, i int) error { return r.tone(ctx, r.ms[i]) })
	if err != nil {
		return nil, err
	}
	b, err := r.assemble(c)
	if err != nil {
		return nil, err
	}
	b.Result.Provenance = clock.stop(o.Workers)
	return b, nil
}

// tone runs one m to its end: a look at the coarsest rung for the l's that the
// sums need, then the rungs, and finer ones while the bar asks for them.
func (r *kerrCircular) tone(ctx context.Context, t *kerrTone) error {
	if err := r.scout(ctx, t); err != nil {
		return err
	}
	r.carry(t)
	for k := t.rung; ; k++ {
		t.rung = k
		until := t.until
		var more func([]certify.Samples, float64) float64
		if until == 0 {
			until = r.firstUntil(t)
			if r.n.until == 0 {
				more = r.more(t, k)
			}
		}
		b, err := r.run(ctx, "tone", t, k, t.n, until, more)
		if err != nil {
			return err
		}
		t.runs[k], t.until = b, b.Until
		for j := k - 1; j > k-r.n.rungs; j-- {
			if t.runs[j] == nil {
				if t.runs[j], err = r.run(ctx, "tone", t, j, t.n-(k-j), t.until, nil); err != nil {
					return err
				}
			}
		}
		climb, err := r.certify(t)
		if err != nil {
			return err
		}
		if !climb || r.n.fixed || k >= r.n.maxRung {
			break
		}
		delete(t.runs, k-r.n.rungs+1)
		t.n++ // the finer rung carries one l more than the one before
		if r.n.angular > 0 {
			t.n--
		}
	}
	for k := range t.runs {
		if k < t.rung-1 {
			delete(t.runs, k)
		}
	}
	return nil
}

func (r *kerrCircular) run(ctx context.Context, key string, t *kerrTone, k, angular int, until float64, more func([]certify.Samples, float64) float64) (*blockRun, error) {
	g := r.n.rung(k, t.m, angular)
	start := func() (*coupled.Run, error) {
		return coupled.Circular(coupled.Equation{S: -2, M: t.m}, g, r.state, r.omega)
	}
	return r.evolve(ctx, fmt.Sprintf("%s-m%d-rung%d-l%d", key, t.m, k, angular), t.m, k, g, until, start, more)
}

func (r *kerrCircular) labels() kerr.Labels {
	return kerr.Labels{Si: r.n.domain.Layers.Si, So: r.n.domain.Layers.So}
}

// read certifies samples of rungs.
func (r *kerrCircular) read(t *kerrTone, rungs []kerr.Rung, until float64, power int) (*kerr.Certified, error) {
	return kerr.Certify(r.hole, t.tone, r.labels(), rungs, until, power)
}

// scout finds the l at which the sums at this m come to their end.
func (r *kerrCircular) scout(ctx context.Context, t *kerrTone) error {
	if r.n.angular > 0 || r.n.fixed {
		return nil
	}
	n := max(t.last-lowest(t.m)+1, 8)
	until := certify.Earliest(t.tone, 1) + 60
	b, err := r.run(ctx, "scout", t, 0, n, until, nil)
	if err != nil {
		return err
	}
	s := kerr.Rung{Samples: b.Samples, Points: b.Points}
	c, err := r.read(t, []kerr.Rung{s, s}, until, 1)
	if err != nil {
		return err
	}
	var e, a []float64
	for i := range n {
		q, _ := c.Rate(i)
		w, _ := c.Absorbed(i)
		e, a = append(e, q.Energy), append(a, w.Energy)
	}
	need := max(ending(e, r.kerrClimb.asked/2), ending(a, r.kerrClimb.asked/2))
	t.last = max(t.last, lowest(t.m)+need-1)
	return nil
}

// firstUntil is where the search for a quiet window begins, lastUntil where it
// is given up.
func (r *kerrCircular) firstUntil(t *kerrTone) float64 {
	if r.n.until > 0 {
		return r.n.until
	}
	return certify.Earliest(t.tone, r.power) + 60
}

func (r *kerrCircular) lastUntil(t *kerrTone) float64 {
	return math.Max(certify.Earliest(t.tone, r.power)+12*t.tone.Period(), 3000)
}

// more goes on until what the start-up left in the sums is a third of what is
// asked for, or below round-off.
func (r *kerrCircular) more(t *kerrTone, k int) func([]certify.Samples, float64) float64 {
	points := r.n.rung(k, t.m, t.n).Points
	floor := 2 * certify.RoundOff(points, t.tone.Omega)
	return func(s []certify.Samples, until float64) float64 {
		if until >= r.lastUntil(t) {
			return until
		}
		one := kerr.Rung{Samples: s, Points: points}
		c, err := r.read(t, []kerr.Rung{one, one}, until, r.power)
		quiet := err == nil
		if quiet {
			for _, end := range []certify.End{certify.Infinity, certify.Horizon} {
				sum, left := 0.0, 0.0
				for i := range t.last - lowest(t.m) + 1 {
					e, b := rateAt(c, end, i)
					sum += math.Abs(e.Energy)
					left += 2 * b.Transient * math.Abs(e.Energy)
				}
				quiet = quiet && left <= sum*math.Max(r.kerrClimb.asked/3, floor)
			}
		}
		if quiet {
			return until
		}
		return math.Min(until+math.Max(40, 0.3*t.tone.Period()), r.lastUntil(t))
	}
}

// rateAt is the flux of entry i at an end and the budget of its amplitude.
func rateAt(c *kerr.Certified, end certify.End, i int) (kerr.Rate, certify.Budget) {
	if end == certify.Infinity {
		e, _ := c.Rate(i)
		return e, c.Infinity[i].Bar
	}
	e, _ := c.Absorbed(i)
	return e, c.Horizon[i].Bar
}

// weak is the fraction of the sum over l below which a single mode is held to
// the asked accuracy of that fraction: only the sums are independent of the basis.
const weak = 1e-3

// certify reads the amplitudes and sets bars, sums, t.met and t.why; climb says
// whether a finer rung would help.
func (r *kerrCircular) certify(t *kerrTone) (climb bool, err error) {
	var rungs []kerr.Rung
	for k := t.rung; k > t.rung-r.n.rungs; k-- {
		b := t.runs[k]
		rungs = append(rungs, kerr.Rung{Samples: b.Samples, Points: b.Points})
	}
	if t.out, err = r.read(t, rungs, t.until, r.power); err != nil {
		return false, fmt.Errorf("span.until %g is too short for m = %d: %w", t.until-r.n.domain.Layers.So, t.m, err)
	}
	asked := r.kerrClimb.asked
	t.met, t.why, t.settled = true, "", true
	n := t.last - lowest(t.m) + 1
	for _, end := range []certify.End{certify.Infinity, certify.Horizon} {
		var parts []*result.Flux
		var disc, rest, size float64
		for i := range n {
			e, b := rateAt(t.out, end, i)
			parts = append(parts, kerrFlux(e, 2*b.Bar()))
			disc += 2 * b.Discretisation * math.Abs(e.Energy)
			rest += 2 * (b.Transient + b.RoundOff) * math.Abs(e.Energy)
			size += math.Abs(e.Energy)
		}
		sum := flux.Sum(parts...)
		t.tails[end] = kerrTail(parts)
		sum.Energy.Error += t.tails[end] * size
		sum.AngularMomentum.Error += t.tails[end] * math.Abs(sum.AngularMomentum.Value)
		t.parts[end], t.sums[end] = parts, sum
		t.settled = t.settled && settled(parts, asked)
		for i, f := range parts[:max(t.asked-lowest(t.m)+1, 0)] {
			// The modes that the case names count as well.
			e, b := rateAt(t.out, end, i)
			scale := asked * heldTo(f, sum)
			if d := 2 * b.Discretisation * math.Abs(e.Energy); f.Energy.Error > scale && d > 0.7*f.Energy.Error {
				climb = true
			}
		}
		if relative := sum.Energy.Error / math.Abs(sum.Energy.Value); !(relative <= asked) {
			t.met = false
			what := "discretisation"
			switch {
			case t.tails[end] > disc/size && t.tails[end] > rest/size:
				what = "sum over l, cut at " + fmt.Sprint(t.last) + ","
			case rest > disc:
				what = "start-up or round-off"
			}
			t.why = strings.TrimPrefix(t.why+fmt.Sprintf("; at %s the %s holds the bar at %.1e", end, what, relative), "; ")
			if disc > 0.3*math.Max(asked*size-rest, 0) && disc > 0.5*rest {
				climb = true
			}
		}
	}
	return climb, nil
}

// kerrTail estimates what all l beyond the given parts add, over their sum.
func kerrTail(parts []*result.Flux) float64 {
	n := len(parts)
	sum := 0.0
	for _, p := range parts {
		sum += math.Abs(p.Energy.Value)
	}
	if n < 3 || sum == 0 || parts[n-3].Energy.Value == 0 {
		return 1
	}
	q := math.Sqrt(math.Abs(parts[n-1].Energy.Value / parts[n-3].Energy.Value))
	last := math.Max(math.Abs(parts[n-1].Energy.Value), q*math.Abs(parts[n-2].Energy.Value))
	if !(q < 0.95) {
		return 1
	}
	return last * q / (1 - q) / sum
}
