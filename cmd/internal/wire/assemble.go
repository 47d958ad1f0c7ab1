package wire

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"sort"
	"strings"

	"nullmark/configs"
	"nullmark/equations"
	"nullmark/extract/certify"
	"nullmark/extract/flux"
	"nullmark/extract/result"
	"nullmark/extract/strain"
	"nullmark/hyperboloidal"
)

const (
	bothSigns = "both signs of m"
	rate      = "rate"
)

// assemble turns finished ladders into the data of a result.
func (r *circularRun) assemble(c *configs.Case) (*result.Bundle, error) {
	tree, err := c.Tree()
	if err != nil {
		return nil, err
	}
	res := &result.Result{
		Schema: result.Schema, Title: c.Title, Case: tree, Conventions: conventions(),
		Orbit: r.describe(), Warnings: append([]string{}, Warnings(c)...),
	}
	index := r.rungList(res)
	for _, m := range r.modes {
		res.Modes = append(res.Modes, r.entry(m, index[m.rung]))
	}
	sumModes(c, res, rate)
	verdict(c, res)
	return &result.Bundle{Result: res, Series: r.series(c)}, nil
}

// rungList writes the rungs that were run into the result, coarsest first, and
// returns their places in it.
func (r *climb) rungList(res *result.Result) map[int]int {
	index := map[int]int{}
	var ks []int
	for k := range r.rungs {
		ks = append(ks, k)
	}
	sort.Ints(ks)
	for i, k := range ks {
		index[k] = i
		g := *r.rungs[k]
		var names []string
		for n := range r.members[k] {
			names = append(names, n)
		}
		sort.Strings(names)
		g.Modes = strings.Join(names, " ")
		res.Rungs = append(res.Rungs, g)
	}
	return index
}

func (r *circularRun) describe() *result.Orbit {
	o := r.orbit
	return &result.Orbit{
		Kind: configs.Circular, Energy: o.energy, AngMom: o.angmom,
		Numbers: map[string]float64{
			"radius": o.r0, "rstar": o.rstar, "omega_phi": o.omega, "period_phi": 2 * math.Pi / o.omega,
			"x": math.Pow(o.omega, 2.0/3), "horizon_radius": hyperboloidal.Horizon,
			"light_ring_radius": hyperboloidal.LightRing, "isco_radius": hyperboloidal.ISCORadius,
		},
	}
}

func (r *circularRun) entry(m *ladder, rung int) result.Mode {
	t := m.circ.tone
	inf, hor := m.circ.bars[certify.Infinity], m.circ.bars[certify.Horizon]
	out := result.Mode{
		L: t.L, M: t.M, Parity: m.parity.String(), Measure: rate, Counts: bothSigns,
		Infinity: flux.Steady(t.L, t.M, t.Omega, cmplx.Abs(m.circ.z[certify.Infinity]), inf.Bar()),
		Horizon:  flux.Steady(t.L, t.M, t.Omega, cmplx.Abs(m.circ.z[certify.Horizon]), hor.Bar()),
		Met:      m.met, Why: m.why, Rung: rung,
		Budget: map[string]float64{
			"discretisation": inf.Discretisation, "transient": inf.Transient, "round-off": inf.RoundOff,
			"horizon discretisation": hor.Discretisation, "horizon transient": hor.Transient,
		},
	}
	h := r.strainAmplitude(m)
	bar := cmplx.Abs(h) * inf.Bar()
	out.Strain = &result.Complex{Re: result.Q{Value: real(h), Error: bar}, Im: result.Q{Value: imag(h), Error: bar}}
	return out
}

// strainAmplitude is r h_lm e^{i m phi_p(u)}/mu: with u = tau - So the tone
// Z e^{-i omega tau} is Z e^{-i omega So} e^{-i omega u}.
func (r *circularRun) strainAmplitude(m *ladder) complex128 {
	return strain.Factor(m.circ.tone.L, m.parity == equations.Odd) *
		m.circ.z[certify.Infinity] * cmplx.Exp(complex(0, -m.circ.tone.Omega*r.n.domain.So))
}

