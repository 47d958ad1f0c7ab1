package wire

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/configs"
	"nullmark/extract/certify"
	"nullmark/extract/flux"
	"nullmark/extract/kerr"
	"nullmark/extract/result"
	"nullmark/extract/strain"
)

// kerrConventions are what a result of the Teukolsky equation states.
func kerrConventions() map[string]string {
	c := conventions()
	delete(c, "master functions")
	c["retarded time"] = "u = t - r_*, r_* = r + [2 r+ ln((r-r+)/2) - 2 r- ln((r-r-)/2)]/(r+ - r-); the label at null infinity is u itself, no shift against the orbit"
	c["basis"] = "infinity and strain by spherical l, horizon by spheroidal l of the mode's frequency; only the sums over l at fixed m (per_m) are independent of the basis"
	c["weak modes"] = "the sums over l are held to the asked accuracy; a single mode weaker than 1e-3 of its sum to the asked accuracy of 1e-3 of it"
	c["horizon series"] = "phi_l_m is the s = -2 field Phi = r Delta^-2 Psi on the horizon (azimuth that is regular there) by spheroidal l against advanced time v"
	c["truncation"] = "per_m sums run over l until the rest is below the asked accuracy; the total holds the listed m plus the estimated tail beyond them, stated apart as truncation"
	c["orbital frequency"] = "omega_phi = 1/(r^{3/2} + a)"
	c["spin"] = "the orbit has L > 0; a negative spin makes it retrograde"
	c["carter constant"] = "no average of the change of Carter's constant is given"
	return c
}

func (r *kerrCircular) describe() *result.Orbit {
	h := r.hole
	return &result.Orbit{
		Kind: configs.Circular, Energy: r.state.E, AngMom: r.state.L,
		Numbers: map[string]float64{
			"radius": r.r0, "rstar": r.state.Rho, "omega_phi": r.omega, "period_phi": 2 * math.Pi / r.omega,
			"x": math.Pow(r.omega, 2.0/3), "spin": h.Spin(), "horizon_radius": h.OuterHorizon(),
			"light_ring_radius": h.LightRing(), "isco_radius": h.ISCO(), "horizon_frequency": h.HorizonFrequency(),
		},
	}
}

// assemble turns the finished m's into the data of a result.
func (r *kerrCircular) assemble(c *configs.Case) (*result.Bundle, error) {
	tree, err := c.Tree()
	if err != nil {
		return nil, err
	}
	res := &result.Result{
		Schema: result.Schema, Title: c.Title, Case: tree, Conventions: kerrConventions(),
		Orbit: r.describe(), Warnings: append([]string{}, Warnings(c)...),
	}
	index := r.rungList(res)
	res.Total = &result.Total{Measure: rate}
	raised, from := 0, 0
	var inf, hor []*result.Flux
	for _, t := range r.ms {
		for i := range t.parts[0] {
			l := lowest(t.m) + i
			if listed(c, l, t.m) {
				res.Modes = append(res.Modes, r.entry(t, i, index[t.rung]))
			}
		}
		res.PerM = append(res.PerM, result.PerM{M: t.m, Infinity: t.sums[0], Horizon: t.sums[1], LConverged: t.settled})
		inf, hor = append(inf, t.sums[0]), append(hor, t.sums[1])
		if t.last > t.asked && t.last > raised {
			raised, from = t.last, t.m
		}
	}
	if raised > 0 {
		res.Warnings = append(res.Warnings, fmt.Sprintf("l_max %d is too small for sums over l to %.1e: it was raised where a sum wants it, up to l = %d at m = %d",
			c.Waves.LMax, c.Accuracy.Relative, raised, from))
	}
	sumKerr(res, inf, hor, c.Waves.LMax, r.whole)
	r.verdict(c, res)
	return &result.Bundle{Result: res, Series: r.series(c)}, nil
}

