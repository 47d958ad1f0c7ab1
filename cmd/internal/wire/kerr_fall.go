package wire

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/configs"
	"nullmark/equations/coupled"
	"nullmark/extract/certify"
	"nullmark/extract/flux"
	"nullmark/extract/kerr"
	"nullmark/extract/result"
	"nullmark/extract/strain"
	"nullmark/hyperboloidal"
	"nullmark/source"
	"nullmark/source/worldline"
)

// farStart is where a fall from infinity is begun, M.
const farStart = 100.0

// kerrPath is an equatorial geodesic into the hole.
type kerrPath struct {
	energy, angmom, from float64
}

// kerrFallOf reads it from a case: energy 0 means at rest in r, the constants of
// the innermost stable orbit (to twelve digits) mean exactly that geodesic.
func kerrFallOf(c *configs.Case, h hyperboloidal.Kerr) (kerrPath, []configs.Problem) {
	o := c.Orbit
	bad := func(key string, v any, want string) (kerrPath, []configs.Problem) {
		return kerrPath{}, []configs.Problem{{Key: "orbit." + key, Value: v, Want: want}}
	}
	p := kerrPath{energy: o.Energy, angmom: o.AngularMomentum, from: o.From}
	if math.IsInf(p.from, 1) {
		if !(p.energy >= 1) {
			return bad("energy", p.energy, "an energy of at least 1 for a fall from infinity (a bound particle starts at a finite from)")
		}
		p.from = farStart
	}
	rp, a := h.OuterHorizon(), h.Spin()
	if !(p.from > rp+0.5) || p.from > 300 {
		return bad("from", p.from, fmt.Sprintf("from %.6g (0.5 outside the horizon of this hole) to 300", rp+0.5))
	}
	if p.energy == 0 {
		r := p.from
		k, d := r*r+a*a, r*r-2*r+a*a
		big := k*k - a*a*d
		p.energy = 2*a*r*p.angmom/big + math.Sqrt(r*r*d/big*(1+r*r*p.angmom*p.angmom/big))
	}
	isco := h.ISCO()
	if k, _, err := worldline.CircularKerr(h, isco); err == nil && math.Abs(p.energy-k.E) < 1e-12 && math.Abs(p.angmom-k.L) < 1e-12 {
		p.energy, p.angmom = k.E, k.L
		if !(p.from < isco) {
			return bad("from", p.from, fmt.Sprintf("a start radius inside %.6g for the plunge that leaves the innermost stable circular orbit", isco))
		}
	}
	f := worldline.NewKerrFall(hyperboloidal.KerrLayers{Hole: h}, p.energy, p.angmom)
	const parts = 4000
	for i := 1; i < parts; i++ {
		if r := p.from + (rp-p.from)*float64(i)/parts; f.RadialPotential(r) <= 0 {
			return bad("angular_momentum", p.angmom, fmt.Sprintf("an angular momentum that lets a particle of this energy fall from %.6g into this hole (with this one it turns near r = %.4g)", p.from, r))
		}
	}
	if f.RadialPotential(p.from) < -1e-12*math.Pow(p.energy*(p.from*p.from+a*a), 2) {
		return bad("energy", p.energy, "a larger energy: with this angular momentum the particle cannot be at from (or leave energy out to start at rest)")
	}
	return p, nil
}

// kerrFall is a particle that falls through the horizon of a Kerr hole.
type kerrFall struct {
	*kerrClimb
	path    kerrPath
	markers map[string]float64
	event   float64 // time of the peak orbital frequency or of the light ring
	ends    float64 // slice time
	after   float64 // retarded time from which numbers count
	whole   bool
	ms      []*kerrBurst
}

// kerrBurst is one m of it.
type kerrBurst struct {
	m, n, last, asked int
	rung              int
	runs              map[int]*blockRun
	start             *blockRun // rung 0 with another switch-on
	waves             []kerrWave
	parts             []*result.Flux
	sum               *result.Flux
	met, settled      bool
	why               string
}

// kerrWave is one l: strain and rate on the times of the run, with their bars.
type kerrWave struct {
	h, rate           []complex128
	coarse            []complex128
	bar, slide, apart []float64
	flux              *result.Flux
	peak              float64
}

