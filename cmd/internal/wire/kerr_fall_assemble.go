package wire

import (
	"fmt"
	"math"

	"nullmark/configs"
	"nullmark/equations/coupled"
	"nullmark/extract/kerr"
	"nullmark/extract/peak"
	"nullmark/extract/result"
	"nullmark/extract/signal"
	"nullmark/extract/strain"
	"nullmark/source/worldline"
)

func (r *kerrFall) describe(c *configs.Case) *result.Orbit {
	h := r.hole
	return &result.Orbit{Kind: c.Orbit.Kind, Energy: r.path.energy, AngMom: r.path.angmom, Markers: r.markers,
		Numbers: map[string]float64{
			"from": r.path.from, "spin": h.Spin(), "horizon_radius": h.OuterHorizon(), "horizon_frequency": h.HorizonFrequency(),
			"light_ring_radius": h.LightRing(), "isco_radius": h.ISCO(),
		}}
}

// assemble turns the finished m's into the data of a result.
func (r *kerrFall) assemble(c *configs.Case) (*result.Bundle, error) {
	tree, err := c.Tree()
	if err != nil {
		return nil, err
	}
	res := &result.Result{
		Schema: result.Schema, Title: c.Title, Case: tree, Conventions: kerrConventions(),
		Orbit: r.describe(c), Warnings: append([]string{}, Warnings(c)...),
	}
	for _, k := range []string{"circular strain", "circular series", "orbital frequency", "weak modes"} {
		delete(res.Conventions, k)
	}
	last := r.waveEnd()
	res.Conventions["totals"] = fmt.Sprintf("radiated energy and angular momentum from u = %.6g to u = %.6g", r.after, last)
	res.Conventions["transient series"] = "r h = 2 int int psi4, integrated backwards from the end of the run, where the signal has died away; the bar holds the drift that the last samples of psi4 would make"
	res.Conventions["horizon"] = "the particle crosses the horizon: its own field passes there, and no absorbed total is given"
	res.Conventions["horizon series"] = "phi_l_m is the s = -2 field Phi = r Delta^-2 Psi on the horizon (azimuth that is regular there) by spherical l against advanced time v"
	res.Conventions["m = 0"] = "m = 0 counts once; its strain is given up to a constant (memory)"
	index := r.rungList(res)
	res.Total = &result.Total{Measure: total}
	a := result.Accuracy{Asked: c.Accuracy.Relative, Floor: c.Accuracy.Floor, Met: true}
	var inf []*result.Flux
	for _, t := range r.ms {
		counts := bothSigns
		if t.m == 0 {
			counts = "m = 0 alone"
		}
		for i, w := range t.waves {
			l := lowest(t.m) + i
			if !listed(c, l, t.m) || l > c.Waves.LMax {
				continue
			}
			e := result.Mode{L: l, M: t.m, Measure: total, Counts: counts, Infinity: w.flux, Met: true, Rung: index[t.rung], Peak: r.peak(t, i)}
			worst := 0.0
			for _, b := range w.bar {
				worst = math.Max(worst, b/w.peak)
			}
			if !(worst <= r.asked) {
				e.Met, e.Why = false, fmt.Sprintf("the bar of its strain is %.1e of its peak", worst)
				a.Met = false
				res.Warnings = append(res.Warnings, fmt.Sprintf("mode (%d,%d) did not reach %.1e: %s", l, t.m, r.asked, e.Why))
			}
			if worst > a.Worst.Relative {
				a.Worst = result.Worst{L: l, M: t.m, What: "strain against its peak", Relative: worst}
			}
			res.Modes = append(res.Modes, e)
		}
		res.PerM = append(res.PerM, result.PerM{M: t.m, Infinity: t.sum, LConverged: t.settled})
		inf = append(inf, t.sum)
	}
	sumKerr(res, inf, nil, c.Waves.LMax, r.whole)
	res.Accuracy = a
	return &result.Bundle{Result: res, Series: r.series(c)}, nil
}

// waveEnd is the last retarded time that all m have.
func (r *kerrFall) waveEnd() float64 {
	last := math.Inf(1)
	for _, t := range r.ms {
		last = math.Min(last, r.after+float64(len(t.waves[0].h)-2)*t.runs[t.rung].Dt)
	}
	return last
}

