package wire

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
	"strings"

	"nullmark/configs"
	"nullmark/equations"
	"nullmark/equations/semi"
	"nullmark/extract/certify"
	"nullmark/extract/flux"
	"nullmark/extract/result"
	"nullmark/extract/strain"
	"nullmark/grid"
	"nullmark/source"
	"nullmark/source/worldline"
)

const total = "total"

// deepEnd is the r_* at which the source of a falling particle is let go: its
// strength falls like e^{r_*/2} and is below 1e-14 there.
const deepEnd = -65.0

// burstRun is an orbit that comes and goes, or plunges: transients.
type burstRun struct {
	*climb
	path    worldline.Worldline
	asked   float64
	falls   bool    // reaches the horizon
	ends    float64 // slice time at which the evolution ends
	event   float64 // when the orbit does what it is run for
	after   float64 // retarded time from which numbers count
	open    [2]bool // the particle comes from, and goes to, infinity
	starts  map[*ladder]junkSeries
	largest float64 // radiated energy of the strongest mode, per both signs
	turning bool    // goes round many times before the event
	table   *tablePath
}

// burstPath makes the worldline of a transient case.
func burstPath(c *configs.Case) (worldline.Worldline, error) {
	return burstPathOf(c, worldline.FollowFrequency)
}

// burstPathOf is burstPath with the torque of an inspiral continued through the
// plunge in one of the ways there are.
func burstPathOf(c *configs.Case, through worldline.Continuation) (worldline.Worldline, error) {
	o := c.Orbit
	switch o.Kind {
	case configs.Infall:
		return worldline.NewInfall(o.From, o.Energy, o.AngularMomentum, 0)
	case configs.Scatter:
		return worldline.NewScatter(o.Energy, o.AngularMomentum, o.From, 0, 0)
	case configs.Inspiral:
		drive, err := driveOf(o.Drive)
		if err != nil {
			return nil, err
		}
		return worldline.NewInspiral(worldline.InspiralOrbit{MassRatio: o.MassRatio, From: o.From, Drive: drive, Continue: through})
	}
	if o.Kind == configs.Table {
		return newTablePath(o)
	}
	return nil, fmt.Errorf("orbit.kind %s is not a transient", o.Kind)
}

// horizonTime is when a falling particle passes r_* = HorizonApproach, or +Inf.
func horizonTime(w worldline.Worldline) float64 {
	for _, m := range w.Markers() {
		if m.Name == worldline.MarkHorizon {
			return m.T
		}
	}
	return math.Inf(1)
}

// burstRamp fits the switch-on into the time before the event (the fall into the
// horizon, the periastron): the softer it is, the less it excites, and the
// residue of the start-up is what limits a transient.
func burstRamp(event float64) source.Ramp {
	c := math.Min(0.35*event, 400)
	return source.Ramp{Centre: c, Width: c / 4.7}
}

// eventTime is when a transient orbit does what it is run for.
func eventTime(w worldline.Worldline) float64 {
	th := horizonTime(w)
	for _, m := range w.Markers() {
		if m.Name == worldline.MarkPeakOmega || m.Name == worldline.MarkPeriastron && math.IsInf(th, 1) {
			return m.T
		}
	}
	if _, t1 := w.Span(); math.IsInf(th, 1) {
		return t1 / 2 // a table that only leaves
	}
	return th - 30
}

// turnsBefore is how often a path goes round before time t.
func turnsBefore(w worldline.Worldline, t float64) float64 {
	var a, b worldline.State
	w.At(0, &a)
	w.At(t, &b)
	return math.Abs(b.Phi-a.Phi) / (2 * math.Pi)
}

// fastCells widens the kernel of a particle that comes near the speed of light:
// measured on a plunge from r = 5.95, the distance between rungs at the light
// ring is 2e-9 of the peak with 1.9 cells (and stays there from rung to rung),
// 2e-11 with 2.1 and 6e-11 with 2.3 (1e-6 asked; at 1e-8 2e-12 and 3e-12).
const fastCells = 1.16