// sumModes adds up the modes, by m and in all, with the estimated tail in l.
func sumModes(c *configs.Case, res *result.Result, measure string) {
	var inf, hor []*result.Flux
	for i := range res.Modes {
		inf = append(inf, res.Modes[i].Infinity)
		hor = append(hor, res.Modes[i].Horizon)
	}
	total := &result.Total{Measure: measure, Infinity: flux.Sum(inf...), Horizon: flux.Sum(hor...)}
	res.Total = total
	for m := 0; m <= c.Waves.LMax; m++ {
		var a, b []*result.Flux
		for i := range res.Modes {
			if res.Modes[i].M == m {
				a, b = append(a, res.Modes[i].Infinity), append(b, res.Modes[i].Horizon)
			}
		}
		if len(a) > 0 {
			res.PerM = append(res.PerM, result.PerM{M: m, Infinity: flux.Sum(a...), Horizon: flux.Sum(b...),
				LConverged: len(c.Waves.Modes) == 0 && settled(a, c.Accuracy.Relative) && settled(b, c.Accuracy.Relative)})
		}
	}
	if len(c.Waves.Modes) > 0 {
		total.Truncation = &result.Truncation{LMax: c.Waves.LMax, Note: "only the listed modes are summed; no tail is estimated"}
		return
	}
	t := &result.Truncation{LMax: c.Waves.LMax}
	total.Truncation = t
	byL := func(pick func(*result.Mode) float64) []float64 {
		out := make([]float64, c.Waves.LMax+1)
		for i := range res.Modes {
			out[res.Modes[i].L] += pick(&res.Modes[i])
		}
		return out[2:]
	}
	tail := func(end func(*result.Mode) *result.Flux, margin float64) (*result.Flux, bool) {
		e, ok1 := flux.Tail(byL(func(m *result.Mode) float64 { return end(m).Energy.Value }), margin)
		spin := byL(func(m *result.Mode) float64 { return end(m).AngularMomentum.Value })
		l, ok2 := flux.Tail(spin, margin)
		if !slices.ContainsFunc(spin, func(x float64) bool { return x != 0 }) {
			ok2 = true // a radial fall carries none in any mode
		}
		return &result.Flux{Energy: e, AngularMomentum: l}, ok1 && ok2
	}
	if total.Horizon == nil {
		// Nothing is absorbed that could be told apart from the particle itself.
		inf, ok := tail(func(m *result.Mode) *result.Flux { return m.Infinity }, 0)
		if !ok {
			t.Note = "l_max is too small, or the modes fall too slowly, to estimate the tail in l: the total lacks it"
			return
		}
		t.Infinity = inf
		total.Infinity = flux.Sum(total.Infinity, inf)
		return
	}
	inf1, ok1 := tail(func(m *result.Mode) *result.Flux { return m.Infinity }, 0)
	hor1, ok2 := tail(func(m *result.Mode) *result.Flux { return m.Horizon }, 0.02)
	if !ok1 || !ok2 {
		t.Note = "l_max is too small, or the modes fall too slowly, to estimate the tail in l: the total lacks it"
		res.Warnings = append(res.Warnings, t.Note)
		return
	}
	t.Infinity, t.Horizon = inf1, hor1
	total.Infinity = flux.Sum(total.Infinity, t.Infinity)
	total.Horizon = flux.Sum(total.Horizon, t.Horizon)
}

// settled says whether a sum over ascending l has come to its end: its last two
// parts together are at most the asked fraction of it. Modes fall by more than a
// factor of two from each second l to the next wherever this is small.
func settled(byL []*result.Flux, asked float64) bool {
	sum := flux.Sum(byL...)
	if sum == nil {
		return true // nothing is summed at this end
	}
	n := len(byL)
	if n < 2 || byL[n-1] == nil || byL[n-2] == nil {
		return false
	}
	last := math.Abs(byL[n-1].Energy.Value) + math.Abs(byL[n-2].Energy.Value)
	return last <= asked*math.Abs(sum.Energy.Value)
}

// verdict compares every bar with what was asked.
func verdict(c *configs.Case, res *result.Result) {
	a := result.Accuracy{Asked: c.Accuracy.Relative, Floor: c.Accuracy.Floor, Met: true}
	var largest [2]float64
	ends := func(m *result.Mode) [2]*result.Flux { return [2]*result.Flux{m.Infinity, m.Horizon} }
	for i := range res.Modes {
		for e, f := range ends(&res.Modes[i]) {
			if f == nil {
				continue
			}
			largest[e] = math.Max(largest[e], f.Energy.Value)
		}
	}
	for i := range res.Modes {
		m := &res.Modes[i]
		if !m.Met {
			a.Met = false
			res.Warnings = append(res.Warnings, fmt.Sprintf("mode (%d,%d) did not reach %.1e: %s", m.L, m.M, c.Accuracy.Relative, m.Why))
		}
		for e, f := range ends(m) {
			if f == nil {
				continue
			}
			scale := f.Energy.Value
			if scale < c.Accuracy.Floor*largest[e] {
				// Below the floor the bar is held to floor times the largest,
				// which is the asked accuracy on this scale.
				scale = math.Max(scale, c.Accuracy.Floor*largest[e]/c.Accuracy.Relative)
			}
			if rel := f.Energy.Error / scale; rel > a.Worst.Relative {
				a.Worst = result.Worst{L: m.L, M: m.M, What: "energy at " + certify.End(e).String(), Relative: rel}
			}
		}
	}
	res.Accuracy = a
}

