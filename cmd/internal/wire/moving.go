package wire

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
	"strings"

	"nullmark/configs"
	"nullmark/equations/semi"
	"nullmark/extract/certify"
	"nullmark/extract/flux"
	"nullmark/extract/result"
	"nullmark/grid"
	"nullmark/hyperboloidal"
	"nullmark/source"
	"nullmark/source/worldline"
)

// movingMode is what one mode of a particle in radial motion carries.
type movingMode struct {
	flux [2]averaged // by end, bound orbits
}

// averaged is a mean flux, per sign of m and in flux units, with its relative
// budget and that of the angular momentum.
type averaged struct {
	energy, spin float64
	energyBar    certify.Budget
	spinBar      certify.Budget
}

// boundRun is a bound orbit with radial motion on its way up the ladder.
type boundRun struct {
	*climb
	path    worldline.Worldline
	numbers map[string]float64
	period  float64 // radial period
	power   int
	table   *tablePath // of a tabulated orbit
	cycle   cycle      // of a tabulated orbit
	starts  map[*ladder]junkSeries
	asked   float64
	floor   float64
	largest [2]float64
}

// newEccentric makes the worldline of an eccentric case.
func newEccentric(o *configs.Orbit) (*worldline.Eccentric, error) {
	return worldline.NewEccentric(o.P, o.E, o.RadialPhase, o.Azimuth)
}

func numbersOf(w worldline.Worldline) map[string]float64 {
	out := map[string]float64{}
	for _, n := range w.Numbers() {
		out[n.Name] = n.Value
	}
	return out
}

func newBoundRun(c *configs.Case, n numerics, o Options) (*boundRun, error) {
	w, err := newEccentric(c.Orbit)
	if err != nil {
		return nil, err
	}
	r := &boundRun{climb: newClimb(n, o), path: w, numbers: numbersOf(w), asked: c.Accuracy.Relative, floor: c.Accuracy.Floor}
	r.kind = r
	r.period = r.numbers["period_r"]
	r.power = min(certify.WindowPower(r.asked), 3)
	r.n.placeBetween(hyperboloidal.TortoiseAt(r.numbers["r_min"]), hyperboloidal.TortoiseAt(r.numbers["r_max"]))
	r.n.stopAt()
	r.enter(c.ModeList())
	return r, nil
}

// enter puts modes at the foot of the ladder.
func (r *boundRun) enter(modes [][2]int) {
	for _, lm := range modes {
		m := newLadder(lm[0], lm[1])
		m.mov = &movingMode{}
		m.allow = [2]float64{r.asked, r.asked}
		m.rung = r.startRung(m)
		r.modes = append(r.modes, m)
	}
}

// startRung predicts the rung as if the orbit were circular at its periastron,
// where the field is steepest.
func (r *boundRun) startRung(m *ladder) int {
	if r.n.fixedRung >= 0 {
		return r.n.fixedRung
	}
	k := r.n.rungs - 1
	for ; k < r.n.maxRung; k++ {
		dx := r.n.grid(k).Dx
		e := math.Max(certify.Predict(certify.Infinity, m.l, r.numbers["r_min"], dx), certify.Predict(certify.Horizon, m.l, r.numbers["r_min"], dx))
		if e <= math.Max(r.asked, 4e-12)/2 {
			break
		}
	}
	return k
}

func runBound(ctx context.Context, c *configs.Case, n numerics, o Options) (*result.Bundle, error) {
	clock := startClock()
	r, err := newBoundRun(c, n, o)
	if err != nil {
		return nil, err
	}
	return r.finish(ctx, c, clock)
}

// finish runs all modes and assembles the result.
func (r *boundRun) finish(ctx context.Context, c *configs.Case, clock clock) (*result.Bundle, error) {
	var err error
	if r.table != nil {
		// The end of the run is known, and how the start-up dies away helps to
		// tell it from a slow change of the orbit.
		for _, m := range r.modes {
			m.until = r.n.until
		}
		if r.starts, err = r.junk(ctx); err != nil {
			return nil, err
		}
	}
	// The strongest modes first: they set the scale below which a mode need
	// not be exact.
	all := r.modes
	r.modes = leading(all)
	if err := r.run(ctx); err != nil {
		return nil, err
	}
	for _, m := range r.modes {
		for e, f := range m.mov.flux {
			r.largest[e] = math.Max(r.largest[e], f.energy)
		}
	}
	r.modes = all
	if err := r.run(ctx); err != nil {
		return nil, err
	}
	if r.table == nil {
		if r.starts, err = r.junk(ctx); err != nil {
			return nil, err
		}
	}
	b, err := r.assemble(c, r.starts)
	if err != nil {
		return nil, err
	}
	if r.table != nil && r.table.hasOwn() {
		d, err := r.choice(ctx, r.table, r.n.until, func(s *certify.Samples, m *ladder) float64 {
			e, _, _ := r.mean(s, m, certify.Infinity, r.n.until)
			return e
		})
		if err != nil {
			return nil, err
		}
		tellChoice(c, b.Result, d)
	}
	b.Result.Provenance = clock.stop(r.o.Workers)
	return b, nil
}

