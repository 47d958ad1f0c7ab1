package wire

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
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

// kerrBound is an eccentric, inclined or generic bound orbit on Kerr.
type kerrBound struct {
	*kerrClimb
	orbit  *worldline.KerrBound
	period float64 // that the time step divides
	length float64 // of the window
	tilt   bool    // leaves the equator: both signs of m are listed apart
	whole  bool
	ms     []*kerrTones // m >= 0; the other sign follows by symmetry
}

// kerrTones is one m of it.
type kerrTones struct {
	m, n        int
	last, asked int
	rung        int
	until       float64
	runs        map[int]*blockRun
	tones       kerr.Tones
	rates       *kerr.Rates
	bars        *kerr.BoundBars
	parts       [2][]*result.Flux // by end and l, this sign of m alone
	sums        [2]*result.Flux
	met         bool
	why         string
	settled     bool
}

// kerrOrbit makes the bound orbit of a case.
func kerrOrbit(c *configs.Case, h hyperboloidal.Kerr) (*worldline.KerrBound, error) {
	o := c.Orbit
	p, e := o.P, o.E
	if o.Kind == configs.Circular {
		p, e = o.Radius, 0
	}
	return worldline.NewKerrBound(h, p, e, cosInclination(o.Inclination), o.RadialPhase, o.PolarPhase, o.Azimuth)
}

// cosInclination is exact where the orbit is equatorial or polar.
func cosInclination(degrees float64) float64 {
	switch degrees {
	case 0:
		return 1
	case 90:
		return 0
	case 180:
		return -1
	}
	return math.Cos(degrees * math.Pi / 180)
}

func newKerrBound(c *configs.Case, o Options) (*kerrBound, error) {
	h, err := hyperboloidal.NewKerr(c.Hole.Spin)
	if err != nil {
		return nil, err
	}
	r := &kerrBound{kerrClimb: newKerrClimb(c, o, h), tilt: tilted(c), whole: len(c.Waves.Modes) == 0}
	if r.orbit, err = kerrOrbit(c, h); err != nil {
		return nil, err
	}
	rmin, rmax := r.orbit.Range()
	r.n = chooseKerr(c, h, rmin, rmax, kerrSpacing(r.asked, rmin))
	r.n.rungs = 2
	turn := 2 * math.Pi / math.Abs(r.orbit.OmegaTheta)
	switch {
	case r.orbit.Ecc == 0:
		r.period = turn
		r.length = 5 * turn
	case !r.tilt:
		r.period = 2 * math.Pi / r.orbit.OmegaR
		r.length = 5 * r.period
	default:
		r.period = 2 * math.Pi / r.orbit.OmegaR
		r.length = math.Max(14*r.period, 10*turn)
	}
	ms, top := kerrMs(c, false)
	for _, m := range ms {
		if m < 0 {
			continue
		}
		r.ms = append(r.ms, &kerrTones{m: m, asked: top[m], last: top[m], rung: r.n.rungs - 1, runs: map[int]*blockRun{}})
	}
	return r, nil
}

func (r *kerrBound) carry(t *kerrTones) {
	w := float64(max(t.m, 1)) * math.Abs(r.orbit.OmegaPhi)
	t.n = coupled.Angular(r.hole.Spin(), w, t.m, t.last, r.asked)
	t.n = max(t.n, t.last-lowest(t.m)+1+r.n.rungs-1)
	if r.n.angular > 0 {
		t.n = max(r.n.angular, r.n.rungs)
		t.last = min(t.last, lowest(t.m)+t.n-1)
	}
}