func newKerrFall(c *configs.Case, o Options) (*kerrFall, error) {
	h, err := hyperboloidal.NewKerr(c.Hole.Spin)
	if err != nil {
		return nil, err
	}
	r := &kerrFall{kerrClimb: newKerrClimb(c, o, h), whole: len(c.Waves.Modes) == 0}
	var bad []configs.Problem
	if r.path, bad = kerrFallOf(c, h); bad != nil {
		return nil, fmt.Errorf("%s is %v, but must be %s", bad[0].Key, bad[0].Value, bad[0].Want)
	}
	// 0.25 gives 1e-9 of the peak.
	r.n = chooseKerr(c, h, 3, 3, 0)
	r.n.rungs, r.n.plunge = 2, true
	finest := math.Min(0.26*math.Pow(math.Max(r.asked, 1e-10)/1e-8, 1./12), 0.4)
	if r.n.fixed {
		finest = r.n.coarsest * certify.Ratio
	}
	r.n.coarsest, r.n.maxRung = finest/certify.Ratio, 3
	r.n.domain = coupled.Fall(h, r.path.from, r.n.coarsest)
	if err := r.mark(); err != nil {
		return nil, err
	}
	centre := math.Min(0.35*r.event, 400)
	r.n.domain.Ramp = source.Ramp{Centre: centre, Width: centre / 4.7}
	// The ringing must have died away where the integrals begin: the slowest
	// mode's damping is at least 0.35 of the surface gravity at all spins of use.
	damping := 0.35 * h.Eccentre() / (2 * h.OuterHorizon())
	r.ends = r.markers[worldline.MarkHorizon] + 33/damping + r.n.domain.Layers.So
	if c.Span.Until != nil {
		r.ends = *c.Span.Until + r.n.domain.Layers.So
	}
	ms, top := kerrMs(c, false)
	for _, m := range ms {
		if m >= 0 {
			r.ms = append(r.ms, &kerrBurst{m: m, asked: top[m], last: max(top[m], lowest(m)+2), rung: 1, runs: map[int]*blockRun{}})
		}
	}
	return r, nil
}

// mark samples the path for the times that matter.
func (r *kerrFall) mark() error {
	g := r.n.rung(1, 2, 2)
	h, a := r.hole, r.hole.Spin()
	track, err := coupled.FallTrack(g, r.path.energy, r.path.angmom, r.path.from, 0, true, 1e5)
	if err != nil {
		return err
	}
	r.markers = map[string]float64{}
	isco, ring := h.ISCO(), h.LightRing()
	top, before := 0.0, math.Inf(1)
	for i, k := range track.States {
		y := k.R - h.OuterHorizon()
		if y <= 0 {
			break
		}
		// In the layer below slices are those of v = tau + rho = t + r_*.
		rs := h.Tortoise(y)
		t := track.Start + float64(i)*track.Step + k.Rho - rs
		if rs < worldline.HorizonApproach {
			r.markers[worldline.MarkHorizon] = t
			break
		}
		p, d := r.path.energy*(k.R*k.R+a*a)-a*r.path.angmom, k.R*k.R-2*k.R+a*a
		om := (r.path.angmom - a*r.path.energy + a*p/d) / ((k.R*k.R+a*a)*p/d + a*(r.path.angmom-a*r.path.energy))
		if math.Abs(om) > top {
			top = math.Abs(om)
			r.markers[worldline.MarkPeakOmega] = t
		}
		for name, at := range map[string]float64{worldline.MarkISCO: isco, worldline.MarkLightRing: ring} {
			if before > at && k.R <= at && i > 0 {
				r.markers[name] = t
			}
		}
		before = k.R
	}
	if _, ok := r.markers[worldline.MarkHorizon]; !ok {
		return fmt.Errorf("the fall from %.6g does not reach the horizon within 1e5 M: start further in or with more energy", r.path.from)
	}
	r.event = r.markers[worldline.MarkHorizon]
	if t, ok := r.markers[worldline.MarkLightRing]; ok {
		r.event = t
	}
	return nil
}

