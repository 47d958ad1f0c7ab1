package wire

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"

	"nullmark/configs"
	"nullmark/extract/certify"
	"nullmark/extract/kerr"
	"nullmark/extract/result"
	"nullmark/source/worldline"
)

const thisM = "this m"

func (r *kerrBound) describe(c *configs.Case) *result.Orbit {
	o, h := r.orbit, r.hole
	rmin, rmax := o.Range()
	n := map[string]float64{
		"p": o.P, "e": o.Ecc, "r_min": rmin, "r_max": rmax, "spin": h.Spin(), "inclination": c.Orbit.Inclination,
		"carter_constant": o.Q, "omega_phi": o.OmegaPhi, "period_phi": 2 * math.Pi / math.Abs(o.OmegaPhi),
		"omega_theta": o.OmegaTheta, "horizon_radius": h.OuterHorizon(), "horizon_frequency": h.HorizonFrequency(),
		"separatrix_p": worldline.KerrSeparatrix(h, o.Ecc, o.CosInclination),
	}
	if o.Ecc == 0 {
		n["radius"] = o.P
		n["x"] = math.Pow(math.Abs(o.OmegaPhi), 2.0/3)
		n["isco_radius"] = n["separatrix_p"]
		n["light_ring_radius"] = worldline.KerrPhotonOrbit(h, o.CosInclination)
	} else {
		n["omega_r"], n["period_r"] = o.OmegaR, 2*math.Pi/o.OmegaR
		if !r.tilt {
			n["isco_radius"] = h.ISCO()
			n["light_ring_radius"] = h.LightRing()
		}
	}
	return &result.Orbit{Kind: c.Orbit.Kind, Energy: o.E, AngMom: o.L, Numbers: n}
}

// assemble turns the finished m's into the data of a result.
func (r *kerrBound) assemble(c *configs.Case) (*result.Bundle, error) {
	tree, err := c.Tree()
	if err != nil {
		return nil, err
	}
	res := &result.Result{
		Schema: result.Schema, Title: c.Title, Case: tree, Conventions: kerrConventions(),
		Orbit: r.describe(c), Warnings: append([]string{}, Warnings(c)...),
	}
	for _, k := range []string{"circular strain", "circular series", "orbital frequency"} {
		delete(res.Conventions, k)
	}
	res.Conventions["bound series"] = "the certified sum of the tones m omega_phi + n omega_r + k omega_theta from u = 0 on, without what the switch-on left"
	res.Conventions["horizon series"] = "phi_l_m is the s = -2 field Phi = r Delta^-2 Psi on the horizon (azimuth that is regular there) by spherical l against advanced time v"
	res.Conventions["m = 0"] = "m = 0 counts once; its strain lacks a constant (memory)"
	if r.tilt {
		res.Conventions["negative m"] = "an inclined orbit lists both signs of m apart: h_{l,-m} in the tone -(m, n, k) is (-1)^{l+k} times the conjugate of h_lm in the tone (m, n, k), the mirror image in the equator, so the averages of m and -m are equal"
	}
	index := r.rungList(res)
	res.Total = &result.Total{Measure: rate}
	a := result.Accuracy{Asked: c.Accuracy.Relative, Floor: c.Accuracy.Floor, Met: true}
	var inf, hor []*result.Flux
	raised, from := 0, 0
	worst := func(l, m int, what string, relative float64) {
		if relative > a.Worst.Relative {
			a.Worst = result.Worst{L: l, M: m, What: what, Relative: relative}
		}
	}
	for _, t := range r.ms {
		count, factor := bothSigns, 2.0
		if t.m == 0 {
			count, factor = "m = 0 alone", 1
		}
		if r.tilt && t.m > 0 {
			count, factor = thisM, 1
		}
		for i := range t.parts[0] {
			l := lowest(t.m) + i
			if !listed(c, l, t.m) {
				continue
			}
			e := result.Mode{L: l, M: t.m, Measure: rate, Counts: count, Rung: index[t.rung], Met: true,
				Infinity: scaledFlux(t.parts[0][i], factor), Horizon: scaledFlux(t.parts[1][i], factor)}
			for end, f := range []*result.Flux{t.parts[0][i], t.parts[1][i]} {
				scale := heldTo(f, t.sums[end])
				if b := f.Energy.Error / scale; l <= c.Waves.LMax {
					worst(l, t.m, "energy at "+certify.End(end).String(), b)
					if !(b <= r.asked) {
						e.Met, a.Met = false, false
						e.Why = fmt.Sprintf("the bar of its energy at %s is %.1e of %.3g", certify.End(end), b, scale)
					}
				}
			}
			if !e.Met {
				res.Warnings = append(res.Warnings, fmt.Sprintf("mode (%d,%d) did not reach %.1e: %s", l, t.m, r.asked, e.Why))
			}
			res.Modes = append(res.Modes, e)
			if r.tilt && t.m > 0 {
				e.M, e.Infinity, e.Horizon = -t.m, mirror(e.Infinity), mirror(e.Horizon)
				res.Modes = append(res.Modes, e)
			}
		}
		// Both signs of m in one sum, as everywhere.
		both := 2.0
		if t.m == 0 {
			both = 1
		}
		p := result.PerM{M: t.m, Infinity: scaledFlux(t.sums[0], both), Horizon: scaledFlux(t.sums[1], both), LConverged: t.settled}
		res.PerM = append(res.PerM, p)
		inf, hor = append(inf, p.Infinity), append(hor, p.Horizon)
		if !t.met {
			a.Met = false
			res.Warnings = append(res.Warnings, fmt.Sprintf("the sum over l at m = %d did not reach %.1e: %s", t.m, r.asked, t.why))
		}
		for end, s := range t.sums {
			worst(0, t.m, "energy summed over l at "+certify.End(end).String(), s.Energy.Error/math.Abs(s.Energy.Value))
		}
		if t.last > t.asked && t.last > raised {
			raised, from = t.last, t.m
		}
	}
	if raised > 0 {
		res.Warnings = append(res.Warnings, fmt.Sprintf("l_max %d is too small for sums over l to %.1e: it was raised where a sum wants it, up to l = %d at m = %d",
			c.Waves.LMax, c.Accuracy.Relative, raised, from))
	}
	sort.SliceStable(res.Modes, func(i, j int) bool {
		if res.Modes[i].L != res.Modes[j].L {
			return res.Modes[i].L < res.Modes[j].L
		}
		return res.Modes[i].M < res.Modes[j].M
	})
	sumKerr(res, inf, hor, c.Waves.LMax, r.whole)
	res.Accuracy = a
	return &result.Bundle{Result: res, Series: r.series(c)}, nil
}