func runKerrBound(ctx context.Context, c *configs.Case, o Options) (*result.Bundle, error) {
	clock := startClock()
	r, err := newKerrBound(c, o)
	if err != nil {
		return nil, err
	}
	r.meter.stage(fmt.Sprintf("%d azimuthal numbers", len(r.ms)))
	err = each(ctx, o.Workers, len(r.ms), func(ctx context.Context, i int) error { return r.climb(ctx, r.ms[i]) })
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

// climb runs one m to its end.
func (r *kerrBound) climb(ctx context.Context, t *kerrTones) error {
	if err := r.scout(ctx, t); err != nil {
		return err
	}
	r.carry(t)
	for k := t.rung; ; k++ {
		t.rung = k
		until := t.until
		var more func([]certify.Samples, float64) float64
		if until == 0 {
			if until = r.n.until; until == 0 {
				until = r.firstUntil(100)
				more = r.more(t)
			}
		}
		b, err := r.run(ctx, "tones", t, k, t.n, until, more)
		if err != nil {
			return err
		}
		t.runs[k], t.until = b, b.Until
		if t.runs[k-1] == nil {
			if t.runs[k-1], err = r.run(ctx, "tones", t, k-1, t.n-1, t.until, nil); err != nil {
				return err
			}
		}
		climb, err := r.certify(t)
		if err != nil {
			return err
		}
		if !climb || r.n.fixed || k >= r.n.maxRung {
			break
		}
		delete(t.runs, k-1)
		t.n++
	}
	t.runs = nil
	return nil
}

func (r *kerrBound) run(ctx context.Context, key string, t *kerrTones, k, angular int, until float64, more func([]certify.Samples, float64) float64) (*blockRun, error) {
	g := r.n.rung(k, t.m, angular).Align(r.period)
	most := until
	if more != nil {
		most = r.lastUntil()
	}
	start := func() (*coupled.Run, error) {
		return coupled.Moving(coupled.Equation{S: -2, M: t.m}, g, coupled.BoundTrack(r.orbit, g.Dt, most))
	}
	return r.evolve(ctx, fmt.Sprintf("%s-m%d-rung%d-l%d", key, t.m, k, angular), t.m, k, g, until, start, more)
}

func (r *kerrBound) firstUntil(wait float64) float64 { return r.n.domain.On() + wait + r.length }

func (r *kerrBound) lastUntil() float64 {
	return math.Max(r.firstUntil(2000), r.firstUntil(3*r.length))
}

// counts returns how many harmonics of the radial and of the polar motion to
// begin with.
func (r *kerrBound) counts(t *kerrTones) (nr, nth int) {
	if e := r.orbit.Ecc; e > 0 {
		// Amplitudes fall at least like (e/(1+sqrt(1-e^2)))^n for n far from the peak.
		nr = 4 + int(math.Ceil(math.Log(math.Sqrt(r.asked))/math.Log(e/(1+math.Sqrt((1-e)*(1+e))))))
		nr = min(nr+t.m, 60)
	}
	if r.tilt {
		nth = t.last + t.m + 2
		if r.orbit.Ecc > 0 {
			nth = min(nth, t.last+2)
		}
	}
	return nr, nth
}

func (r *kerrBound) tonesOf(t *kerrTones, more int) kerr.Tones {
	nr, nth := r.counts(t)
	if nr > 0 {
		nr += more
	}
	if nth > 0 {
		nth += more / 2
	}
	o := r.orbit
	return kerr.NewTones(t.m, o.OmegaPhi, o.OmegaR, o.OmegaTheta, nr, nth)
}

// scout finds the l at which the sums at this m come to their end.
func (r *kerrBound) scout(ctx context.Context, t *kerrTones) error {
	if r.n.angular > 0 || r.n.fixed {
		return nil
	}
	n := max(t.last-lowest(t.m)+1, 9)
	until := r.firstUntil(60)
	b, err := r.run(ctx, "scout", t, 0, n, until, nil)
	if err != nil {
		return err
	}
	rates, err := kerr.BoundRates(r.hole, r.tonesOf(t, 0), b.Samples, b.Samples[0].Until(), r.length)
	if err != nil {
		return err
	}
	need := 0
	for _, rs := range [][]kerr.Rate{rates.Infinity, rates.Horizon} {
		var e []float64
		for _, x := range rs {
			e = append(e, x.Energy)
		}
		need = max(need, ending(e, r.asked/2))
	}
	t.last = max(t.last, lowest(t.m)+need) // one more than the look found
	return nil
}

// more goes on until the window's shift leaves a third of what is asked for in
// the sums.
func (r *kerrBound) more(t *kerrTones) func([]certify.Samples, float64) float64 {
	tones := r.tonesOf(t, 0)
	return func(s []certify.Samples, until float64) float64 {
		if until >= r.lastUntil() {
			return until
		}
		a, err1 := kerr.BoundRates(r.hole, tones, s, until, r.length)
		b, err2 := kerr.BoundRates(r.hole, tones, s, until-math.Min(0.2*r.length, 0.5*(until-r.length)), r.length)
		if err1 == nil && err2 == nil {
			quiet := true
			for _, p := range [][2][]kerr.Rate{{a.Infinity, b.Infinity}, {a.Horizon, b.Horizon}} {
				sum, left := 0.0, 0.0
				for i := range t.last - lowest(t.m) + 1 {
					sum += math.Abs(p[0][i].Energy)
					left += math.Abs(p[0][i].Energy - p[1][i].Energy)
				}
				quiet = quiet && left <= r.asked/3*sum
			}
			if quiet {
				return until
			}
		}
		return math.Min(until+math.Max(100, 0.15*r.length), r.lastUntil())
	}
}

// certify reads the rates with enough tones and sets bars, sums, t.met and t.why;
// climb says whether a finer rung would help.
func (r *kerrBound) certify(t *kerrTones) (climb bool, err error) {
	fine, coarse := t.runs[t.rung], t.runs[t.rung-1]
	rungs := []kerr.Rung{{Samples: fine.Samples, Points: fine.Points}, {Samples: coarse.Samples, Points: coarse.Points}}
	until := math.Min(t.until, math.Min(fine.Samples[0].Until(), coarse.Samples[0].Until()))
	for more := 0; ; more += 4 {
		tones := r.tonesOf(t, more)
		rates, bars, err := kerr.CertifyBound(r.hole, tones, rungs, until, r.length)
		if err != nil {
			if more > 0 {
				break // as many tones as the window can tell apart
			}
			return false, fmt.Errorf("m = %d: %w", t.m, err)
		}
		t.tones, t.rates, t.bars = tones, rates, bars
		if math.Max(rates.EdgeInfinity, rates.EdgeHorizon) < math.Max(r.asked/1000, 1e-13) || more >= 16 {
			break
		}
	}
	t.met, t.why, t.settled = true, "", true
	n := t.last - lowest(t.m) + 1
	for _, end := range []certify.End{certify.Infinity, certify.Horizon} {
		value, bar, other, edge := t.rates.Infinity, t.bars.Infinity, t.bars.Coarse.Infinity, t.rates.EdgeInfinity
		if end == certify.Horizon {
			value, bar, other, edge = t.rates.Horizon, t.bars.Horizon, t.bars.Coarse.Horizon, t.rates.EdgeHorizon
		}
		var parts []*result.Flux
		var size, disc float64
		for i := range n {
			parts = append(parts, &result.Flux{
				Energy:          result.Q{Value: value[i].Energy, Error: bar[i].Energy},
				AngularMomentum: result.Q{Value: value[i].AngularMomentum, Error: bar[i].AngularMomentum},
			})
			size += math.Abs(value[i].Energy)
			if i < len(other) {
				disc += kerr.Remainder * math.Abs(value[i].Energy-other[i].Energy)
			}
		}
		sum := flux.Sum(parts...)
		tail := kerrTail(parts)
		sum.Energy.Error += tail * size
		sum.AngularMomentum.Error += tail * math.Abs(sum.AngularMomentum.Value)
		t.parts[end], t.sums[end] = parts, sum
		t.settled = t.settled && settled(parts, r.asked)
		for i, f := range parts[:max(t.asked-lowest(t.m)+1, 0)] {
			// The modes that the case names count as well.
			if i < len(other) && f.Energy.Error > r.asked*heldTo(f, sum) &&
				kerr.Remainder*math.Abs(value[i].Energy-other[i].Energy) > 0.3*f.Energy.Error {
				climb = true
			}
		}
		relative := sum.Energy.Error / math.Abs(sum.Energy.Value)
		if relative <= r.asked {
			continue
		}
		t.met = false
		what := "start-up"
		switch {
		case tail*size > sum.Energy.Error/2:
			what = fmt.Sprintf("sum over l, cut at %d,", t.last)
		case edge*size > sum.Energy.Error/2:
			what = "count of harmonics"
		case disc > sum.Energy.Error/2:
			what, climb = "discretisation", true
		}
		t.why = strings.TrimPrefix(t.why+fmt.Sprintf("; at %s the %s holds the bar at %.1e", end, what, relative), "; ")
	}
	return climb, nil
}

// harmonics returns the amplitudes of r h (infinity) or Phi (horizon) of l, m in
// the label of that end, for either sign of m: h_{l,-m,-n,-k} is (-1)^{l+k} times
// the conjugate of h_{lmnk}, the mirror image in the equator.
func (r *kerrBound) harmonics(t *kerrTones, rates *kerr.Rates, end certify.End, i int, mirrored bool) (omega []float64, z []complex128) {
	if i >= len(rates.Z[end]) {
		return nil, nil
	}
	l := lowest(t.m) + i
	d := r.n.domain.Layers
	for j, w := range t.tones.Omega {
		a := rates.Z[end][i][j]
		if end == certify.Infinity {
			a = kerr.Strain(w, a) * cmplx.Exp(complex(0, -w*d.So))
		} else {
			a *= cmplx.Exp(complex(0, w*d.Si))
		}
		if mirrored {
			a = cmplx.Conj(a)
			if (l+t.tones.K[j])%2 != 0 {
				a = -a
			}
			w = -w
		}
		omega, z = append(omega, w), append(z, a)
	}
	return omega, z
}
