package wire

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
	"sort"
	"strings"

	"nullmark/configs"
	"nullmark/equations"
	"nullmark/extract/certify"
	"nullmark/extract/result"
	"nullmark/hyperboloidal"
	"nullmark/source"
)

// circularOrbit is what follows from the radius of a circular geodesic.
type circularOrbit struct {
	r0, omega, energy, angmom, rstar float64
}

func newCircularOrbit(r0 float64) circularOrbit {
	omega := math.Pow(r0, -1.5)
	ut := 1 / math.Sqrt(1-3/r0)
	return circularOrbit{
		r0: r0, omega: omega, energy: (1 - 2/r0) * ut, angmom: r0 * r0 * omega * ut,
		rstar: hyperboloidal.TortoiseAt(r0),
	}
}

func (o circularOrbit) mode(l, m int, on float64) circularMode {
	src := source.NewMasterSource(l, m)
	f, g := src.Amplitudes(&source.Motion{R: o.r0, Y: o.r0 - 2, E: o.energy, L: o.angmom})
	return circularMode{
		tone:   certify.Tone{L: l, M: m, Omega: float64(m) * o.omega, On: on},
		parity: src.Parity, f: real(f), g: real(g),
	}
}

// ladder is the state of one mode on its way up the rungs.
type ladder struct {
	mode   circularMode
	rung   int // finest rung asked for
	until  float64
	scout  [2]float64 // |amplitude| of the scouting run by end
	allow  [2]float64 // relative flux bar that counts as met, by end
	power  int
	runs   map[int]*certify.Samples // by rung
	points map[int]int
	bars   [2]certify.Budget
	z      [2]complex128
	met    bool
	why    string
	done   bool
}

// circularRun is a whole case under way.
type circularRun struct {
	n       numerics
	orbit   circularOrbit
	asked   float64
	floor   float64
	o       Options
	meter   *meter
	modes   []*ladder
	rungs   map[int]*result.Rung
	members map[int]map[string]bool
	cost    float64
}

func newCircularRun(c *configs.Case, n numerics, o Options) *circularRun {
	r := &circularRun{
		n: n, orbit: newCircularOrbit(c.Orbit.Radius), asked: c.Accuracy.Relative, floor: c.Accuracy.Floor, o: o,
		meter: &meter{tell: o.Progress}, rungs: map[int]*result.Rung{}, members: map[int]map[string]bool{},
	}
	r.n.place(r.orbit.rstar)
	for _, lm := range c.ModeList() {
		if lm[1] == 0 {
			continue
		}
		r.modes = append(r.modes, &ladder{
			mode: r.orbit.mode(lm[0], lm[1], r.n.on()), power: certify.WindowPower(r.asked),
			runs: map[int]*certify.Samples{}, points: map[int]int{},
		})
	}
	return r
}

// runCircular evolves all modes of a circular orbit on Schwarzschild.
func runCircular(ctx context.Context, c *configs.Case, n numerics, o Options) (*result.Bundle, error) {
	clock := startClock()
	r := newCircularRun(c, n, o)
	if err := r.scouting(ctx); err != nil {
		return nil, err
	}
	for round := 0; ; round++ {
		pending := r.pending()
		if len(pending) == 0 {
			break
		}
		if err := r.round(ctx, round, pending); err != nil {
			return nil, err
		}
	}
	b, err := r.assemble(c)
	if err != nil {
		return nil, err
	}
	b.Result.Provenance = clock.stop(o.Workers)
	return b, nil
}

// scouting runs every mode once on the coarsest rung, for the size of its
// amplitudes: modes that are negligible beside the largest need not be exact.
func (r *circularRun) scouting(ctx context.Context) error {
	r.meter.stage("scouting")
	blocks := chunk(len(r.modes))
	until := func(a, b int) float64 {
		t := 0.0
		for _, m := range r.modes[a:b] {
			t = math.Max(t, certify.Earliest(m.mode.tone, 1)+60)
		}
		return t
	}
	for _, b := range blocks {
		r.expect(0, until(b[0], b[1]))
	}
	err := each(ctx, r.o.Workers, len(blocks), func(ctx context.Context, i int) error {
		a, b := blocks[i][0], blocks[i][1]
		run, err := r.block(ctx, fmt.Sprintf("scout-%d", i), r.modes[a:b], 0, until(a, b), nil)
		if err != nil {
			return err
		}
		for q, m := range r.modes[a:b] {
			for e := range m.scout {
				rd, err := certify.Read(&run.Samples[q], certify.End(e), m.mode.tone, run.Until, 1)
				if err != nil {
					return err
				}
				m.scout[e] = cmplx.Abs(rd.Z)
			}
		}
		return nil
	})
	if err != nil {
		return err
	}
	var largest [2]float64
	for _, m := range r.modes {
		for e := range largest {
			largest[e] = math.Max(largest[e], m.size(e))
		}
	}
	for _, m := range r.modes {
		for e := range m.allow {
			m.allow[e] = math.Max(r.asked, r.floor*largest[e]/m.size(e))
		}
		m.rung = r.startRung(m)
	}
	return nil
}

