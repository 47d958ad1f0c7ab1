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
	"nullmark/extract/result"
	"nullmark/grid"
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

// circularMode is what one mode of a circular orbit carries: its tone, its
// source amplitudes, and at the end its amplitudes with their budgets.
type circularMode struct {
	tone  certify.Tone
	f, g  float64
	power int        // of the demodulation window
	least int        // smallest power whose window holds enough samples of the coarsest rung
	scout [2]float64 // |amplitude| of the scouting run by end
	z     [2]complex128
	// coarse is the amplitude at infinity on the second finest rung
	coarse complex128
	bars   [2]certify.Budget
}

func (o circularOrbit) mode(l, m int, on float64) *circularMode {
	src := source.NewMasterSource(l, m)
	f, g := src.Amplitudes(&source.Motion{R: o.r0, Y: o.r0 - 2, E: o.energy, L: o.angmom})
	return &circularMode{tone: certify.Tone{L: l, M: m, Omega: float64(m) * o.omega, On: on}, f: real(f), g: real(g)}
}

// circularRun is a circular orbit on its way up the ladder.
type circularRun struct {
	*climb
	orbit circularOrbit
	asked float64
	floor float64
}

func newCircularRun(c *configs.Case, n numerics, o Options) *circularRun {
	orbit := newCircularOrbit(c.Orbit.Radius)
	n.place(orbit.rstar)
	n.stopAt()
	r := &circularRun{climb: newClimb(n, o), orbit: orbit, asked: c.Accuracy.Relative, floor: c.Accuracy.Floor}
	r.kind = r
	for _, lm := range c.ModeList() {
		if lm[1] == 0 {
			continue
		}
		m := newLadder(lm[0], lm[1])
		m.circ = r.orbit.mode(lm[0], lm[1], r.n.on())
		m.circ.least = leastPower(m.circ.tone, r.n.courant*r.n.coarsestDx)
		m.circ.power = max(certify.WindowPower(r.asked), m.circ.least)
		r.modes = append(r.modes, m)
	}
	return r
}

// leastPower is the smallest power of a window, of power+1 periods, that holds 24
// samples dt apart: a fast mode of a tight orbit needs more than two periods.
func leastPower(t certify.Tone, dt float64) int {
	return max(1, int(math.Ceil(24*dt/t.Period()))-1)
}

// runCircular evolves all modes of a circular orbit on Schwarzschild.
func runCircular(ctx context.Context, c *configs.Case, n numerics, o Options) (*result.Bundle, error) {
	clock := startClock()
	r := newCircularRun(c, n, o)
	if err := r.scouting(ctx); err != nil {
		return nil, err
	}
	if err := r.run(ctx); err != nil {
		return nil, err
	}
	b, err := r.assemble(c)
	if err != nil {
		return nil, err
	}
	b.Result.Provenance = clock.stop(o.Workers)
	return b, nil
}

// force implements kind.
func (r *circularRun) force(modes []*ladder) func(grid.Grid, source.Kernel, float64) semi.Forcing {
	var f, g, omega []float64
	for _, m := range modes {
		f, g, omega = append(f, m.circ.f), append(g, m.circ.g), append(omega, m.circ.tone.Omega)
	}
	return func(gr grid.Grid, kernel source.Kernel, _ float64) semi.Forcing {
		return source.NewStationary(gr.Rho(), r.orbit.rstar, kernel, r.n.ramp, f, g, omega)
	}
}

// scouting runs every mode once on the coarsest rung, for the size of its
// amplitudes: modes that are negligible beside the largest need not be exact.
func (r *circularRun) scouting(ctx context.Context) error {
	r.meter.stage("scouting")
	blocks := chunk(len(r.modes))
	until := func(a, b int) float64 {
		t := 0.0
		for _, m := range r.modes[a:b] {
			t = math.Max(t, certify.Earliest(m.circ.tone, m.circ.least)+60)
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
			for e := range m.circ.scout {
				rd, err := certify.Read(&run.Samples[q], certify.End(e), m.circ.tone, run.Until, m.circ.least)
				if err != nil {
					return err
				}
				m.circ.scout[e] = cmplx.Abs(rd.Z)
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
			m.allow[e] = r.asked
			if size := m.size(e); size < r.floor*largest[e] {
				m.allow[e] = math.Max(r.asked, r.floor*largest[e]/size)
			}
		}
		m.rung = r.startRung(m)
	}
	return nil
}

// size is the flux of the scouting amplitude at an end, up to a common factor.
func (m *ladder) size(e int) float64 {
	l := float64(m.circ.tone.L)
	return (l - 1) * l * (l + 1) * (l + 2) * m.circ.tone.Omega * m.circ.tone.Omega * m.circ.scout[e] * m.circ.scout[e]
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
			ok = ok && certify.Predict(certify.End(e), m.circ.tone.L, r.orbit.r0, dx) <= math.Max(m.allow[e], 4e-12)/2
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
	return certify.Earliest(m.circ.tone, m.circ.power) + 60
}

// lastUntil is where it is given up.
func (r *circularRun) lastUntil(m *ladder) float64 {
	if r.n.until > 0 {
		return r.n.until
	}
	p := m.circ.tone.Period()
	return math.Max(certify.Earliest(m.circ.tone, m.circ.power)+12*p, 3000)
}

// stride implements kind.
func (r *circularRun) stride(m *ladder) float64 { return math.Max(40, 0.3*m.circ.tone.Period()) }

// quiet implements kind: the transients are a third of what is allowed, or
// below round-off, at both ends.
func (r *circularRun) quiet(s *certify.Samples, m *ladder, until float64, points int) bool {
	floor := 2 * certify.RoundOff(points, m.circ.tone.Omega)
	for e := range m.allow {
		rd, err := certify.Read(s, certify.End(e), m.circ.tone, until, m.circ.power)
		if err != nil || 2*rd.Transient(certify.End(e), m.circ.tone, until) > math.Max(m.allow[e]/3, floor) {
			return false
		}
	}
	return true
}

// certify reads the amplitudes of a mode and sets its bars.
func (r *circularRun) certify(m *ladder) (climb bool, err error) {
	m.met, m.why = true, ""
	for e := range m.circ.z {
		end := certify.End(e)
		var z []complex128
		var fine certify.Reading
		for k := m.rung; k > m.rung-r.n.rungs; k-- {
			rd, err := certify.Read(m.runs[k], end, m.circ.tone, m.until, m.circ.power)
			if err != nil {
				return false, fmt.Errorf("span.until %g is too short for mode (%d,%d): %w", r.n.domain.Retarded(m.until), m.l, m.m, err)
			}
			if k == m.rung {
				fine = rd
			}
			if k == m.rung-1 && end == certify.Infinity {
				m.circ.coarse = rd.Z
			}
			z = append(z, rd.Z)
		}
		bar := certify.Budget{
			Discretisation: certify.Discretisation(z, min(r.n.order, r.n.moments)),
			Transient:      fine.Transient(end, m.circ.tone, m.until),
			RoundOff:       certify.RoundOff(m.points[m.rung], m.circ.tone.Omega),
		}
		m.circ.z[e], m.circ.bars[e] = fine.Z, bar
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
	return climb, nil
}
