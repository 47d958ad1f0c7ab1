package wire

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/configs"
	"nullmark/extract/certify"
	"nullmark/extract/strain"
	"nullmark/source/worldline"
)

// radiated is what a mode sends to infinity outside the evolved range, per sign
// of m and without the factor (l+2)!/(l-2)!/(64 pi), with absolute bars.
type radiated struct{ power, powerBar, spin, spinBar float64 }

// openEnds says at which ends of the counted range an orbit comes from, or goes
// to, infinity.
func openEnds(c *configs.Case) (before, after bool) {
	switch c.Orbit.Kind {
	case configs.Infall:
		return math.IsInf(c.Orbit.From, 1), false
	case configs.Scatter:
		return true, true
	}
	return false, false
}

// beyond estimates what mode m radiates before (side -1) or after (side +1) the
// counted range, while the particle is far away. There a mode's power goes like
//
//	P = P1 (r1/r)^k (p/p1)^2,
//
// r and p = u^r of the particle that is seen at retarded time u: k = 4 for l = 2
// (the Newtonian quadrupole of radial motion, whose third derivative is
// proportional to rdot/r^2; k -> 5 where rdot^2 -> 2/r), and a slowly changing
// number for the others. k is measured at the end of the range; the integral over
//
//	du = (E/p -+ 1)/f dr
//
// is carried on along the geodesic to infinity. The bar is what the change of k
// between the last two stretches would make, carried on, plus 2 % and what the
// start-up may have left in P1. Angular momentum is treated alike with the power
// of its own flux.
func (r *burstRun) beyond(m *ladder, s *certify.Samples, side float64) radiated {
	var st worldline.State
	r.path.At(r.event, &st)
	centre := r.event - math.Max(st.Rstar, 0)
	end := r.after
	if side > 0 {
		end = r.n.domain.Retarded(r.ends) - 1
	}
	reach := math.Abs(end - centre)
	var at [3]point
	for i, x := range []float64{0.98, 0.84, 0.72} {
		at[i] = r.pointAt(s, centre+side*x*reach, 0.02*reach)
	}
	noise := 0.0
	if side < 0 {
		noise = r.starts[m].density(certify.Infinity, end+r.n.domain.So, 0.1*reach)
	}
	g := geodesicOf{st.E, st.L}
	power, powerBar := g.carry(side, r.radiusAt(end), [3]float64{at[0].power, at[1].power, at[2].power}, at, 2*math.Sqrt(at[0].power*noise)+noise)
	out := radiated{power: power, powerBar: powerBar}
	if m.m != 0 {
		out.spin, out.spinBar = g.carry(side, r.radiusAt(end), [3]float64{at[0].spin, at[1].spin, at[2].spin}, at, at[0].field*math.Sqrt(noise))
	}
	return out
}

// point is a mode's mean power and angular momentum around a retarded time, with
// the radius of the particle that is seen then.
type point struct{ radius, power, spin, field float64 }

func (r *burstRun) pointAt(s *certify.Samples, u, half float64) point {
	const n = 16
	taus := make([]float64, 2*n+1)
	for i := range taus {
		taus[i] = u + half*float64(i-n)/n + r.n.domain.So
	}
	psi := strain.Resample(s.Psi[certify.Infinity], 0, s.Dt, taus)
	pi := strain.Resample(s.Pi[certify.Infinity], 0, s.Dt, taus)
	p := point{radius: r.radiusAt(u)}
	for i := range pi {
		p.power += real(pi[i] * cmplx.Conj(pi[i]))
		p.spin += imag(psi[i] * cmplx.Conj(pi[i]))
		p.field += cmplx.Abs(psi[i])
	}
	k := float64(len(pi))
	p.power, p.spin, p.field = p.power/k, p.spin/k, p.field/k
	return p
}

// radiusAt is the particle's radius where t - r_* = u.
func (r *burstRun) radiusAt(u float64) float64 {
	var s worldline.State
	lo, hi := r.path.Span()
	hi = math.Min(hi, r.ends+2000)
	for range 80 {
		t := (lo + hi) / 2
		r.path.At(t, &s)
		if t-s.Rstar < u {
			lo = t
		} else {
			hi = t
		}
	}
	return s.R
}