// size is the flux of the scouting amplitude at an end, up to a common factor.
func (m *ladder) size(e int) float64 {
	l := float64(m.mode.tone.L)
	return (l - 1) * l * (l + 1) * (l + 2) * m.mode.tone.Omega * m.mode.tone.Omega * m.scout[e] * m.scout[e]
}

// startRung is the coarsest rung whose predicted discretisation bar is half of
// what is allowed at both ends.
func (r *circularRun) startRung(m *ladder) int {
	if r.n.fixedRung >= 0 {
		return r.n.fixedRung
	}
	k := r.n.rungs - 1
	for ; k < r.n.maxRung; k++ {
		dx := r.n.grid(k).Dx
		ok := true
		for e := range m.allow {
			// Below 2e-12 round-off rules whatever the grid.
			ok = ok && certify.Predict(certify.End(e), m.mode.tone.L, r.orbit.r0, dx) <= math.Max(m.allow[e], 2e-12)/2
		}
		if ok {
			break
		}
	}
	return k
}

// firstUntil is where the search for a quiet window begins.
func (r *circularRun) firstUntil(m *ladder) float64 {
	if r.n.until > 0 {
		return r.n.until
	}
	return certify.Earliest(m.mode.tone, m.power) + 60
}

// lastUntil is where it is given up.
func (r *circularRun) lastUntil(m *ladder) float64 {
	if r.n.until > 0 {
		return r.n.until
	}
	p := m.mode.tone.Period()
	return math.Max(certify.Earliest(m.mode.tone, m.power)+12*p, 3000)
}

// more says to when a block must go on so that every mode's transients are a
// third of what is allowed, or its present end when they are.
func (r *circularRun) more(modes []*ladder, points int) func([]certify.Samples, float64) float64 {
	return func(s []certify.Samples, until float64) float64 {
		next := until
		for q, m := range modes {
			if until >= r.lastUntil(m) {
				continue
			}
			floor := 2 * certify.RoundOff(points, m.mode.tone.Omega)
			for e := range m.allow {
				rd, err := certify.Read(&s[q], certify.End(e), m.mode.tone, until, m.power)
				if err != nil || 2*rd.Transient(certify.End(e), m.mode.tone, until) > math.Max(m.allow[e]/3, floor) {
					next = math.Max(next, math.Min(until+math.Max(40, 0.3*m.mode.tone.Period()), r.lastUntil(m)))
				}
			}
		}
		return next
	}
}

// pending lists the modes that still want a rung, ordered so that blocks are
// filled alike on any machine.
func (r *circularRun) pending() []*ladder {
	var p []*ladder
	for _, m := range r.modes {
		if !m.done {
			p = append(p, m)
		}
	}
	sort.SliceStable(p, func(i, j int) bool {
		a, b := p[i], p[j]
		if a.rung != b.rung {
			return a.rung < b.rung
		}
		if a.mode.tone.M != b.mode.tone.M {
			return a.mode.tone.M < b.mode.tone.M
		}
		return a.mode.tone.L < b.mode.tone.L
	})
	return p
}

// round runs the wanted rung of every pending mode, with the coarser ones that
// its bar needs, and certifies.
func (r *circularRun) round(ctx context.Context, round int, pending []*ladder) error {
	r.meter.stage(fmt.Sprintf("round %d, %d modes", round+1, len(pending)))
	var blocks [][]*ladder
	for i := 0; i < len(pending); {
		j := i
		for j < len(pending) && j-i < blockModes && pending[j].rung == pending[i].rung {
			j++
		}
		blocks = append(blocks, pending[i:j])
		i = j
	}
	for _, b := range blocks {
		t := 0.0
		for _, m := range b {
			t = math.Max(t, math.Max(m.until, r.firstUntil(m)))
		}
		for k := b[0].rung; k > b[0].rung-r.n.rungs && (round == 0 || k == b[0].rung); k-- {
			r.expect(k, t)
		}
	}
	return each(ctx, r.o.Workers, len(blocks), func(ctx context.Context, i int) error {
		b := blocks[i]
		k := b[0].rung
		name := fmt.Sprintf("round-%d-block-%d", round, i)
		until := 0.0
		for _, m := range b {
			if round == 0 {
				until = math.Max(until, r.firstUntil(m))
			} else {
				until = math.Max(until, m.until)
			}
		}
		var more func([]certify.Samples, float64) float64
		if round == 0 && r.n.until == 0 {
			more = r.more(b, r.n.grid(k).N)
		}
		fine, err := r.block(ctx, fmt.Sprintf("%s-rung-%d", name, k), b, k, until, more)
		if err != nil {
			return err
		}
		for q, m := range b {
			m.runs[k], m.points[k] = &fine.Samples[q], fine.Points
			if round == 0 {
				m.until = fine.Until
			}
		}
		if round == 0 {
			for j := k - 1; j > k-r.n.rungs; j-- {
				coarse, err := r.block(ctx, fmt.Sprintf("%s-rung-%d", name, j), b, j, fine.Until, nil)
				if err != nil {
					return err
				}
				for q, m := range b {
					m.runs[j], m.points[j] = &coarse.Samples[q], coarse.Points
				}
			}
		}
		for _, m := range b {
			if err := r.certify(m); err != nil {
				return err
			}
		}
		return nil
	})
}