func newBurstRun(c *configs.Case, n numerics, o Options) (*burstRun, error) {
	w, err := burstPathOf(c, n.through)
	if err != nil {
		return nil, err
	}
	r := &burstRun{climb: newClimb(n, o), path: w, asked: c.Accuracy.Relative}
	r.kind = r
	r.turning = w.Kind() == configs.Inspiral
	if t, ok := w.(*tablePath); ok {
		r.table, r.origin = t, t.origin
		r.half, r.halved = t.thin()
		if r.n.until > 0 {
			r.n.until -= t.origin
		}
	}
	r.open[0], r.open[1] = openEnds(c)
	th := horizonTime(w)
	r.falls = !math.IsInf(th, 1)
	inner, outer := r.reach(th)
	r.event = eventTime(w)
	r.turning = r.turning || r.table != nil && r.table.plunges() && turnsBefore(w, r.event) > 3
	r.n.ramp = burstRamp(r.event)
	r.n.filter, r.n.filterStrength = 16, 0.5
	if c.Numerics.KernelWidth == nil {
		r.n.cells *= fastCells
	}
	r.n.courant = math.Min(r.n.courant, 1.1)
	r.n.outer = math.Max(r.n.outer, 30)
	if r.falls {
		inner = deepEnd
	}
	r.n.placeBetween(inner, outer)
	if r.falls {
		// Below the deep end the kernel needs no flat room: the source is gone.
		r.n.domain.Ri = deepEnd - 2
		r.n.domain.Si = r.n.domain.Ri - r.n.inner
	}
	switch {
	case r.n.until > 0:
		r.ends = r.n.until + r.n.domain.So
		if r.table != nil && !r.falls {
			r.ends = math.Min(r.ends, lastSlice(w, &r.n, r.table.last))
		}
	case r.falls:
		// r_* = -30 is passed about 33 M after the light ring; the ringdown is
		// followed for 150 M.
		r.ends = th + 120 + r.n.domain.So
	default:
		// The source stops at the end of the path: what that sends out arrives
		// later than anything that is used.
		_, t1 := w.Span()
		r.ends = lastSlice(w, &r.n, t1)
	}
	var start worldline.State
	w.At(0, &start)
	for _, lm := range c.ModeList() {
		m := newLadder(lm[0], lm[1])
		if start.L == 0 && m.parity == equations.Odd {
			continue // a radial fall excites even modes only
		}
		m.mov = &movingMode{}
		m.allow = [2]float64{r.asked, r.asked}
		m.rung = r.startRung()
		r.modes = append(r.modes, m)
	}
	return r, nil
}

// reach is the range of r_* that the particle covers while the source acts.
func (r *burstRun) reach(th float64) (inner, outer float64) {
	var s worldline.State
	t0, t1 := r.path.Span()
	t0 = math.Max(t0, -40)
	if r.falls {
		t1 = th
	}
	inner, outer = math.Inf(1), math.Inf(-1)
	const parts = 400
	for i := 0; i <= parts; i++ {
		r.path.At(t0+(t1-t0)*float64(i)/parts, &s)
		inner, outer = math.Min(inner, s.Rstar), math.Max(outer, s.Rstar)
	}
	return inner, outer
}

// startRung is the measured spacing for an asked accuracy of the strain against
// its peak.
func (r *burstRun) startRung() int {
	if r.n.fixedRung >= 0 {
		return r.n.fixedRung
	}
	k := int(math.Round(2.5 - 0.45*(math.Log10(r.asked)+4)))
	return min(max(k, r.n.rungs-1), r.n.maxRung)
}

func runBurst(ctx context.Context, c *configs.Case, n numerics, o Options) (*result.Bundle, error) {
	clock := startClock()
	r, err := newBurstRun(c, n, o)
	if err != nil {
		return nil, err
	}
	for _, m := range r.modes {
		m.until = r.ends
	}
	if r.starts, err = r.junk(ctx); err != nil {
		return nil, err
	}
	for _, m := range r.modes {
		m.until = 0
	}
	r.after = r.quietAt()
	all := r.modes
	r.modes = leading(all)
	if err := r.run(ctx); err != nil {
		return nil, err
	}
	for _, m := range r.modes {
		r.largest = math.Max(r.largest, m.mov.flux[0].energy)
	}
	r.modes = all
	if err := r.run(ctx); err != nil {
		return nil, err
	}
	b, err := r.assemble(c)
	if err != nil {
		return nil, err
	}
	if r.table != nil && r.table.hasOwn() {
		d, err := r.choice(ctx, r.table, r.ends, func(s *certify.Samples, m *ladder) float64 {
			return certify.Integrate(s, certify.Infinity, r.after+r.n.domain.So, r.ends-1, 0.25).Power * flux.Norm(m.l)
		})
		if err != nil {
			return nil, err
		}
		tellChoice(c, b.Result, d)
	}
	b.Result.Provenance = clock.stop(o.Workers)
	return b, nil
}