func runKerrFall(ctx context.Context, c *configs.Case, o Options) (*result.Bundle, error) {
	clock := startClock()
	r, err := newKerrFall(c, o)
	if err != nil {
		return nil, err
	}
	r.meter.stage(fmt.Sprintf("%d azimuthal numbers", len(r.ms)))
	if err := each(ctx, o.Workers, len(r.ms), func(ctx context.Context, i int) error { return r.look(ctx, r.ms[i]) }); err != nil {
		return nil, err
	}
	r.after = r.quietAt()
	if err := each(ctx, o.Workers, len(r.ms), func(ctx context.Context, i int) error { return r.climb(ctx, r.ms[i]) }); err != nil {
		return nil, err
	}
	b, err := r.assemble(c)
	if err != nil {
		return nil, err
	}
	b.Result.Provenance = clock.stop(o.Workers)
	return b, nil
}

func (r *kerrFall) run(ctx context.Context, key string, t *kerrBurst, k, angular int, ramp source.Ramp) (*blockRun, error) {
	g := r.n.rung(k, t.m, angular)
	g.Ramp = ramp
	start := func() (*coupled.Run, error) {
		track, err := coupled.FallTrack(g, r.path.energy, r.path.angmom, r.path.from, 0, true, r.ends)
		if err != nil {
			return nil, err
		}
		return coupled.Moving(coupled.Equation{S: -2, M: t.m}, g, track)
	}
	return r.evolve(ctx, fmt.Sprintf("fall-%s-m%d-rung%d-l%d", key, t.m, k, angular), t.m, k, g, r.ends, start, nil)
}

// look runs rung 0 with two switch-ons: what differs is what a switch-on leaves.
func (r *kerrFall) look(ctx context.Context, t *kerrBurst) (err error) {
	t.n = max(t.last-lowest(t.m)+1+1, 4)
	if r.hole.Spin() != 0 {
		t.n = max(t.n, coupled.Angular(r.hole.Spin(), 0.3*float64(max(t.m, 1)), t.m, t.last, r.asked))
	}
	if r.n.angular > 0 {
		t.n = r.n.angular
	}
	ramp := r.n.domain.Ramp
	if t.runs[0], err = r.run(ctx, "tone", t, 0, t.n-1, ramp); err != nil {
		return err
	}
	ramp.Centre, ramp.Width = 0.85*ramp.Centre, 0.85*ramp.Width
	t.start, err = r.run(ctx, "other-ramp", t, 0, t.n-1, ramp)
	return err
}

// label turns sample k of a run into retarded time.
func (r *kerrFall) label(b *blockRun, k int) float64 {
	return float64(k)*b.Dt - r.n.domain.Layers.So
}

// first is the earliest retarded time that could count, latest the last one that
// should.
func (r *kerrFall) first() (first, latest float64) {
	ramp := r.n.domain.Ramp
	hi := r.hole.Tortoise(r.path.from - r.hole.OuterHorizon())
	first = ramp.Centre + 2.5*ramp.Width - hi + 20
	return first, math.Max(first, r.event-60)
}

// quietAt is when two switch-ons have come to agree in the strongest modes.
func (r *kerrFall) quietAt() float64 {
	first, latest := r.first()
	after := first
	for _, t := range r.ms {
		if t.m == 0 && len(r.ms) > 1 {
			continue
		}
		a, b := t.runs[0].Samples[0].Psi[certify.Infinity], t.start.Samples[0].Psi[certify.Infinity]
		peak := 0.0
		for _, z := range a[int((latest+r.n.domain.Layers.So)/t.runs[0].Dt):] {
			peak = math.Max(peak, cmplx.Abs(z))
		}
		for k := len(a) - 1; k >= 0; k-- {
			if cmplx.Abs(a[k]-b[k]) > r.asked*peak/3 {
				after = math.Max(after, r.label(t.runs[0], k))
				break
			}
		}
	}
	return math.Min(after, latest)
}

func (r *kerrFall) climb(ctx context.Context, t *kerrBurst) (err error) {
	for k := 1; ; k++ {
		t.rung = k
		if t.runs[k], err = r.run(ctx, "tone", t, k, t.n, r.n.domain.Ramp); err != nil {
			return err
		}
		if !r.certify(t) || r.n.fixed || k >= r.n.maxRung {
			return nil
		}
		t.n++
	}
}

