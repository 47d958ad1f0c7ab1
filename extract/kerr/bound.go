package kerr

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/certify"
	"nullmark/hyperboloidal"
)

// Tones are the frequencies m Omega_phi + n Omega_r + k Omega_theta of a bound
// orbit at one m with |n|/(NR+1) + |k|/(NTheta+1) < 1 (amplitudes fall with both,
// and a smaller set is easier to tell apart), the zero frequency left out. Edge
// marks the outermost ones.
type Tones struct {
	M     int
	Omega []float64
	N, K  []int // of each tone
	Edge  []bool
}

// NewTones lists the tones; nr = 0 for circular orbits, ntheta = 0 for equatorial
// ones.
func NewTones(m int, omegaPhi, omegaR, omegaTheta float64, nr, ntheta int) Tones {
	t := Tones{M: m}
	scale := math.Abs(omegaPhi)
	inside := func(n, k int) bool {
		return float64(max(n, -n))/float64(nr+1)+float64(max(k, -k))/float64(ntheta+1) < 1-1e-12
	}
	for n := -nr; n <= nr; n++ {
		for k := -ntheta; k <= ntheta; k++ {
			w := float64(m)*omegaPhi + float64(n)*omegaR + float64(k)*omegaTheta
			if !inside(n, k) || math.Abs(w) < 1e-9*scale {
				continue
			}
			t.Omega = append(t.Omega, w)
			t.N, t.K = append(t.N, n), append(t.K, k)
			t.Edge = append(t.Edge, nr > 0 && !inside(max(n, -n)+1, k) || ntheta > 0 && !inside(n, max(k, -k)+1))
		}
	}
	return t
}

// Closest returns the smallest distance between two tones: a window of five
// times 2 pi over it tells all of them apart by itself, one of a fifth of that
// leaves the work to the normal equations.
func (t Tones) Closest() float64 {
	d := math.Inf(1)
	for i, a := range t.Omega {
		for _, b := range t.Omega[:i] {
			d = math.Min(d, math.Abs(a-b))
		}
	}
	return d
}

// Rates are the fluxes of one m (this sign alone) of a bound orbit: by spherical
// l at infinity, by spheroidal l at the horizon, the tones summed. Edge is the
// fraction of the energy in the outermost tones at each end: what lies beyond
// them is smaller still.
type Rates struct {
	Infinity, Horizon         []Rate
	EdgeInfinity, EdgeHorizon float64
	// Z[end][i][j] is the amplitude of Phi of spherical l = LMin + i in tone j,
	// e^{-i omega tau}, infinity first.
	Z [2][][]complex128

	// of each tone by end, l and tone: |part|^2 is the size of its energy
	part [2][][]complex128
	spin []float64 // angular momentum over energy
}

// Sum adds the rates of all l.
func Sum(r []Rate) Rate {
	var s Rate
	for _, x := range r {
		s.Energy += x.Energy
		s.AngularMomentum += x.AngularMomentum
	}
	return s
}

// BoundRates reads the rates from the samples of l = LMin + i with the window
// [until-length, until] in slicing time.
func BoundRates(h hyperboloidal.Kerr, t Tones, samples []certify.Samples, until, length float64) (*Rates, error) {
	n := len(samples)
	var z [2][][]complex128
	fit, err := NewFit(len(samples[0].Psi[0]), 0, samples[0].Dt, until-length, length, t.Omega)
	if err != nil {
		return nil, err
	}
	for end := range z {
		z[end] = make([][]complex128, n)
		for l := range n {
			z[end][l] = make([]complex128, len(t.Omega))
			fit.Read(z[end][l], samples[l].Psi[end])
		}
	}
	out := &Rates{Infinity: make([]Rate, n), Horizon: make([]Rate, n), Z: z}
	for end := range out.part {
		out.part[end] = make([][]complex128, n)
		for l := range n {
			out.part[end][l] = make([]complex128, len(t.Omega))
		}
	}
	size := func(a complex128, energy float64) complex128 {
		if a == 0 {
			return 0
		}
		return a * complex(math.Sqrt(math.Abs(energy))/cmplx.Abs(a), 0)
	}
	var all, edge [2]float64
	phi := make([]complex128, n)
	for j, w := range t.Omega {
		count := func(end certify.End, into []Rate, l int, r Rate) {
			into[l].Energy += r.Energy
			into[l].AngularMomentum += r.AngularMomentum
			all[end] += math.Abs(r.Energy)
			if t.Edge[j] {
				edge[end] += math.Abs(r.Energy)
			}
		}
		sp, err := NewSpheroidal(h, t.M, n, w)
		if err != nil {
			return nil, err
		}
		for l := range n {
			r := Infinity(t.M, w, z[certify.Infinity][l][j])
			count(certify.Infinity, out.Infinity, l, r)
			out.part[certify.Infinity][l][j] = size(z[certify.Infinity][l][j], r.Energy)
			phi[l] = z[certify.Horizon][l][j]
		}
		for l, r := range sp.Horizon(phi) {
			count(certify.Horizon, out.Horizon, l, r)
			out.part[certify.Horizon][l][j] = size(sp.Project(l, phi), r.Energy)
		}
		out.spin = append(out.spin, math.Abs(float64(t.M)/w))
	}
	out.EdgeInfinity, out.EdgeHorizon = edge[0]/all[0], edge[1]/all[1]
	return out, nil
}