// certify reads the amplitudes of a mode, sets its bars, and decides whether it
// is done or climbs.
func (r *circularRun) certify(m *ladder) error {
	m.met, m.why = true, ""
	climb := false
	for e := range m.z {
		end := certify.End(e)
		var z []complex128
		var fine certify.Reading
		for k := m.rung; k > m.rung-r.n.rungs; k-- {
			rd, err := certify.Read(m.runs[k], end, m.mode.tone, m.until, m.power)
			if err != nil {
				return fmt.Errorf("span.until %g is too short for mode (%d,%d): %w", m.until, m.mode.tone.L, m.mode.tone.M, err)
			}
			if k == m.rung {
				fine = rd
			}
			z = append(z, rd.Z)
		}
		bar := certify.Budget{
			Discretisation: certify.Discretisation(z),
			Transient:      fine.Transient(end, m.mode.tone, m.until),
			RoundOff:       certify.RoundOff(m.points[m.rung], m.mode.tone.Omega),
		}
		m.z[e], m.bars[e] = fine.Z, bar
		if relative := bar.Bar() * (2 + bar.Bar()); !(relative <= m.allow[e]) {
			m.met = false
			m.why = strings.TrimPrefix(m.why+fmt.Sprintf("; at %s the %s holds the bar at %.1e", end, bar.Largest(), relative), "; ")
			// Climbing helps when the discretisation is what is too large and
			// the rest leaves room.
			rest := 2 * (bar.Transient + bar.RoundOff)
			if 2*bar.Discretisation > 0.3*math.Max(m.allow[e]-rest, 0) && bar.Discretisation > bar.RoundOff {
				climb = true
			}
		}
	}
	if climb && !m.met && m.rung < r.n.maxRung && r.n.fixedRung < 0 {
		delete(m.runs, m.rung-r.n.rungs+1)
		m.rung++
		return nil
	}
	m.done = true
	return nil
}

// block evolves modes on rung k, or takes the stored samples of an interrupted
// run.
func (r *circularRun) block(ctx context.Context, key string, modes []*ladder, k int, until float64, more func([]certify.Samples, float64) float64) (*blockRun, error) {
	var list []circularMode
	for _, m := range modes {
		list = append(list, m.mode)
	}
	b, err := kept(r.o.Keep, key, func() (*blockRun, error) {
		return r.n.evolveBlock(ctx, list, r.orbit.rstar, k, until, more, r.meter.did)
	})
	if err == nil {
		r.log(k, modes, b)
	}
	return b, err
}

// log books a run under its rung.
func (r *circularRun) log(k int, modes []*ladder, b *blockRun) {
	r.meter.mu.Lock()
	defer r.meter.mu.Unlock()
	g := r.rungs[k]
	if g == nil {
		g = &result.Rung{Points: b.Points, Dx: b.Dx, Dt: b.Dt, Kernel: r.n.cells * b.Dx, Moments: r.n.moments, Order: r.n.order}
		r.rungs[k], r.members[k] = g, map[string]bool{}
	}
	g.Until = math.Max(g.Until, b.Until)
	g.CoreSeconds += b.Seconds
	for _, m := range modes {
		r.members[k][fmt.Sprintf("(%d,%d)", m.mode.tone.L, m.mode.tone.M)] = true
	}
}

// expect announces the work of one block on rung k.
func (r *circularRun) expect(k int, until float64) {
	g := r.n.grid(k)
	r.meter.expect(until / (r.n.courant * g.Dx) * float64(g.N))
}

// chunk splits n items into blocks.
func chunk(n int) [][2]int {
	var out [][2]int
	for i := 0; i < n; i += blockModes {
		out = append(out, [2]int{i, min(i+blockModes, n)})
	}
	return out
}

func parityName(p equations.Parity) string { return p.String() }
