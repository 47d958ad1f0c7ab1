package wire

import (
	"bytes"
	"context"
	"encoding/gob"
	"fmt"
	"math"
	"sort"
	"strings"

	"nullmark/configs"
	"nullmark/equations"
	"nullmark/extract/pulse"
	"nullmark/extract/result"
	"nullmark/extract/ringing"
	"nullmark/extract/tail"
	"nullmark/grid"
	"nullmark/hyperboloidal"
	"nullmark/source"
)

// Pulses on a hole without spin: every field is evolved on two rungs, and what
// arrives at null infinity, on the horizon and at one radius is measured.
const (
	pulseRatio   = 0.8  // spacing of the finest rung over that of the other
	pulseRadius  = 10.0 // the fixed radius of tails
	pulseSample  = 0.5  // longest time between two samples kept, M
	pulseClimbs  = 2    // how often the finest rung may be made finer
	ringingSpan  = 300.0
	tailSpan     = 700.0 // retarded time after the pulse from which tails are looked for
	narrowest    = 0.25  // pulse.width, M
	widest       = 20.0
	nearestHole  = -60.0 // pulse.centre
	farthestAway = 200.0
)

// pulseProblems are the physics checks of pulse cases.
func pulseProblems(c *configs.Case) []configs.Problem {
	if c.Pulse == nil {
		return nil
	}
	var out []configs.Problem
	p := c.Pulse
	if math.Abs(c.Hole.Spin) > fastestPulse {
		return []configs.Problem{{Key: "hole.spin", Value: c.Hole.Spin,
			Want: fmt.Sprintf("from %g to %g for a pulse: the ringing of faster holes hardly decays, and its frequencies lie too close together to be told apart", -fastestPulse, fastestPulse)}}
	}
	if p.Centre < nearestHole || p.Centre > farthestAway {
		out = append(out, configs.Problem{Key: "pulse.centre", Value: p.Centre,
			Want: fmt.Sprintf("a place in r_* from %g to %g: the grid, whose ends are the horizon and null infinity, is laid out around it", nearestHole, farthestAway)})
	}
	switch {
	case p.Width < narrowest:
		out = append(out, configs.Problem{Key: "pulse.width", Value: p.Width,
			Want: fmt.Sprintf("at least %g: a narrower pulse is not resolved", narrowest)})
	case p.Width > widest:
		out = append(out, configs.Problem{Key: "pulse.width", Value: p.Width,
			Want: fmt.Sprintf("at most %g: a wider pulse reaches the ends of the grid and does not make the hole ring", widest)})
	}
	if len(out) > 0 || c.Numerics.Points == nil {
		return out
	}
	s := newPulseScheme(c)
	if g := s.grid(s.spacing(0)); s.pulse.Check(s.domain.Ri, s.domain.Ro, g.Dx) != nil {
		need := int(math.Ceil((s.domain.So-s.domain.Si)/(s.pulse.CoarsestSpacing()*pulseRatio))) + 1
		out = append(out, configs.Problem{Key: "numerics.points", Value: *c.Numerics.Points,
			Want: fmt.Sprintf("at least %d: the coarser rung must resolve a pulse of width %g", need, p.Width)})
	}
	return out
}