// edge is the fraction of the energy of l in the outermost tones.
func (r *Rates) edge(t Tones, end certify.End, l int) float64 {
	var all, outer float64
	for j, a := range r.part[end][l] {
		e := real(a)*real(a) + imag(a)*imag(a)
		all += e
		if t.Edge[j] {
			outer += e
		}
	}
	if all == 0 {
		return 0
	}
	return outer / all
}

// Remainder is the part of the change between two rungs that bounds what is left
// in the finer one of a moving particle: that of order 7. On coarse grids orders of
// 8 are seen where the scheme's is 12 (0.19 of the change was left in a horizon
// rate of an eccentric orbit at spacings of 0.5 and 0.4).
const Remainder = 0.25

// apart bounds by how much the rates of l differ that two readings with the same
// tones give: 2 SUM_j |A_j| |A_j - B_j| over the tones, which does not vanish where
// a difference of the rates crosses zero.
func (r *Rates) apart(o *Rates, end certify.End, l int) Rate {
	var d Rate
	for j, a := range r.part[end][l] {
		e := 2 * cmplx.Abs(a) * cmplx.Abs(a-o.part[end][l][j])
		d.Energy += e
		d.AngularMomentum += r.spin[j] * e
	}
	return d
}

// BoundBars are the absolute bars of Rates, entry by entry, with the readings
// that they come from: of the coarser rung and of the earlier window.
type BoundBars struct {
	Infinity, Horizon []Rate
	Coarse, Early     *Rates
}

// CertifyBound reads the rates of the finest rung and bounds them: by the
// change of the amplitudes between the two rungs (finest first; a coarser one with fewer l's bars
// the l's that it lacks by their whole value), by the change when the window
// moves back by a fifth of its time, by the outermost tones, and by round-off.
func CertifyBound(h hyperboloidal.Kerr, t Tones, rungs []Rung, until, length float64) (*Rates, *BoundBars, error) {
	if len(rungs) < 2 {
		panic("kerr: a bar wants at least two rungs")
	}
	fine, err := BoundRates(h, t, rungs[0].Samples, until, length)
	if err != nil {
		return nil, nil, err
	}
	coarse, err := BoundRates(h, t, rungs[1].Samples, math.Min(until, rungs[1].Samples[0].Until()), length)
	if err != nil {
		return nil, nil, err
	}
	room := until - length
	if !(room > 0) {
		return nil, nil, fmt.Errorf("kerr: a window of %g does not fit before %g", length, until)
	}
	back := until - math.Min(0.2*length, 0.5*room)
	early, err := BoundRates(h, t, rungs[0].Samples, back, length)
	if err != nil {
		return nil, nil, err
	}
	slow := math.Inf(1)
	for _, w := range t.Omega {
		slow = math.Min(slow, math.Abs(w))
	}
	floor := 2 * certify.RoundOff(rungs[0].Points, slow)
	bars := &BoundBars{Coarse: coarse, Early: early}
	bar := func(end certify.End, a, b, e []Rate) []Rate {
		out := make([]Rate, len(a))
		for l := range a {
			edge := fine.edge(t, end, l)
			one := func(x func(Rate) float64) float64 {
				v := x(a[l])
				d := math.Abs(v)
				if l < len(b) {
					d = Remainder * x(fine.apart(coarse, end, l))
				}
				return d + math.Abs(v-x(e[l])) + math.Abs(v)*(edge+floor)
			}
			out[l] = Rate{one(func(r Rate) float64 { return r.Energy }), one(func(r Rate) float64 { return r.AngularMomentum })}
		}
		return out
	}
	bars.Infinity = bar(certify.Infinity, fine.Infinity, coarse.Infinity, early.Infinity)
	bars.Horizon = bar(certify.Horizon, fine.Horizon, coarse.Horizon, early.Horizon)
	return fine, bars, nil
}