// geodesicOf is a geodesic far away.
type geodesicOf struct{ e, l float64 }

func (g geodesicOf) radial(r float64) float64 {
	f := 1 - 2/r
	return math.Sqrt(math.Max(g.e*g.e-f*(1+g.l*g.l/(r*r)), 1e-12))
}

// carry integrates a flux, known as v at three points, from the radius end to
// infinity.
func (g geodesicOf) carry(side, end float64, v [3]float64, at [3]point, noise float64) (value, bar float64) {
	r1 := at[0].radius
	// The integral of (r1/r)^k (p/p1)^2 du from the end of the range on, in
	// y = r1/r; r1 lies a little inside that end.
	whole := func(k float64) float64 {
		const n = 400
		p1 := g.radial(r1)
		top := r1 / end
		sum := 0.0
		for i := range n {
			y := top * (float64(i) + 0.5) / n
			r := r1 / y
			p := g.radial(r)
			sum += math.Pow(y, k-2) * (p / p1) * (p / p1) * (g.e/p - side) / (1 - 2/r)
		}
		return sum * top * r1 / n
	}
	slope := func(i, j int) float64 {
		a, b := at[i].radius, at[j].radius
		w := g.radial(b) / g.radial(a)
		return math.Log(v[j]/v[i]/(w*w)) / math.Log(a/b)
	}
	k, before := slope(0, 1), slope(1, 2)
	// Where no power is seen, or the start-up rules, the slowest fall that a
	// particle far away makes bounds the rest.
	const slowest = 3
	if !(k > slowest && k < 12) || !(before > slowest-1 && before < 14) || noise > 0.3*math.Abs(v[0]) {
		return 0, (math.Abs(v[0]) + noise) * whole(slowest)
	}
	value = v[0] * whole(k)
	drift := 2 * math.Abs(k-before)
	low, high := math.Max(k-drift, slowest), k+drift
	bar = math.Abs(v[0])*math.Max(math.Abs(whole(low)-whole(k)), math.Abs(whole(high)-whole(k))) + 0.02*math.Abs(value) + noise*whole(k)
	return value, bar
}

// density is the mean of |difference of Psi_tau|^2 that a later switch-on makes
// over a stretch from slice tau on.
func (j junkSeries) density(e certify.End, tau, stretch float64) float64 {
	rest := j.rest[e]
	a := max(0, min(int(tau/j.dt)-1, len(rest)-1))
	b := max(a+1, min(int((tau+stretch)/j.dt), len(rest)-1))
	if b >= len(rest) {
		return 0
	}
	return (rest[a] - rest[b]) / (float64(b-a) * j.dt)
}

// rangeWords says which part of the motion the totals hold.
func (r *burstRun) rangeWords() string {
	u0, u1 := r.after, r.n.domain.Retarded(r.ends)-1
	s := fmt.Sprintf("radiated energy and angular momentum from u = %.6g to u = %.6g", u0+r.origin, u1+r.origin)
	switch {
	case r.open[0] && r.open[1]:
		return s + "; what the particle radiates at infinity before and after, far away, is estimated from the fall of the flux at both ends, included, and has a bar"
	case r.open[0]:
		return s + "; what the particle radiates at infinity before, far away, is estimated from the growth of the flux there, included, and has a bar"
	}
	return s + " and nothing from before or after it"
}

// outside is the sum of what both open ends add.
func (r *burstRun) outside(m *ladder, s *certify.Samples) radiated {
	var sum radiated
	for i, side := range []float64{-1, 1} {
		if !r.open[i] {
			continue
		}
		b := r.beyond(m, s, side)
		sum.power, sum.powerBar = sum.power+b.power, sum.powerBar+b.powerBar
		sum.spin, sum.spinBar = sum.spin+b.spin, sum.spinBar+b.spinBar
	}
	return sum
}
