package kerr

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/certify"
	"nullmark/hyperboloidal"
)

// Rung holds what one evolution of one m left behind: the samples of
// l = LMin + i, and the count of grid points.
type Rung struct {
	Samples []certify.Samples
	Points  int
}

// Amplitude is a complex amplitude with its relative bar.
type Amplitude struct {
	L   int
	Z   complex128
	Bar certify.Budget
}

// Certified are the certified amplitudes of one m of a circular equatorial
// orbit: r psi4 by spherical l at null infinity (e^{-i omega u}), Phi by
// spheroidal l at the horizon (e^{-i omega v}).
type Certified struct {
	M          int
	Omega      float64
	Infinity   []Amplitude
	Horizon    []Amplitude
	Spheroidal *Spheroidal
}

// order is that of the scheme: its differences rule, the kernel's moments do not.
const order = 12

// settled is the part of the transient bar at infinity that psi4 needs: it was
// 3.7 times the error or more in 56 amplitudes of both reference orbits, because
// psi4 has two derivatives on the fields that the bar was made for.
const settled = 0.6

// Labels ties slicing time to the labels of the two ends: u = tau - So, v = tau + Si.
type Labels struct{ Si, So float64 }

// Certify reads the rungs of one m (finest first, at least two; a coarser one
// should carry fewer l's, which then count into the bar) with windows of the
// given power that end at until. Amplitudes of l's that a coarser rung does not
// carry get the bar of the whole amplitude.
func Certify(h hyperboloidal.Kerr, tone certify.Tone, at Labels, rungs []Rung, until float64, power int) (*Certified, error) {
	if len(rungs) < 2 {
		panic("kerr: a bar wants at least two rungs")
	}
	n := len(rungs[0].Samples)
	c := &Certified{M: tone.M, Omega: tone.Omega}
	var err error
	if c.Spheroidal, err = NewSpheroidal(h, tone.M, n, tone.Omega); err != nil {
		return nil, err
	}
	lmin := c.Spheroidal.LMin
	c.Infinity = make([]Amplitude, n)
	c.Horizon = make([]Amplitude, n)
	for i := range n {
		tone.L = lmin + i
		series := func(r Rung, end certify.End) *certify.Samples {
			if i >= len(r.Samples) {
				return nil
			}
			if end == certify.Infinity {
				return &r.Samples[i]
			}
			return combine(c.Spheroidal, i, r.Samples)
		}
		for _, end := range []certify.End{certify.Infinity, certify.Horizon} {
			a, err := certified(tone, end, rungs, series, until, power)
			if err != nil {
				return nil, fmt.Errorf("l = %d, m = %d: %w", tone.L, tone.M, err)
			}
			if end == certify.Infinity {
				a.Z *= cmplx.Exp(complex(0, -tone.Omega*at.So))
				c.Infinity[i] = a
			} else {
				a.Z *= cmplx.Exp(complex(0, tone.Omega*at.Si))
				c.Horizon[i] = a
			}
		}
	}
	return c, nil
}

func certified(tone certify.Tone, end certify.End, rungs []Rung, series func(Rung, certify.End) *certify.Samples, until float64, power int) (Amplitude, error) {
	a := Amplitude{L: tone.L}
	var z []complex128
	for k, r := range rungs {
		s := series(r, end)
		if s == nil {
			break
		}
		t := math.Min(until, s.Until())
		rd, err := certify.Read(s, end, tone, t, power)
		if err != nil {
			return a, err
		}
		if k == 0 {
			a.Z = rd.Z
			a.Bar.Transient = rd.Transient(end, tone, t)
			if end == certify.Infinity {
				a.Bar.Transient *= settled
			}
			a.Bar.RoundOff = certify.RoundOff(r.Points, tone.Omega)
		}
		z = append(z, rd.Z)
	}
	if len(z) < 2 {
		a.Bar.Discretisation = 1
	} else {
		a.Bar.Discretisation = certify.Discretisation(z, order)
	}
	return a, nil
}

// combine returns the series of spheroidal mode k at the horizon; l's that the
// samples lack count as zero.
func combine(s *Spheroidal, k int, in []certify.Samples) *certify.Samples {
	out := &certify.Samples{Dt: in[0].Dt}
	n := len(in[0].Psi[certify.Horizon])
	psi, pi := make([]complex128, n), make([]complex128, n)
	for l := range in {
		b := complex(s.vectors.At(l, k), 0)
		for t := range n {
			psi[t] += b * in[l].Psi[certify.Horizon][t]
			pi[t] += b * in[l].Pi[certify.Horizon][t]
		}
	}
	out.Psi[certify.Horizon], out.Pi[certify.Horizon] = psi, pi
	out.Psi[certify.Infinity], out.Pi[certify.Infinity] = psi, pi // Until looks at the first
	return out
}

// Rate returns the flux with both signs of m of entry i at infinity, and the
// bar of its energy relative to it.
func (c *Certified) Rate(i int) (Rate, float64) {
	a := c.Infinity[i]
	r := Infinity(c.M, c.Omega, a.Z)
	return Rate{2 * r.Energy, 2 * r.AngularMomentum}, 2 * a.Bar.Bar()
}

// Absorbed returns the same at the horizon, for spheroidal mode i.
func (c *Certified) Absorbed(i int) (Rate, float64) {
	a := c.Horizon[i]
	z := cmplx.Abs(a.Z) / c.Spheroidal.Hole.OuterHorizon()
	e := 2 * c.Spheroidal.Alpha(i) * z * z / (4 * math.Pi * c.Omega * c.Omega)
	return Rate{e, e * float64(c.M) / c.Omega}, 2 * a.Bar.Bar()
}