// began is the retarded time of the first sample of the waves of t.
func (r *kerrFall) began(t *kerrBurst) float64 {
	so, dt := r.n.domain.Layers.So, t.runs[t.rung].Dt
	return math.Ceil((r.after+so)/dt)*dt - so
}

// peak is the maximum of |r h_lm| with its neighbourhood.
func (r *kerrFall) peak(t *kerrBurst, i int) *result.Peak {
	if t.m == 0 {
		return nil
	}
	w, u0, dt := &t.waves[i], r.began(t), t.runs[t.rung].Dt
	at := ladderOfTimes(traitStep, math.Ceil(u0/traitStep)*traitStep, u0+float64(len(w.h)-2)*dt)
	sampled := func(v []complex128) signal.Series {
		return signal.Series{Start: at[0], Dt: traitStep, Values: strain.Resample(v, u0, dt, at)}
	}
	fine, mid := sampled(w.h), sampled(w.coarse)
	fine.Err = make([]float64, len(at))
	for k, u := range at {
		j := min(max(int(math.Round((u-u0)/dt)), 0), len(w.bar)-1)
		fine.Err[k] = w.bar[j] - kerr.Remainder*w.apart[j]
	}
	o := peak.Options{From: math.Max(r.event-60, at[0]+5), To: at[len(at)-1] - 5, Coarse: &mid, Factor: kerr.Remainder}
	p, err := peak.Find(fine, o)
	if err != nil {
		return nil // a mode without a clear maximum has none to report
	}
	if at, ok := r.markers[worldline.MarkPeakOmega]; ok {
		p.Delay = peak.Delay(p.U, result.Q{Value: at, Error: t.runs[t.rung].Dt / 4})
	}
	if at, ok := r.markers[worldline.MarkLightRing]; ok {
		if q, err := peak.At(fine, at, o); err == nil {
			p.AtLightRing = q
		}
	}
	return p
}

// series samples strain and horizon field every output.every.
func (r *kerrFall) series(c *configs.Case) *result.Series {
	if len(r.ms) == 0 {
		return nil
	}
	d := r.n.domain.Layers
	s := &result.Series{Prefix: "h", HorizonPrefix: "phi", JunkUntil: r.after}
	first := 0.0
	for _, t := range r.ms {
		first = math.Max(first, r.began(t))
	}
	s.U = ladderOfTimes(c.Output.Every, math.Ceil(first), r.waveEnd())
	s.V = ladderOfTimes(c.Output.Every, math.Ceil(d.Si), r.ends-2+d.Si)
	g := r.n.rung(1, 2, 2)
	if track, err := coupled.FallTrack(g, r.path.energy, r.path.angmom, r.path.from, 0, true, r.ends); err == nil {
		for i, k := range track.States {
			if k.Rho < d.Ri {
				break
			}
			if t := track.Start + float64(i)*track.Step; t >= 0 && i%4 == 0 {
				s.T, s.R = append(s.T, t), append(s.R, k.R)
				s.Phi = append(s.Phi, k.Phi-r.hole.Azimuth(k.R-r.hole.OuterHorizon()))
			}
		}
	}
	for _, t := range r.ms {
		u0, run := r.began(t), t.runs[t.rung]
		for i := range t.waves {
			l := lowest(t.m) + i
			if !listed(c, l, t.m) || l > c.Waves.LMax {
				continue
			}
			w := &t.waves[i]
			out := result.ModeSeries{L: l, M: t.m, Wave: strain.Resample(w.h, u0, run.Dt, s.U)}
			for _, u := range s.U {
				j := min(max(int(math.Round((u-u0)/run.Dt)), 0), len(w.bar)-1)
				out.WaveErr = append(out.WaveErr, w.bar[j])
				out.Evidence = append(out.Evidence, w.apart[j])
			}
			fine, mid := run.Samples[i], t.runs[t.rung-1].Samples[i]
			v := s.V
			out.Horizon = strain.Resample(fine.Psi[1], d.Si, run.Dt, v)
			other := strain.Resample(mid.Psi[1], d.Si, t.runs[t.rung-1].Dt, v)
			for k := range v {
				x := out.Horizon[k] - other[k]
				out.HorizonErr = append(out.HorizonErr, kerr.Remainder*math.Hypot(real(x), imag(x)))
			}
			s.Modes = append(s.Modes, out)
		}
	}
	return s
}