// leading picks the modes that carry most of the flux: l = m, or else the first
// four of the list.
func leading(all []*ladder) []*ladder {
	var out []*ladder
	for _, m := range all {
		if m.l == m.m && len(out) < blockModes {
			out = append(out, m)
		}
	}
	if len(out) == 0 {
		out = all[:min(len(all), blockModes)]
	}
	return out
}

// force implements kind.
func (r *boundRun) force(modes []*ladder) func(grid.Grid, source.Kernel, float64) semi.Forcing {
	return movingForce(r.path, r.n.ramp, modes)
}

// movingForce makes the forcing of a particle that stays between the layers.
func movingForce(path worldline.Worldline, ramp source.Ramp, modes []*ladder) func(grid.Grid, source.Kernel, float64) semi.Forcing {
	var list []source.MasterSource
	for _, m := range modes {
		list = append(list, source.NewMasterSource(m.l, m.m))
	}
	t0, t1 := path.Span()
	return func(g grid.Grid, k source.Kernel, dt float64) semi.Forcing {
		return source.NewMoving(path, k, ramp, list, source.Range{
			From: t0, To: t1, Inner: math.Inf(-1), Outer: math.Inf(1),
			GridStart: g.Start, Dx: g.Dx, GridPoints: g.N,
		}, dt)
	}
}

func (r *boundRun) window() float64 { return float64(r.power+1) * r.period }

func (r *boundRun) firstUntil(*ladder) float64 {
	if r.n.until > 0 {
		return r.n.until
	}
	return r.n.on() + r.window() + 2*r.period + 100
}

func (r *boundRun) lastUntil(*ladder) float64 {
	if r.n.until > 0 {
		return r.n.until
	}
	return r.n.on() + r.window() + 12*r.period + 1000
}

func (r *boundRun) stride(*ladder) float64 { return r.period }

// mean is the flux of a mode at one end, per both signs of m.
func (r *boundRun) mean(s *certify.Samples, m *ladder, end certify.End, until float64) (energy, spin float64, err error) {
	a, err := certify.MeanOver(s, end, until, r.period, r.power)
	c := flux.Norm(m.l) / (64 * math.Pi)
	if m.m != 0 {
		c *= 2
	}
	return c * a.Power, c * float64(m.m) * a.Spin, err
}

// settling is the relative change of a mode's flux that the start-up may still
// cause: the last change over one radial period, extrapolated.
func (r *boundRun) settling(s *certify.Samples, m *ladder, end certify.End, until float64) (energy, spin float64, err error) {
	e0, s0, err := r.mean(s, m, end, until)
	if err != nil {
		return 0, 0, err
	}
	e1, s1, err := r.mean(s, m, end, until-r.period)
	if err != nil {
		return 0, 0, err
	}
	e2, s2, err := r.mean(s, m, end, until-2*r.period)
	if err != nil {
		e2, s2 = math.Inf(1), math.Inf(1)
	}
	left := func(a, b, c float64) float64 {
		rho := math.Min(math.Max(math.Abs(a-b)/math.Abs(b-c), 0.3), 0.8)
		if math.IsInf(c, 1) || b == c {
			rho = 0.5
		}
		// A geometric series would leave rho/(1-rho) of the last change, a power
		// t^-n by (n+1)/n more: 1.5 holds for n >= 2.
		return math.Abs(a-b) * math.Max(1.5*rho/(1-rho), 1)
	}
	return left(e0, e1, e2) / e0, left(s0, s1, s2) / math.Max(math.Abs(s0), 1e-300), nil
}