// newPulseScheme makes the choices of a case.
func newPulseScheme(c *configs.Case) *pulseScheme {
	p := source.Pulse{Centre: c.Pulse.Centre, Width: c.Pulse.Width, Compact: c.Pulse.Shape == "compact"}
	switch c.Pulse.Moving {
	case "in":
		p.Moving = source.Ingoing
	case "static":
		p.Moving = source.Static
	default:
		p.Moving = source.Outgoing
	}
	n := choose(c)
	s := &pulseScheme{pulse: p, order: n.order, taylor: n.taylor, courant: n.courant, filter: 16, radius: pulseRadius}
	ri := math.Min(p.Centre-p.Reach(), 0)
	ro := math.Max(p.Centre+p.Reach(), 20)
	s.domain = hyperboloidal.Layers{Si: ri - n.inner, Ri: ri, Ro: ro, So: ro + n.outer, Profile: n.profile}
	// Ten cells a width keep the pulse's own waves exact; the ringing of high l
	// wants more. Below 1e-9 the fundamentals gain nothing from a finer grid, but
	// the first overtone at infinity does: 1.5e-5 at 0.1 M, 5e-6 at 0.068 M.
	l := float64(max(c.Waves.LMax, 2))
	s.dx = math.Min(p.Width/10, 0.2*math.Min(1, 4/l))
	s.dx *= math.Min(1, math.Pow(math.Max(c.Accuracy.Relative, 1e-11)/1e-9, 1.0/6))
	if n.points > 0 {
		s.dx = (s.domain.So - s.domain.Si) / float64(n.points-1)
	}
	every := c.Output.Every
	if !(every > 0) {
		every = pulseSample
	}
	s.stored = int(math.Ceil(every/pulseSample - 1e-9))
	s.sample = every / float64(s.stored)
	s.until = math.Max(p.Centre, 0) + p.Reach() + ringingSpan*math.Max(1, slowestDecay/damping(c))
	if n.until > 0 {
		s.until = n.until
	}
	if isCoupled(c) {
		if err := s.couple(c); err != nil {
			panic("wire: a hole that its checks let pass: " + err.Error())
		}
	}
	return s
}

// wantsTail tells whether the run goes on long enough for tails.
func (s *pulseScheme) wantsTail() bool {
	return s.until-math.Abs(s.pulse.Centre)-s.pulse.Reach() >= tailSpan
}

// pulseFields lists the fields of a case: the master functions by l and parity,
// or the scalar field by l.
func pulseFields(c *configs.Case) []pulseField {
	scalar := c.Waves.Equation == configs.Teukolsky && c.Waves.SpinWeight == 0
	type key struct {
		l      int
		parity equations.Parity
	}
	at := map[key]int{}
	var out []pulseField
	if isCoupled(c) {
		for _, lm := range c.ModeList() {
			out = append(out, pulseField{name: fmt.Sprintf("(%d,%d)", lm[0], lm[1]), modes: [][2]int{lm}})
		}
		return out
	}
	for _, lm := range c.ModeList() {
		k := key{l: lm[0]}
		if !scalar {
			k.parity = equations.EquatorialParity(lm[0], lm[1])
		}
		i, ok := at[k]
		if !ok {
			i = len(out)
			at[k] = i
			f := pulseField{name: fmt.Sprintf("l = %d", k.l)}
			if scalar {
				f.potential = equations.ReggeWheeler{L: k.l, Spin: 0}
			} else {
				f.name += ", " + k.parity.String()
				f.potential = equations.Master(k.parity, k.l)
			}
			out = append(out, f)
		}
		out[i].modes = append(out[i].modes, lm)
	}
	return out
}

// pulseCase is a case under way.
type pulseCase struct {
	c      *configs.Case
	o      Options
	s      *pulseScheme
	fields []pulseField
	meter  *meter
	runs   [][]*pulseRun // by rung, coarsest first; one a block
}

// runPulse evolves the fields of a pulse and measures what they leave.
func runPulse(ctx context.Context, c *configs.Case, o Options) (*result.Bundle, error) {
	clock := startClock()
	r := &pulseCase{c: c, o: o, s: newPulseScheme(c), fields: pulseFields(c), meter: &meter{tell: o.Progress}}
	if err := r.rung(ctx); err != nil {
		return nil, err
	}
	var found [][pulsePlaces]pulse.Outcome
	for climb := 0; ; climb++ {
		if err := r.rung(ctx); err != nil {
			return nil, err
		}
		var err error
		if found, err = r.measure(ctx); err != nil {
			return nil, err
		}
		if climb == pulseClimbs || c.Numerics.Points != nil || !r.climbs(found) {
			break
		}
	}
	b, err := r.assemble(found)
	if err != nil {
		return nil, err
	}
	b.Result.Provenance = clock.stop(o.Workers)
	return b, nil
}

// perBlock is how many fields share a state.
func (r *pulseCase) perBlock() int {
	if r.s.coupled != nil {
		return 1
	}
	return grid.Lanes
}

// blocks cuts the fields into groups of one state.
func (r *pulseCase) blocks() [][2]int {
	var out [][2]int
	for a := 0; a < len(r.fields); a += r.perBlock() {
		out = append(out, [2]int{a, min(a+r.perBlock(), len(r.fields))})
	}
	return out
}