func scaledFlux(f *result.Flux, by float64) *result.Flux {
	q := func(x result.Q) result.Q { return result.Q{Value: by * x.Value, Error: by * x.Error} }
	return &result.Flux{Energy: q(f.Energy), AngularMomentum: q(f.AngularMomentum)}
}

// mirror is the flux of -m from that of m: under (m, omega) -> (-m, -omega) both
// energy and angular momentum, m/omega times it, stay.
func mirror(f *result.Flux) *result.Flux { return scaledFlux(f, 1) }

// series samples strain and horizon field of all listed modes as sums of tones.
func (r *kerrBound) series(c *configs.Case) *result.Series {
	if len(r.ms) == 0 {
		return nil
	}
	until := 0.0
	for _, t := range r.ms {
		until = math.Max(until, t.until)
	}
	d := r.n.domain.Layers
	s := &result.Series{Prefix: "h", HorizonPrefix: "phi"}
	s.U = ladderOfTimes(c.Output.Every, 0, until-d.So)
	s.V = ladderOfTimes(c.Output.Every, math.Ceil(d.Si), until+d.Si)
	for _, t := range s.U {
		k, phi := r.orbit.At(t)
		s.T, s.R, s.Phi = append(s.T, t), append(s.R, k.R), append(s.Phi, phi)
	}
	for _, t := range r.ms {
		for i := range t.parts[0] {
			l := lowest(t.m) + i
			if l > max(t.asked, 2) || !listed(c, l, t.m) {
				continue
			}
			s.Modes = append(s.Modes, r.modeSeries(t, i, false, s.U, s.V))
			if r.tilt && t.m > 0 {
				s.Modes = append(s.Modes, r.modeSeries(t, i, true, s.U, s.V))
			}
		}
	}
	return s
}

func (r *kerrBound) modeSeries(t *kerrTones, i int, mirrored bool, u, v []float64) result.ModeSeries {
	out := result.ModeSeries{L: lowest(t.m) + i, M: t.m}
	if mirrored {
		out.M = -t.m
	}
	out.Wave, out.WaveErr, out.Evidence = r.toned(t, certify.Infinity, i, mirrored, u)
	out.Horizon, out.HorizonErr, _ = r.toned(t, certify.Horizon, i, mirrored, v)
	return out
}

// toned samples the sum of the tones at one end, with a bar per sample: what the
// rungs leave open, how an earlier window differs, the outermost tones, round-off.
func (r *kerrBound) toned(t *kerrTones, end certify.End, i int, mirrored bool, at []float64) (w []complex128, bar, apart []float64) {
	om, z := r.harmonics(t, t.rates, end, i, mirrored)
	_, zc := r.harmonics(t, t.bars.Coarse, end, i, mirrored)
	_, ze := r.harmonics(t, t.bars.Early, end, i, mirrored)
	w = sumTones(om, z, at)
	apart = make([]float64, len(at))
	bar = make([]float64, len(at))
	early := sumTones(om, ze, at)
	var coarse []complex128
	if zc != nil {
		coarse = sumTones(om, zc, at)
	}
	edge, size, slow := 0.0, 0.0, math.Inf(1)
	for j := range z {
		size += cmplx.Abs(z[j])
		slow = math.Min(slow, math.Abs(om[j]))
		if t.tones.Edge[j] {
			edge += cmplx.Abs(z[j])
		}
	}
	d := r.n.domain.Layers
	points := int((d.So - d.Si) / (r.n.coarsest * math.Pow(certify.Ratio, float64(t.rung))))
	round := certify.RoundOff(points, slow)
	for k := range at {
		disc := cmplx.Abs(w[k])
		if coarse != nil {
			apart[k] = cmplx.Abs(w[k] - coarse[k])
			disc = kerr.Remainder * apart[k]
		}
		bar[k] = disc + cmplx.Abs(w[k]-early[k]) + edge + round*size
	}
	return w, bar, apart
}

// sumTones is SUM_j z_j e^{-i omega_j t}.
func sumTones(omega []float64, z []complex128, at []float64) []complex128 {
	w := make([]complex128, len(at))
	for k, t := range at {
		for j, a := range z {
			w[k] += a * cmplx.Exp(complex(0, -omega[j]*t))
		}
	}
	return w
}