// certify integrates every l to strain and rate and sets the bars; it says whether
// a finer rung would help.
func (r *kerrFall) certify(t *kerrBurst) (climb bool) {
	t.waves, t.parts, t.met, t.why = nil, nil, true, ""
	fine, coarse := t.runs[t.rung], t.runs[t.rung-1]
	so := r.n.domain.Layers.So
	// the strain of a run, from after on, at the times of the finest run
	k0 := int(math.Ceil((r.after + so) / fine.Dt))
	at := make([]float64, 0, len(fine.Samples[0].Psi[0])-k0)
	last := math.Min(coarse.Samples[0].Until(), math.Min(t.start.Samples[0].Until(), t.runs[0].Samples[0].Until()))
	for k := k0; k < len(fine.Samples[0].Psi[0]) && float64(k)*fine.Dt <= last; k++ {
		at = append(at, float64(k)*fine.Dt)
	}
	of := func(b *blockRun, i int) []complex128 {
		return strain.Resample(b.Samples[i].Psi[certify.Infinity], 0, b.Dt, at)
	}
	both := 2.0
	if t.m == 0 {
		both = 1
	}
	var disc, worst float64
	for i := range min(t.last-lowest(t.m)+1, len(coarse.Samples), len(t.start.Samples)) {
		var w kerrWave
		var drift, slide []float64
		w.h, w.rate, drift, slide = kerr.Rundown(of(fine, i), fine.Dt, 0.05)
		hc, rc, _, _ := kerr.Rundown(of(coarse, i), fine.Dt, 0.05)
		ha, ra, _, _ := kerr.Rundown(of(t.runs[0], i), fine.Dt, 0.05)
		hb, rb, _, _ := kerr.Rundown(of(t.start, i), fine.Dt, 0.05)
		w.coarse = hc
		n := len(w.h)
		rates := make([]float64, n)
		w.apart = make([]float64, n)
		for k := range w.h {
			w.apart[k] = cmplx.Abs(w.h[k] - hc[k])
			rates[k] = cmplx.Abs(w.rate[k] - rc[k])
			w.peak = math.Max(w.peak, cmplx.Abs(w.h[k]))
		}
		reach := int(12 / fine.Dt)
		near, nearR := runningMax(w.apart, reach), runningMax(rates, reach)
		w.bar, w.slide = make([]float64, n), make([]float64, n)
		junk, junkR := 0.0, 0.0
		for k := n - 1; k >= 0; k-- { // what a switch-on leaves only falls
			junk, junkR = math.Max(junk, cmplx.Abs(ha[k]-hb[k])), math.Max(junkR, cmplx.Abs(ra[k]-rb[k]))
			w.bar[k] = kerr.Remainder*near[k] + junk + drift[k]
			w.slide[k] = kerr.Remainder*nearR[k] + junkR + slide[k]
			worst = math.Max(worst, w.bar[k]/w.peak)
			disc = math.Max(disc, kerr.Remainder*near[k]/w.peak)
		}
		var e, de, l, dl float64
		for k := range w.h {
			a, b := cmplx.Abs(w.rate[k]), cmplx.Abs(w.h[k])
			e += a * a
			de += 2*a*w.slide[k] + w.slide[k]*w.slide[k]
			l += imag(w.h[k] * cmplx.Conj(w.rate[k]))
			dl += a*w.bar[k] + b*w.slide[k] + w.bar[k]*w.slide[k]
		}
		f := both * fine.Dt / (16 * math.Pi)
		w.flux = &result.Flux{Energy: result.Q{Value: f * e, Error: f * de},
			AngularMomentum: result.Q{Value: f * float64(t.m) * l, Error: f * float64(t.m) * dl}}
		t.waves = append(t.waves, w)
		t.parts = append(t.parts, w.flux)
	}
	t.sum = flux.Sum(t.parts...)
	tail := math.Min(kerrTail(t.parts), 1)
	t.sum.Energy.Error += tail * t.sum.Energy.Value
	t.sum.AngularMomentum.Error += tail * math.Abs(t.sum.AngularMomentum.Value)
	t.settled = settled(t.parts, r.asked)
	if !(worst <= r.asked) {
		t.met = false
		what := "start-up or the drift of the integration"
		if disc > worst/2 {
			what, climb = "discretisation", true
		}
		t.why = fmt.Sprintf("the %s holds the bar of the strain at %.1e of its peak", what, worst)
	}
	return climb
}