func (r *burstRun) worldline() worldline.Worldline { return r.path }

// quietAt is the retarded time from which numbers count: the particle has come
// to full strength there, the strongest modes' residue of the start-up has
// stopped mattering for the energy, or there is no more time to wait before the event.
func (r *burstRun) quietAt() float64 {
	var s worldline.State
	on := r.n.ramp.Centre + 2.5*r.n.ramp.Width
	r.path.At(on, &s)
	first := on - s.Rstar + 20
	r.path.At(r.event, &s)
	last := r.event - math.Max(s.Rstar, 0) - 60
	if last <= first {
		return first
	}
	// Wait until what the residue adds to the radiated energy is a third of what
	// is asked for, if there is time.
	after := first
	for _, m := range leading(r.modes) {
		j := r.starts[m]
		for after < last && j.energy(0, after+r.n.domain.So, j.sent[0]) > r.asked/3*j.sent[0] {
			after += 2
		}
	}
	if r.turning {
		// An inspiral has time: its strain counts from here on as well.
		for _, m := range r.modes {
			j := r.starts[m]
			for after < last-200 && j.at(0, after+r.n.domain.So) > r.asked/5*j.peak[0] {
				after += 2
			}
		}
	}
	return math.Min(after, last)
}

// force implements kind.
func (r *burstRun) force(modes []*ladder) func(grid.Grid, source.Kernel, float64) semi.Forcing {
	return movingForce(r.path, r.n.ramp, modes)
}

func (r *burstRun) firstUntil(*ladder) float64 { return r.ends }
func (r *burstRun) lastUntil(*ladder) float64  { return r.ends }
func (r *burstRun) stride(*ladder) float64     { return 1 }

// quiet implements kind: the end is fixed by the orbit.
func (r *burstRun) quiet(*certify.Samples, *ladder, float64, int) bool { return true }

// strainFrom is the retarded time from which the strain must reach what was
// asked: a driven inspiral counts from the end of its start-up, the other
// transients from shortly before their event (the residue of the start-up has a
// bar at every sample in any case).
func (r *burstRun) strainFrom() float64 {
	if r.turning {
		return r.after
	}
	var s worldline.State
	r.path.At(r.event, &s)
	return math.Max(r.after, r.event-math.Max(s.Rstar, 0)-60)
}