// spacing is that of rung k: rung 1 has the scheme's, rung 0 is coarser.
func (s *pulseScheme) spacing(k int) float64 { return s.dx * math.Pow(pulseRatio, float64(k-1)) }

// rung evolves all fields on the next finer grid.
func (r *pulseCase) rung(ctx context.Context) error {
	blocks := r.blocks()
	dx := r.s.spacing(len(r.runs))
	g := r.s.grid(dx)
	r.meter.stage(fmt.Sprintf("evolving %d fields on %d points", len(r.fields), g.N))
	r.meter.expect(float64(len(blocks)) * float64(r.s.samples()*r.s.steps(g)*g.N))
	runs := make([]*pulseRun, len(blocks))
	err := each(ctx, r.o.Workers, len(blocks), func(ctx context.Context, i int) error {
		var err error
		runs[i], err = keptPulse(r.o.Keep, fmt.Sprintf("pulse-%d-points-block-%d", g.N, i), func() (*pulseRun, error) {
			if r.s.coupled != nil {
				return r.s.evolveCoupled(ctx, r.fields[blocks[i][0]], dx, max(0, 1-len(r.runs)), r.meter.did)
			}
			return r.s.evolve(ctx, r.fields[blocks[i][0]:blocks[i][1]], dx, r.meter.did)
		})
		return err
	})
	r.runs = append(r.runs, runs)
	return err
}

// keptPulse runs compute unless the keeper has its result under the key.
func keptPulse(keep Keeper, key string, compute func() (*pulseRun, error)) (*pulseRun, error) {
	if keep != nil {
		if data, ok := keep.Load(key); ok {
			var p pulseRun
			if gob.NewDecoder(bytes.NewReader(data)).Decode(&p) == nil {
				return &p, nil
			}
		}
	}
	p, err := compute()
	if err != nil || keep == nil {
		return p, err
	}
	var buf bytes.Buffer
	if err := gob.NewEncoder(&buf).Encode(p); err != nil {
		return nil, fmt.Errorf("checkpoint %s: %w", key, err)
	}
	if err := keep.Save(key, buf.Bytes()); err != nil {
		return nil, fmt.Errorf("checkpoint %s: %w", key, err)
	}
	return p, nil
}

// signals are those of field q at a place, back rungs below the finest.
func (r *pulseCase) signals(back, q, place int) pulse.Signal {
	return r.runs[len(r.runs)-1-back][q/r.perBlock()].Signals[q%r.perBlock()][place]
}

// measure analyses every field at every place.
func (r *pulseCase) measure(ctx context.Context) ([][pulsePlaces]pulse.Outcome, error) {
	r.meter.stage("measuring ringing and tails")
	out := make([][pulsePlaces]pulse.Outcome, len(r.fields))
	err := each(ctx, r.o.Workers, len(r.fields)*pulsePlaces, func(_ context.Context, i int) error {
		q, place := i/pulsePlaces, i%pulsePlaces
		lm := r.fields[q].modes[0]
		out[q][place] = pulse.Measure(pulse.Place{
			L: lm[0], M: lm[1], Where: r.where(place), Ratio: pulseRatio,
			Fine: r.signals(0, q, place), Coarse: r.signals(1, q, place),
		}, pulse.Wanted{Ringing: place != atRadius, Tail: r.s.wantsTail(), Expected: r.expected(lm)})
		return nil
	})
	return out, err
}

// expected are the frequencies that give names to what the signal of a mode
// carries where modes mix; nil where they do not.
func (r *pulseCase) expected(lm [2]int) []ringing.Expected {
	if r.s.coupled == nil {
		return nil
	}
	return ringing.Neighbours(r.c.Hole.Spin, r.c.Waves.SpinWeight, lm[0], lm[1], 1)
}

func (r *pulseCase) where(place int) string {
	switch place {
	case atInfinity:
		return "infinity"
	case atHorizon:
		return "horizon"
	}
	return fmt.Sprintf("radius %g", r.s.radius)
}

// fundamentalOf returns the fundamental of an outcome, or nil.
func fundamentalOf(o *pulse.Outcome) *ringing.Mode {
	if o.Fit == nil || len(o.Fit.Modes) == 0 || !o.Fit.Modes[0].Own || o.Fit.Modes[0].N != 0 {
		return nil
	}
	return &o.Fit.Modes[0]
}