// quiet implements kind.
func (r *boundRun) quiet(s *certify.Samples, m *ladder, until float64, points int) bool {
	for e := range m.allow {
		en, _, err := r.settling(s, m, certify.End(e), until)
		if err != nil {
			return false
		}
		mean, _, _ := r.mean(s, m, certify.End(e), until)
		if en > math.Max(r.allowed(mean, e)/3, 2*certify.RoundOff(points, 1)) {
			return false
		}
	}
	return true
}

// allowed is the relative flux bar that counts as met for a flux of this size.
func (r *boundRun) allowed(energy float64, e int) float64 {
	if r.largest[e] > 0 && energy < r.floor*r.largest[e] {
		return math.Max(r.asked, r.floor*r.largest[e]/energy)
	}
	return r.asked
}

// certify implements kind.
func (r *boundRun) certify(m *ladder) (climb bool, err error) {
	m.met, m.why = true, ""
	for e := range m.allow {
		end := certify.End(e)
		var en, sp [3]float64
		count := 0
		for k := m.rung; k > m.rung-min(r.n.rungs, 3); k-- {
			if en[count], sp[count], err = r.mean(m.runs[k], m, end, m.until); err != nil {
				return false, err
			}
			count++
		}
		far := 2 * certify.Distance(m.runs[m.rung], m.runs[m.rung-1], end, m.until, r.period, r.power)
		te, ts, err := r.settling(m.runs[m.rung], m, end, m.until)
		if err != nil {
			return false, err
		}
		if s, ok := r.starts[m]; ok {
			te, ts = math.Min(te, s.moved[e]), math.Min(ts, s.moved[e])
		}
		round := 2 * certify.RoundOff(m.points[m.rung], math.Max(1, float64(m.m))*r.numbers["omega_phi"])
		path := r.pathError(m)
		if s, ok := r.starts[m]; ok && r.half != nil {
			// Rounded rows make a noise that adds its own power; grids of
			// different spacing see different parts of it.
			path = s.path[e] + far*far
		}
		edges := certify.WindowError(m.runs[m.rung], end, m.until, r.period, r.power)
		bar := func(x [3]float64, settle float64) certify.Budget {
			d := math.Max(math.Abs(x[0]-x[1]), 0.02*far*math.Abs(x[0]))
			if count > 2 {
				d = math.Max(d, certify.Guard*math.Abs(x[1]-x[2]))
			}
			return certify.Budget{
				Discretisation: certify.Leftover(min(r.n.order, r.n.moments))*d/math.Max(math.Abs(x[0]), 1e-300) + path,
				Transient:      settle, RoundOff: round + edges,
			}
		}
		f := &m.mov.flux[e]
		f.energy, f.spin = en[0], sp[0]
		f.energyBar, f.spinBar = bar(en, te), bar(sp, ts)
		if m.m == 0 {
			f.spinBar = certify.Budget{}
		}
		m.allow[e] = r.allowed(f.energy, e)
		if b := f.energyBar.Bar(); !(b <= m.allow[e]) {
			m.met = false
			m.why = strings.TrimPrefix(m.why+fmt.Sprintf("; at %s the %s holds the bar at %.1e", end, f.energyBar.Largest(), b), "; ")
			rest := f.energyBar.Transient + f.energyBar.RoundOff
			if r.rough(m, end) && f.energyBar.Discretisation > rest {
				m.why += ", where the table's rows are too rough for a finer grid to help"
			} else if f.energyBar.Discretisation > 0.3*math.Max(m.allow[e]-rest, 0) && f.energyBar.Discretisation > f.energyBar.RoundOff {
				climb = true
			}
		}
	}
	return climb, nil
}

// pathError is the relative error of a flux that the worldline's own error can
// cause: a flux moves by about 2(l+3) times a relative change of radius, and a
// slip in phase that grows along the window by twice its rate.
func (r *boundRun) pathError(m *ladder) float64 {
	dr, dphi := r.path.Uncertainty()
	return 2*float64(m.l+3)*dr/r.numbers["r_min"] + 2*float64(m.m)*dphi
}