// certify implements kind: the strain against its peak, and the radiated totals.
func (r *burstRun) certify(m *ladder) (climb bool, err error) {
	m.met, m.why = true, ""
	d := r.n.domain
	left := certify.Leftover(min(r.n.order, r.n.moments))
	round := certify.RoundOff(m.points[m.rung], 1)
	// The strain.
	step := math.Max(0.5, m.runs[m.rung].Dt)
	us := ladderOfTimes(step, r.strainFrom(), d.Retarded(r.ends)-1)
	w, bars, diff := r.sampled(m, certify.Infinity, d.Retarded(0), us, step)
	peak, worst, worstDisc := 0.0, 0.0, 0.0
	for i := range w {
		peak = math.Max(peak, cmplx.Abs(w[i]))
		worst = math.Max(worst, bars[i])
		worstDisc = math.Max(worstDisc, left*diff[i])
	}
	if b := worst / peak; !(b <= r.asked) {
		m.met = false
		what := "discretisation"
		if worstDisc < worst/2 {
			what = "start-up"
		}
		m.why = fmt.Sprintf("the %s holds the bar of the strain at %.1e of its peak", what, b)
		climb = what == "discretisation" && worstDisc/peak > round
	}
	// The totals.
	c := flux.Norm(m.l) / (64 * math.Pi)
	if m.m != 0 {
		c *= 2
	}
	ends := 2
	if r.falls {
		ends = 1 // on the horizon the particle's own field passes
	}
	for e := 0; e < ends; e++ {
		var x [3]certify.Radiated
		from, until := r.after+d.So, r.ends-1
		if certify.End(e) == certify.Horizon {
			from = r.after + d.So - d.Ro // the signal reaches the horizon sooner
		}
		count := 0
		for k := m.rung; k > m.rung-min(r.n.rungs, 3); k-- {
			x[count] = certify.Integrate(m.runs[k], certify.End(e), from, until, 0.25)
			count++
		}
		f := &m.mov.flux[e]
		var more radiated
		if certify.End(e) == certify.Infinity {
			more = r.outside(m, m.runs[m.rung])
		}
		power, spin := x[0].Power+more.power, x[0].Spin+more.spin
		f.energy, f.spin = c*power, c*float64(m.m)*spin
		disc := func(a, b, g float64) float64 {
			v := math.Abs(a - b)
			if count > 2 {
				v = math.Max(v, certify.Guard*math.Abs(b-g))
			}
			return left * v
		}
		start := r.starts[m].energy(e, from, x[0].Power)
		dr, dphi := r.path.Uncertainty()
		path := 2*dr + 2*float64(m.m)*dphi
		if s := r.starts[m]; s.thin != nil {
			a, b := certify.Integrate(s.full, certify.End(e), from, until, 0.25), certify.Integrate(s.thin, certify.End(e), from, until, 0.25)
			path = r.halved * math.Abs(a.Power-b.Power) / a.Power
			if a.Spin != 0 {
				path = math.Max(path, r.halved*math.Abs(a.Spin-b.Spin)/math.Abs(a.Spin))
			}
		}
		f.energyBar = certify.Budget{
			Discretisation: disc(x[0].Power, x[1].Power, x[2].Power)/power + path,
			Transient:      start / power, Range: more.powerBar / power, RoundOff: 2 * round,
		}
		f.spinBar = certify.Budget{
			Discretisation: disc(x[0].Spin, x[1].Spin, x[2].Spin)/math.Max(math.Abs(spin), 1e-300) + path,
			Transient:      start / math.Max(power, 1e-300), Range: more.spinBar / math.Max(math.Abs(spin), 1e-300), RoundOff: 2 * round,
		}
		if m.m == 0 {
			f.spinBar = certify.Budget{}
		}
	}
	if b := m.mov.flux[0].energyBar; !(b.Bar() <= r.asked) && m.mov.flux[0].energy > 1e-6*r.largest {
		m.met = false
		m.why = strings.TrimPrefix(m.why+fmt.Sprintf("; the %s holds the bar of the radiated energy at %.1e", b.Largest(), b.Bar()), "; ")
		climb = climb || b.Discretisation > 0.3*r.asked
	}
	return climb, nil
}

// slowest is the most that a difference of two rungs is multiplied with in a bar
// of a sample: where differences do not shrink from rung to rung, what is left
// is of their own size.
const slowest = 4.0

// resampled is the order of the polynomials that put two rungs on common times.
const resampled = 10

// unsettled is what remains, in units of the last difference, where differences
// between rungs fall from before to last like a geometric series.
func unsettled(last, before []float64) []float64 {
	out := make([]float64, len(last))
	for i := range out {
		q := last[i] / math.Max(before[i], 1e-300)
		out[i] = math.Min(q/math.Max(1-q, 1e-3), slowest)
	}
	return out
}

// sampled resamples the field of a mode at one end with a bar per sample: what
// the two finest rungs leave open, what the start-up has left, round-off, and
// the worldline's own error. At infinity the field is the strain.
func (r *climb) sampledWith(m *ladder, e certify.End, start float64, at []float64, step float64, junk junkSeries, dphi float64) (w []complex128, bar, diff []float64) {
	fine, mid := m.runs[m.rung], m.runs[m.rung-1]
	fac := complex(1, 0)
	if e == certify.Infinity {
		fac = strain.Factor(m.l, m.parity == equations.Odd)
	}
	w = strain.Resample(fine.Psi[e], start, fine.Dt, at)
	o := strain.Resample(mid.Psi[e], start, mid.Dt, at)
	peak := 0.0
	diff = make([]float64, len(w))
	for i := range w {
		w[i] *= fac
		diff[i] = cmplx.Abs(w[i] - fac*o[i])
		peak = math.Max(peak, cmplx.Abs(w[i]))
	}
	left := certify.Leftover(min(r.n.order, r.n.moments, resampled))
	round := certify.RoundOff(m.points[m.rung], 1)
	reach := int(math.Ceil(12 / step))
	near := runningMax(diff, reach)
	bar = make([]float64, len(w))
	slow := make([]float64, len(w))
	if coarse := m.runs[m.rung-2]; coarse != nil && coarse.Until() >= at[len(at)-1]-start {
		before := strain.Resample(coarse.Psi[e], start, coarse.Dt, at)
		for i := range before {
			slow[i] = cmplx.Abs(fac * (o[i] - before[i]))
		}
		slow = unsettled(near, runningMax(slow, reach))
	}
	for i := range w {
		bar[i] = math.Max(left, slow[i])*near[i] + cmplx.Abs(fac)*junk.at(int(e), at[i]-start) + round*peak + float64(m.m)*dphi*cmplx.Abs(w[i])
	}
	return w, bar, diff
}