// sumKerr adds up the m's (ascending, m > 0) and the estimated tail beyond them.
func sumKerr(res *result.Result, inf, hor []*result.Flux, top int, whole bool) {
	t := res.Total
	t.Infinity, t.Horizon = flux.Sum(inf...), flux.Sum(hor...)
	t.Truncation = &result.Truncation{LMax: top}
	if !whole {
		t.Truncation.Note = "only the listed m are summed, each over all l; no tail is estimated"
		return
	}
	tail := func(parts []*result.Flux, margin float64) (*result.Flux, bool) {
		var e, l []float64
		for _, p := range parts {
			e, l = append(e, p.Energy.Value), append(l, p.AngularMomentum.Value)
		}
		te, ok1 := flux.Tail(e, margin)
		tl, ok2 := flux.Tail(l, margin)
		return &result.Flux{Energy: te, AngularMomentum: tl}, ok1 && ok2
	}
	// m = 0 is no part of the fall with m
	if len(res.PerM) > 0 && res.PerM[0].M == 0 {
		inf, hor = inf[1:], hor[min(1, len(hor)):]
	}
	ti, ok1 := tail(inf, 0)
	var th *result.Flux
	ok2 := true
	if t.Horizon != nil {
		th, ok2 = tail(hor, 0.02)
	}
	if !ok1 || !ok2 {
		t.Truncation.Note = "l_max is too small, or the sums at each m fall too slowly, to estimate the tail in m: the total lacks it"
		res.Warnings = append(res.Warnings, t.Truncation.Note)
		return
	}
	t.Truncation.Note = "the tail of m > l_max, each m summed over l"
	t.Truncation.Infinity, t.Truncation.Horizon = ti, th
	t.Infinity, t.Horizon = flux.Sum(t.Infinity, ti), flux.Sum(t.Horizon, th)
}

func (r *kerrCircular) entry(t *kerrTone, i, rung int) result.Mode {
	inf, hor := t.out.Infinity[i], t.out.Horizon[i]
	out := result.Mode{
		L: lowest(t.m) + i, M: t.m, Measure: rate, Counts: bothSigns,
		Infinity: t.parts[0][i], Horizon: t.parts[1][i], Rung: rung, Met: true,
		Budget: map[string]float64{
			"discretisation": inf.Bar.Discretisation, "transient": inf.Bar.Transient, "round-off": inf.Bar.RoundOff,
			"horizon discretisation": hor.Bar.Discretisation, "horizon transient": hor.Bar.Transient,
		},
	}
	for e, f := range []*result.Flux{out.Infinity, out.Horizon} {
		scale := heldTo(f, t.sums[e])
		if b := f.Energy.Error; !(b <= r.kerrClimb.asked*scale) {
			out.Met = false
			out.Why = fmt.Sprintf("the bar of its energy at %s is %.1e of %.3g", certify.End(e), b/scale, scale)
		}
	}
	h := kerr.Strain(t.tone.Omega, inf.Z)
	bar := cmplx.Abs(h) * inf.Bar.Bar()
	out.Strain = &result.Complex{Re: result.Q{Value: real(h), Error: bar}, Im: result.Q{Value: imag(h), Error: bar}}
	return out
}

// heldTo is the energy against which the bar of a mode is held.
func heldTo(f, sum *result.Flux) float64 {
	return math.Max(math.Abs(f.Energy.Value), weak*math.Abs(sum.Energy.Value))
}

// verdict compares the bars of the sums at each m and of the modes with what was
// asked.
func (r *kerrCircular) verdict(c *configs.Case, res *result.Result) {
	a := result.Accuracy{Asked: c.Accuracy.Relative, Floor: c.Accuracy.Floor, Met: true}
	for _, t := range r.ms {
		if !t.met {
			a.Met = false
			res.Warnings = append(res.Warnings, fmt.Sprintf("the sum over l at m = %d did not reach %.1e: %s", t.m, a.Asked, t.why))
		}
		for e, s := range t.sums {
			if rel := s.Energy.Error / math.Abs(s.Energy.Value); rel > a.Worst.Relative {
				a.Worst = result.Worst{M: t.m, What: "energy summed over l at " + certify.End(e).String(), Relative: rel}
			}
		}
	}
	for i := range res.Modes {
		m := &res.Modes[i]
		if m.L > c.Waves.LMax {
			continue // carried for the sums
		}
		if !m.Met {
			a.Met = false
			res.Warnings = append(res.Warnings, fmt.Sprintf("mode (%d,%d) did not reach %.1e: %s", m.L, m.M, a.Asked, m.Why))
		}
		for _, t := range r.ms {
			if t.m != m.M {
				continue
			}
			for e, f := range []*result.Flux{m.Infinity, m.Horizon} {
				if rel := f.Energy.Error / heldTo(f, t.sums[e]); rel > a.Worst.Relative {
					a.Worst = result.Worst{L: m.L, M: m.M, What: "energy at " + certify.End(e).String(), Relative: rel}
				}
			}
		}
	}
	res.Accuracy = a
}