// junk runs every mode once more on the coarsest rung with a later ramp: what
// the switch-on leaves in a sample is where the two differ. (A table also runs
// through every second of its rows.) It returns the
// difference of the strains by mode, on the steps of the coarsest rung.
func (r *climb) junk(ctx context.Context) (map[*ladder]junkSeries, error) {
	r.meter.stage("start-up")
	out := make([]junkSeries, len(r.modes))
	blocks := chunk(len(r.modes))
	later := r.n.ramp
	later.Centre += r.delay()
	variants := []variant{{r.n.ramp, r.worldline()}, {later, r.worldline()}}
	if r.half != nil {
		variants = append(variants, variant{r.n.ramp, r.half})
	}
	for _, b := range blocks {
		for _, m := range r.modes[b[0]:b[1]] {
			r.expect(0, m.until/blockModes*float64(len(variants)))
		}
	}
	err := each(ctx, r.o.Workers, len(blocks), func(ctx context.Context, i int) error {
		group := r.modes[blocks[i][0]:blocks[i][1]]
		until := 0.0
		for _, m := range group {
			until = math.Max(until, m.until)
		}
		runs := make([]*blockRun, len(variants))
		for j, v := range variants {
			var list []blockMode
			for _, m := range group {
				list = append(list, m.blockMode)
			}
			force := movingForce(v.path, v.ramp, group)
			b, err := kept(r.o.Keep, fmt.Sprintf("start-up-%d-%d", i, j), func() (*blockRun, error) {
				return r.n.evolveBlock(ctx, list, force, 0, until, nil, r.meter.did)
			})
			if err != nil {
				return err
			}
			runs[j] = b
		}
		for q := range group {
			s := junkSeries{dt: runs[0].Dt}
			if r.half != nil {
				s.full, s.thin = &runs[0].Samples[q], &runs[2].Samples[q]
			}
			if k, ok := r.kind.(interface {
				moved(m *ladder, runs []*certify.Samples) (start, path [2]float64)
			}); ok {
				var same []*certify.Samples
				for _, b := range runs {
					same = append(same, &b.Samples[q])
				}
				s.moved, s.path = k.moved(group[q], same)
			}
			for e := range s.psi {
				a, b := runs[0].Samples[q].Psi[e], runs[1].Samples[q].Psi[e]
				d := make([]float64, len(a))
				for k := range a {
					d[k] = cmplx.Abs(a[k] - b[k])
					if float64(k)*s.dt > r.n.on()+r.n.domain.So {
						s.peak[e] = math.Max(s.peak[e], cmplx.Abs(a[k]))
					}
				}
				// What has died away does not come back: the envelope falls.
				for k := len(d) - 2; k >= 0; k-- {
					d[k] = math.Max(d[k], d[k+1])
				}
				s.psi[e] = d
				pa, pb := runs[0].Samples[q].Pi[e], runs[1].Samples[q].Pi[e]
				rest := make([]float64, len(pa)+1)
				for k := len(pa) - 1; k >= 0; k-- {
					x := cmplx.Abs(pa[k] - pb[k])
					rest[k] = rest[k+1] + s.dt*x*x
					if float64(k)*s.dt > r.n.on()+r.n.domain.So {
						s.sent[e] += s.dt * real(pa[k]*cmplx.Conj(pa[k]))
					}
				}
				s.rest[e] = rest
			}
			out[blocks[i][0]+q] = s
		}
		return nil
	})
	if err != nil {
		return nil, err
	}
	by := map[*ladder]junkSeries{}
	for i, m := range r.modes {
		by[m] = out[i]
	}
	return by, nil
}

// delay is how much later the second switch-on comes.
func (r *climb) delay() float64 { return 25 }

// junkSeries is the falling envelope of what a later switch-on changes in Psi.
type junkSeries struct {
	dt   float64
	psi  [2][]float64
	rest [2][]float64 // integral of |difference of Psi_tau|^2 from each step on
	peak [2]float64   // of |Psi| after the switch-on, on the coarsest rung
	sent [2]float64   // integral of |Psi_tau|^2 after the switch-on

	moved [2]float64 // what the start-up may change in a table's averaged flux, relative
	path  [2]float64 // what the rows' rounding and spacing may change in it, relative

	full, thin *certify.Samples // through all rows and every second, on the coarsest rung
}

// at is the envelope at slice tau.
func (j junkSeries) at(e int, tau float64) float64 {
	k := max(0, min(int(tau/j.dt)-1, len(j.psi[e])-1))
	return j.psi[e][k]
}

// energy bounds what the residue from slice tau on adds to the integral of
// |Psi_tau|^2, given that integral (Cauchy–Schwarz).
func (j junkSeries) energy(e int, tau, power float64) float64 {
	k := max(0, min(int(tau/j.dt)-1, len(j.rest[e])-1))
	return 2*math.Sqrt(power*j.rest[e][k]) + j.rest[e][k]
}