// series samples the strain and the horizon field every output.every.
func (r *circularRun) series(c *configs.Case) *result.Series {
	if len(r.modes) == 0 {
		return nil
	}
	until := 0.0
	for _, m := range r.modes {
		until = math.Max(until, m.until)
	}
	d := r.n.domain
	s := &result.Series{Prefix: "h", HorizonPrefix: "psi", JunkUntil: r.n.ramp.Centre + 3*r.n.ramp.Width + 60}
	s.U = ladderOfTimes(c.Output.Every, 0, d.Retarded(until))
	s.V = ladderOfTimes(c.Output.Every, math.Ceil(d.Advanced(0)), d.Advanced(until))
	for _, t := range s.U {
		s.T = append(s.T, t)
		s.R = append(s.R, r.orbit.r0)
		s.Phi = append(s.Phi, r.orbit.omega*t)
	}
	for _, m := range r.modes {
		s.Modes = append(s.Modes, r.modeSeries(m, s.U, s.V, s.JunkUntil))
	}
	return s
}

// ladderOfTimes lists the multiples of step in [from, to].
func ladderOfTimes(step, from, to float64) []float64 {
	var out []float64
	for k := math.Ceil(from / step); k*step <= to; k++ {
		out = append(out, k*step)
	}
	return out
}

// modeSeries is the raw signal while the start-up lasts, and the certified tone
// from there on: what the start-up has left in the samples is not part of the
// answer for a particle that has always been on its orbit. It goes on to the end
// of the longest run.
func (r *circularRun) modeSeries(m *ladder, u, v []float64, settled float64) result.ModeSeries {
	t, d := m.circ.tone, r.n.domain
	fac := strain.Factor(t.L, m.parity == equations.Odd)
	out := result.ModeSeries{L: t.L, M: t.M}
	h := r.strainAmplitude(m)
	// The finer rungs' amplitudes differ by this much, samples included.
	z := m.circ.z[certify.Infinity]
	apart := cmplx.Abs(h) * cmplx.Abs(z-m.circ.coarse) / cmplx.Abs(z)
	out.Wave, out.WaveErr = r.toned(m, certify.Infinity, d.Retarded(0), u, settled, h, fac)
	raw := out.Evidence
	for i := range u {
		raw = append(raw, apart)
		if u[i] >= settled || u[i] > d.Retarded(0)+math.Min(m.runs[m.rung].Until(), m.runs[m.rung-1].Until()) {
			continue
		}
		// While the start-up lasts the rungs are compared sample by sample.
		other := strain.Resample(m.runs[m.rung-1].Psi[certify.Infinity], d.Retarded(0), m.runs[m.rung-1].Dt, u[i:i+1])
		raw[i] = cmplx.Abs(out.Wave[i] - fac*other[0])
	}
	out.Evidence = raw
	zh := m.circ.z[certify.Horizon] * cmplx.Exp(complex(0, t.Omega*d.Si))
	out.Horizon, out.HorizonErr = r.toned(m, certify.Horizon, d.Advanced(0), v, settled, zh, 1)
	return out
}

// toned samples a mode at one end: raw (times fac) before settled, with its
// distance from the tone a e^{-i omega t} in the bar, and that tone after.
func (r *circularRun) toned(m *ladder, e certify.End, start float64, at []float64, settled float64, a, fac complex128) (w []complex128, bar []float64) {
	s := m.runs[m.rung]
	n := 0
	for n < len(at) && at[n] < settled && at[n] <= start+s.Until() {
		n++
	}
	w = strain.Resample(s.Psi[e], start, s.Dt, at[:n])
	own := cmplx.Abs(a) * m.circ.bars[e].Bar()
	for i, t := range at {
		steady := a * cmplx.Exp(complex(0, -m.circ.tone.Omega*t))
		if i >= n {
			w = append(w, steady)
			bar = append(bar, own)
			continue
		}
		w[i] *= fac
		bar = append(bar, cmplx.Abs(w[i]-steady)+own)
	}
	return w, bar
}