// relativeBar is the bar of a frequency over its modulus.
func relativeBar(m *ringing.Mode) float64 {
	return m.Omega.Re.Error / math.Hypot(m.Omega.Re.Value, m.Omega.Im.Value)
}

// climbs tells whether a finer grid can bring a fundamental to what was asked:
// one is not there, and the difference between the rungs is most of its bar.
func (r *pulseCase) climbs(found [][pulsePlaces]pulse.Outcome) bool {
	for q := range found {
		for p := range found[q] {
			o := &found[q][p]
			if m := fundamentalOf(o); m != nil && relativeBar(m) > r.c.Accuracy.Relative && 2*o.Rungs > m.Omega.Re.Error {
				return true
			}
		}
	}
	return false
}

// assemble turns the outcomes into the data of a result.
func (r *pulseCase) assemble(found [][pulsePlaces]pulse.Outcome) (*result.Bundle, error) {
	tree, err := r.c.Tree()
	if err != nil {
		return nil, err
	}
	res := &result.Result{Schema: result.Schema, Title: r.c.Title, Case: tree, Conventions: pulseConventions(),
		Warnings: append([]string{}, Warnings(r.c)...)}
	var names []string
	for _, f := range r.fields {
		names = append(names, f.name)
	}
	for _, runs := range r.runs {
		g := runs[0].Rung
		g.CoreSeconds = 0
		for _, run := range runs {
			g.CoreSeconds += run.Rung.CoreSeconds
		}
		g.Modes = strings.Join(names, "; ")
		res.Rungs = append(res.Rungs, g)
	}
	res.Accuracy = result.Accuracy{Asked: r.c.Accuracy.Relative, Floor: r.c.Accuracy.Floor, Met: true}
	series := r.times()
	type entry struct{ q, l, m int }
	var order []entry
	for q, f := range r.fields {
		for _, lm := range f.modes {
			order = append(order, entry{q, lm[0], lm[1]})
		}
	}
	sort.SliceStable(order, func(i, j int) bool {
		a, b := order[i], order[j]
		return a.l < b.l || a.l == b.l && a.m < b.m
	})
	for _, e := range order {
		for p := range found[e.q] {
			o := &found[e.q][p]
			own := r.fields[e.q].modes[0]
			for _, g := range o.Ringing {
				if g.L != own[0] || g.M != own[1] {
					continue // mixed in from a neighbour: a warning names it
				}
				g.L, g.M = e.l, e.m
				res.Ringing = append(res.Ringing, g)
			}
			if o.Tail != nil {
				g := *o.Tail
				g.L, g.M = e.l, e.m
				res.Tail = append(res.Tail, g)
				series.Decay = append(series.Decay, localIndex(e.l, e.m, r.where(p), o.Index))
			}
			if p != atRadius {
				r.verdict(&res.Accuracy, o, e.l, e.m, r.where(p))
			}
		}
		series.Modes = append(series.Modes, r.modeSeries(e.q, e.l, e.m, found[e.q]))
	}
	for q := range found {
		for p := range found[q] {
			res.Warnings = append(res.Warnings, found[q][p].Warnings...)
		}
	}
	return &result.Bundle{Result: res, Series: series}, nil
}

// verdict holds the fundamental's bar against what was asked.
func (r *pulseCase) verdict(a *result.Accuracy, o *pulse.Outcome, l, m int, where string) {
	f := fundamentalOf(o)
	if f == nil {
		a.Met = false
		return
	}
	rel := relativeBar(f)
	if rel > a.Asked {
		a.Met = false
	}
	if rel > a.Worst.Relative {
		a.Worst = result.Worst{L: l, M: m, What: "fundamental frequency at " + where, Relative: rel}
	}
}

// times lays out the stored series: every stored-th sample.
func (r *pulseCase) times() *result.Series {
	s := &result.Series{Prefix: "psi", HorizonPrefix: "psi"}
	u0, v0 := r.s.domain.Retarded(0), r.s.domain.Advanced(0)
	for k := 0; k <= r.s.samples(); k += r.s.stored {
		t := float64(k) * r.s.sample
		s.U = append(s.U, u0+t)
		s.V = append(s.V, v0+t)
	}
	s.JunkUntil = u0
	return s
}