// worldline is the path of the particle.
func (r *climb) worldline() worldline.Worldline {
	if p, ok := r.kind.(interface{ worldline() worldline.Worldline }); ok {
		return p.worldline()
	}
	panic("wire: this kind of orbit has no worldline")
}

// variant is one of the runs on the coarsest rung that are compared.
type variant struct {
	ramp source.Ramp
	path worldline.Worldline
}

func (r *boundRun) worldline() worldline.Worldline { return r.path }

// assemble turns the finished ladders into a result.
func (r *boundRun) assemble(c *configs.Case, junk map[*ladder]junkSeries) (*result.Bundle, error) {
	tree, err := c.Tree()
	if err != nil {
		return nil, err
	}
	res := &result.Result{
		Schema: result.Schema, Title: c.Title, Case: tree, Conventions: conventions(),
		Orbit: r.describe(), Warnings: append(append([]string{}, Warnings(c)...), r.notes()...),
	}
	delete(res.Conventions, "circular strain")
	delete(res.Conventions, "circular series")
	delete(res.Conventions, "orbital frequency")
	res.Conventions["averages"] = fmt.Sprintf("fluxes are averages per coordinate time over whole radial periods, window sin^%d over %d of them", 2*r.power, r.power+1)
	if r.table != nil {
		what := "radial periods"
		if !r.cycle.radial {
			what = "turns in azimuth"
		}
		length := float64(r.power+1) * r.period
		d := r.n.domain
		u, v := d.Retarded(r.n.until)+r.origin, d.Advanced(r.n.until)+r.origin
		res.Conventions["averages"] = fmt.Sprintf("fluxes are averages per coordinate time over %d whole %s of %.8g M, window sin^%d, at infinity from u = %.8g to %.8g, at the horizon from v = %.8g to %.8g",
			r.power+1, what, r.period, 2*r.power, u-length, u, v-length, v)
	}
	res.Conventions["m = 0"] = "strain of m = 0 has an arbitrary constant (memory): only its changes mean something; its flux counts once"
	index := r.rungList(res)
	for _, m := range r.modes {
		res.Modes = append(res.Modes, r.entry(m, index[m.rung]))
	}
	sumModes(c, res, rate)
	verdict(c, res)
	r.tellDrift(res)
	_, dphi := r.path.Uncertainty()
	s := r.seriesOf(c, r.path, junk, dphi)
	if s != nil {
		s.JunkUntil = quietFrom(s)
	}
	return &result.Bundle{Result: res, Series: s}, nil
}

func (r *boundRun) entry(m *ladder, rung int) result.Mode {
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
	return result.Mode{
		L: m.l, M: m.m, Parity: m.parity.String(), Measure: rate, Counts: counts,
		Infinity: at(f[certify.Infinity]), Horizon: at(f[certify.Horizon]),
		Met: m.met, Why: m.why, Rung: rung,
		Budget: map[string]float64{
			"discretisation": f[0].energyBar.Discretisation, "transient": f[0].energyBar.Transient, "round-off": f[0].energyBar.RoundOff,
			"horizon discretisation": f[1].energyBar.Discretisation, "horizon transient": f[1].energyBar.Transient,
		},
	}
}

// runningMax is the largest value within reach of each sample.
func runningMax(x []float64, reach int) []float64 {
	out := make([]float64, len(x))
	for i := range x {
		for j := max(0, i-reach); j <= min(len(x)-1, i+reach); j++ {
			out[i] = math.Max(out[i], x[j])
		}
	}
	return out
}

// quietFrom is the retarded time from which the bars of every mode that counts
// stay below a thousandth of its peak.
func quietFrom(s *result.Series) float64 {
	var strongest float64
	peaks := make([]float64, len(s.Modes))
	for i, m := range s.Modes {
		for _, w := range m.Wave[len(m.Wave)/2:] {
			peaks[i] = math.Max(peaks[i], cmplx.Abs(w))
		}
		strongest = math.Max(strongest, peaks[i])
	}
	last := 0
	for i, m := range s.Modes {
		if peaks[i] < 1e-4*strongest {
			continue
		}
		for k := len(m.WaveErr) - 1; k >= last; k-- {
			if m.WaveErr[k] > 1e-3*peaks[i] {
				last = k
				break
			}
		}
	}
	if len(s.U) == 0 {
		return 0
	}
	return s.U[min(last+1, len(s.U)-1)]
}