// series samples the strain by spherical l and the horizon field by spheroidal l
// every output.every.
func (r *kerrCircular) series(c *configs.Case) *result.Series {
	if len(r.ms) == 0 {
		return nil
	}
	until := 0.0
	for _, t := range r.ms {
		until = math.Max(until, t.until)
	}
	d := r.n.domain
	s := &result.Series{Prefix: "h", HorizonPrefix: "phi", JunkUntil: d.Ramp.Centre + 3*d.Ramp.Width + 60}
	s.U = ladderOfTimes(c.Output.Every, 0, until-d.Layers.So)
	s.V = ladderOfTimes(c.Output.Every, math.Ceil(d.Layers.Si), until+d.Layers.Si)
	for _, t := range s.U {
		s.T = append(s.T, t)
		s.R = append(s.R, r.r0)
		s.Phi = append(s.Phi, r.omega*t)
	}
	for _, t := range r.ms {
		for i := range t.parts[0] {
			if l := lowest(t.m) + i; l <= max(t.asked, 2) && listed(c, l, t.m) {
				s.Modes = append(s.Modes, r.modeSeries(t, i, s.U, s.V, s.JunkUntil))
			}
		}
	}
	return s
}

// modeSeries is the certified tone once the switch-on is over, and before that
// the raw signal: psi4 over -omega^2/2 at infinity, the field at the horizon.
func (r *kerrCircular) modeSeries(t *kerrTone, i int, u, v []float64, settled float64) result.ModeSeries {
	out := result.ModeSeries{L: lowest(t.m) + i, M: t.m}
	so, si := r.n.domain.Layers.So, r.n.domain.Layers.Si
	fac := kerr.Strain(t.tone.Omega, 1)
	fine, mid := t.runs[t.rung], t.runs[t.rung-1]
	a := t.out.Infinity[i]
	out.Wave, out.WaveErr = joined(t.tone.Omega, fac*a.Z, a.Bar.Bar(), -so, fine, u, settled, func(b *blockRun, at []float64) []complex128 {
		w := strain.Resample(b.Samples[i].Psi[certify.Infinity], -so, b.Dt, at)
		for k := range w {
			w[k] *= fac
		}
		return w
	})
	apart := cmplx.Abs(fac*a.Z) * a.Bar.Discretisation / certify.Leftover(kerrOrder)
	for k := range u {
		out.Evidence = append(out.Evidence, apart)
		if u[k] >= settled || u[k] > math.Min(fine.Until, mid.Until)-so || i >= len(mid.Samples) {
			continue
		}
		other := strain.Resample(mid.Samples[i].Psi[certify.Infinity], -so, mid.Dt, u[k:k+1])
		out.Evidence[k] = cmplx.Abs(out.Wave[k] - fac*other[0])
	}
	b := t.out.Horizon[i]
	out.Horizon, out.HorizonErr = joined(t.tone.Omega, b.Z, b.Bar.Bar(), si, fine, v, settled, func(run *blockRun, at []float64) []complex128 {
		w := make([]complex128, len(at))
		phi := make([][]complex128, len(run.Samples))
		one := make([]complex128, len(phi))
		for l := range phi {
			phi[l] = strain.Resample(run.Samples[l].Psi[certify.Horizon], si, run.Dt, at)
		}
		for k := range w {
			for l := range phi {
				one[l] = phi[l][k]
			}
			w[k] = t.out.Spheroidal.Project(i, one)
		}
		return w
	})
	return out
}

// joined samples a signal: raw before settled, with its distance from the tone
// a e^{-i omega t} in the bar, and that tone after. start is the label of slice 0.
func joined(omega float64, a complex128, relative, start float64, b *blockRun, at []float64, settled float64, raw func(*blockRun, []float64) []complex128) (w []complex128, bar []float64) {
	n := 0
	for n < len(at) && at[n] < settled && at[n] <= start+b.Samples[0].Until() {
		n++
	}
	w = raw(b, at[:n])
	own := cmplx.Abs(a) * relative
	for i, t := range at {
		steady := a * cmplx.Exp(complex(0, -omega*t))
		if i >= n {
			w = append(w, steady)
			bar = append(bar, own)
			continue
		}
		bar = append(bar, cmplx.Abs(w[i]-steady)+own)
	}
	return w, bar
}