func (r *burstRun) sampled(m *ladder, e certify.End, start float64, at []float64, step float64) (w []complex128, bar, diff []float64) {
	_, dphi := r.path.Uncertainty()
	return r.sampledWith(m, e, start, at, step, r.starts[m], dphi)
}

// assemble turns the finished ladders into a result.
func (r *burstRun) assemble(c *configs.Case) (*result.Bundle, error) {
	tree, err := c.Tree()
	if err != nil {
		return nil, err
	}
	res := &result.Result{
		Schema: result.Schema, Title: c.Title, Case: tree, Conventions: conventions(),
		Orbit: describePath(r.path), Warnings: append([]string{}, Warnings(c)...),
	}
	if r.table != nil {
		r.shiftMarkers(res.Orbit)
		res.Warnings = append(res.Warnings, r.table.notes()...)
	}
	delete(res.Conventions, "circular strain")
	delete(res.Conventions, "circular series")
	delete(res.Conventions, "orbital frequency")
	res.Conventions["totals"] = r.rangeWords()
	res.Conventions["m = 0"] = "strain of m = 0 has an arbitrary constant (memory): only its changes mean something; its energy counts once"
	if r.falls {
		res.Conventions["horizon"] = "the particle crosses the horizon: its own field passes there, and no absorbed total is given"
	}
	index := r.rungList(res)
	for _, m := range r.modes {
		res.Modes = append(res.Modes, r.entry(m, index[m.rung]))
	}
	sumModes(c, res, total)
	r.peaks(res)
	r.kick(res)
	r.ringdown(res)
	verdict(c, res)
	_, dphi := r.path.Uncertainty()
	s := r.seriesOf(c, r.path, r.starts, dphi)
	if s != nil {
		s.JunkUntil = r.after + r.origin
	}
	return &result.Bundle{Result: res, Series: s, Spectrum: r.spectrumOf(res)}, nil
}

func (r *burstRun) entry(m *ladder, rung int) result.Mode {
	f := &m.mov.flux
	at := func(a averaged) *result.Flux {
		return &result.Flux{
			Energy:          result.Q{Value: a.energy, Error: a.energy * a.energyBar.Bar()},
			AngularMomentum: result.Q{Value: a.spin, Error: math.Abs(a.spin) * a.spinBar.Bar()},
		}
	}
	counts := bothSigns
	if m.m == 0 {
		counts = "m = 0 alone"
	}
	out := result.Mode{
		L: m.l, M: m.m, Parity: m.parity.String(), Measure: total, Counts: counts, Infinity: at(f[certify.Infinity]),
		Met: m.met, Why: m.why, Rung: rung,
		Budget: map[string]float64{
			"discretisation": f[0].energyBar.Discretisation, "start-up": f[0].energyBar.Transient, "round-off": f[0].energyBar.RoundOff,
		},
	}
	if r.open[0] || r.open[1] {
		out.Budget["outside the range"] = f[0].energyBar.Range
	}
	if !r.falls {
		out.Horizon = at(f[certify.Horizon])
	}
	return out
}

// checkBurst passes on what the worldline refuses.
func checkBurst(c *configs.Case) []configs.Problem {
	if c.Orbit == nil || c.Waves.Equation != configs.Master {
		return nil
	}
	switch c.Orbit.Kind {
	case configs.Infall, configs.Scatter, configs.Inspiral:
		_, err := burstPath(c)
		if err != nil {
			return refusal(err)
		}
		if c.Orbit.Kind == configs.Infall && c.Orbit.From <= 3.5 {
			return []configs.Problem{{Key: "orbit.from", Value: c.Orbit.From, Want: "a start radius above 3.5: from there on the particle is at the light ring (r = 3) before its source could be switched on"}}
		}
	}
	return nil
}