func (r *pulseCase) modeSeries(q, l, m int, found [pulsePlaces]pulse.Outcome) result.ModeSeries {
	out := result.ModeSeries{L: l, M: m}
	inf, hor := r.signals(0, q, atInfinity), r.signals(0, q, atHorizon)
	coarse := r.signals(1, q, atInfinity)
	for k := 0; k < len(inf.Psi); k += r.s.stored {
		out.Wave = append(out.Wave, inf.Psi[k])
		out.WaveErr = append(out.WaveErr, found[atInfinity].Error[k])
		if tones := found[atInfinity].Tones; tones != nil {
			out.Tones = append(out.Tones, tones[k])
		}
		out.Horizon = append(out.Horizon, hor.Psi[k])
		out.HorizonErr = append(out.HorizonErr, found[atHorizon].Error[k])
		d := inf.Psi[k] - coarse.Psi[k]
		out.Evidence = append(out.Evidence, math.Hypot(real(d), imag(d)))
	}
	return out
}

// localIndex lays out the local power index of a tail.
func localIndex(l, m int, where string, f *tail.Fit) result.LocalIndex {
	out := result.LocalIndex{L: l, M: m, Where: where, Times: f.Local.Times}
	for _, q := range f.Local.Values {
		out.Index = append(out.Index, q.Value)
		out.Error = append(out.Error, q.Error)
	}
	return out
}

// pulseConventions are what a pulse's result states.
func pulseConventions() map[string]string {
	c := conventions()
	for _, k := range []string{"strain", "negative m", "sign of flux", "circular strain", "circular series", "horizon series", "truncation", "orbital frequency"} {
		delete(c, k)
	}
	c["units"] = "G = c = M = 1 (M the hole's mass); the pulse has height 1"
	c["time dependence"] = "e^{-i omega t}: quasinormal frequencies have Im omega < 0"
	c["series"] = "psi_l_m is the evolved field itself: at null infinity against retarded time u, on the horizon against advanced time v"
	c["fields"] = "waves.equation master: the Zerilli function for even l+m, the Regge-Wheeler function for odd; teukolsky with spin_weight 0 and no spin: r times the scalar field. Without spin the field does not depend on m"
	c["tails"] = "|psi| ~ t^-exponent for late t: u at null infinity, v on the horizon, t at a fixed radius"
	c["ringing"] = "n counts from the fundamental (n = 0); bars hold for the real and the imaginary part each"
	return c
}

// planPulse says what runPulse would do.
func planPulse(c *configs.Case) (*Plan, error) {
	s := newPulseScheme(c)
	fields := pulseFields(c)
	p := &Plan{Warnings: Warnings(c)}
	blocks := (len(fields) + grid.Lanes - 1) / grid.Lanes
	lanes, ns := float64(blocks*grid.Lanes), nsPerPoint
	if s.coupled != nil {
		lanes, ns = 0, nsPerCoupledPoint
		for _, lm := range c.ModeList() {
			lanes += float64(s.coupled.angular(lm[0], lm[1], 0))
		}
	}
	var names []string
	for _, f := range fields {
		names = append(names, f.name)
	}
	for k := range 2 {
		g := s.grid(s.spacing(k))
		steps := s.samples() * s.steps(g)
		dt := s.sample / float64(s.steps(g))
		sec := float64(steps) * float64(s.taylor) * float64(g.N) * lanes * ns * 1e-9
		p.CoreSeconds += sec
		p.Rungs = append(p.Rungs, result.Rung{Modes: strings.Join(names, "; "), Points: g.N, Dx: g.Dx, Dt: dt, Order: s.order, Until: float64(steps) * dt, CoreSeconds: sec})
		if k == 1 {
			for _, lm := range c.ModeList() {
				p.Modes = append(p.Modes, PlannedMode{L: lm[0], M: lm[1], Points: g.N, Dx: g.Dx, Dt: dt, Until: s.until, Rung: k})
			}
			p.MemoryBytes = uint64(lanes*float64(g.N)*20*8) + uint64(len(fields)*2*pulsePlaces*2*16*s.samples())
		}
	}
	return p, nil
}
