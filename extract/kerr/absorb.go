package kerr

import (
	"math"
	"math/cmplx"

	"nullmark/hyperboloidal"
)

// Absorption is the flux through the horizon against advanced time: V[k], the
// energy and the angular momentum absorbed per unit v, and their totals.
type Absorption struct {
	V              []float64
	Energy, AngMom []float64
	Total          Rate
}

// Burst returns the absorption of one m from the s = +2 fields at the horizon
// (phi[l][k], sample k at advanced time v0 + k dt), for this sign of m alone,
// after E. Poisson, PRD 70, 084044 (2004). With kap = sqrt(1-a^2)/(2 r+) the
// surface gravity and
//
//	psi~ = Phi e^{i m Omega_H v} / (4 r+ (2 r+)^2),
//	dsigma/dv = kap sigma + psi~       (integrated backwards: sigma -> 0 late),
//	dE/dv = (2 r+/4 pi) sum_l [ |dF/dv|^2 + m Omega_H Im(conj(dF/dv) F) ],
//	dL/dv = (2 r+/4 pi) sum_l m Im(conj(dF/dv) F),   dF/dv = sigma,
//
// in the frame that turns with the horizon. The series must begin when the
// start-up has died away and the tide is still slow. The fields must have died away at
// the last sample; what is left there bounds the error.
func Burst(h hyperboloidal.Kerr, m int, phi [][]complex128, v0, dt float64) Absorption {
	n := len(phi[0])
	rp := h.OuterHorizon()
	kap := h.Eccentre() / (2 * rp)
	om := h.HorizonFrequency()
	out := Absorption{V: make([]float64, n), Energy: make([]float64, n), AngMom: make([]float64, n)}
	psi, sigma := make([]complex128, n), make([]complex128, n)
	for l := range phi {
		for k := range psi {
			v := v0 + float64(k)*dt
			out.V[k] = v
			psi[k] = phi[l][k] * cmplx.Exp(complex(0, float64(m)*om*v)) / complex(4*rp*4*rp*rp, 0)
		}
		shear(sigma, psi, kap, dt)
		f := integral(sigma, dt)
		// What F was when the series begins: there sigma is a slow tide seen from
		// the turning horizon, an oscillation whose integral is sigma^2/sigma'.
		if rate := complex(kap, 0)*sigma[0] + psi[0]; rate != 0 {
			f0 := sigma[0] * sigma[0] / rate
			for k := range f {
				f[k] += f0
			}
		}
		for k, s := range sigma {
			g := float64(m) * imag(cmplx.Conj(s)*f[k])
			out.Energy[k] += 2 * rp / (4 * math.Pi) * (real(s)*real(s) + imag(s)*imag(s) + om*g)
			out.AngMom[k] += 2 * rp / (4 * math.Pi) * g
		}
	}
	out.Total = Rate{trapezoid(out.Energy, dt), trapezoid(out.AngMom, dt)}
	return out
}

// shear solves sigma' = kap sigma + psi backwards in time from sigma = 0 at the
// end, stepping with the exact exponential and a polynomial of degree 7 through
// the eight samples around each step.
func shear(sigma, psi []complex128, kap, dt float64) {
	n := len(psi)
	clear(sigma)
	w := exponentialWeights(-kap * dt)
	decay := complex(math.Exp(-kap*dt), 0)
	for k := n - 2; k >= 0; k-- {
		// sigma(k) = e^{-kap dt} sigma(k+1) - dt int_0^1 e^{-kap dt x} psi(k+x) dx
		lo := min(max(k-3, 0), n-8)
		var s complex128
		for j, c := range w[k-lo] {
			s += complex(c, 0) * psi[lo+j]
		}
		sigma[k] = decay*sigma[k+1] - complex(dt, 0)*s
	}
}

// integral returns the running integral of f with the same polynomials.
func integral(f []complex128, dt float64) []complex128 {
	n := len(f)
	out := make([]complex128, n)
	w := exponentialWeights(0)
	for k := range n - 1 {
		lo := min(max(k-3, 0), n-8)
		var s complex128
		for j, c := range w[k-lo] {
			s += complex(c, 0) * f[lo+j]
		}
		out[k+1] = out[k] + complex(dt, 0)*s
	}
	return out
}

// exponentialWeights returns, for each place p = 0..6 of the step among eight
// nodes, the weights c_j of int_0^1 e^{q x} f(p+x) dx = sum_j c_j f(j).
func exponentialWeights(q float64) [7][8]float64 {
	var out [7][8]float64
	// Gauss–Legendre with 8 nodes integrates degree 7 times the exponential of
	// a small argument to round-off.
	x := [4]float64{0.1834346424956498, 0.5255324099163290, 0.7966664774136267, 0.9602898564975363}
	w := [4]float64{0.3626837833783620, 0.3137066458778873, 0.2223810344533745, 0.1012285362903763}
	for p := range out {
		for i := range x {
			for _, s := range []float64{-1, 1} {
				t := 0.5 * (1 + s*x[i])
				g := 0.5 * w[i] * math.Exp(q*t)
				for j := range out[p] {
					l := 1.0
					for k := range 8 {
						if k != j {
							l *= (float64(p) + t - float64(k)) / float64(j-k)
						}
					}
					out[p][j] += g * l
				}
			}
		}
	}
	return out
}

func trapezoid(f []float64, dt float64) float64 {
	s := 0.0
	for k := range f {
		if k == 0 || k == len(f)-1 {
			s += 0.5 * f[k]
		} else {
			s += f[k]
		}
	}
	return s * dt
}

// Spectral returns the total absorbed by one m (this sign alone) from the s = -2
// fields at the horizon of a burst, phi[l][k] at advanced time v0 + k dt with
// l = max(2,|m|) + l index: the energy per frequency of Spheroidal.Horizon,
// integrated over both signs of frequency up to most. The series is multiplied by
// a smooth window that rises and falls over its first and last quarter; it serves
// orbits that come from and return to where nothing is absorbed. It returns an
// error when a spheroidal problem fails.
func Spectral(h hyperboloidal.Kerr, m int, phi [][]complex128, v0, dt, most float64) (Rate, error) {
	n := len(phi[0])
	length := float64(n-1) * dt
	step := math.Pi / length // half the spacing of independent frequencies
	count := int(most / step)
	window := make([]float64, n)
	for k := range window {
		window[k] = rise(4*float64(k)/float64(n-1)) * rise(4*float64(n-1-k)/float64(n-1))
	}
	z := make([]complex128, len(phi))
	var sum Rate
	for j := -count; j <= count; j++ {
		w := (float64(j) + 0.5) * step
		turn := cmplx.Exp(complex(0, w*dt))
		for l := range phi {
			// Horner in e^{i w dt}, backwards
			var s complex128
			for k := n - 1; k >= 0; k-- {
				s = s*turn + complex(window[k], 0)*phi[l][k]
			}
			z[l] = s * complex(dt, 0) * cmplx.Exp(complex(0, w*v0))
		}
		sp, err := NewSpheroidal(h, m, len(phi), w)
		if err != nil {
			return Rate{}, err
		}
		r := Sum(sp.Horizon(z))
		sum.Energy += r.Energy * step / (2 * math.Pi)
		sum.AngularMomentum += r.AngularMomentum * step / (2 * math.Pi)
	}
	return sum, nil
}

// rise goes smoothly from 0 at x <= 0 to 1 at x >= 1.
func rise(x float64) float64 {
	if x <= 0 {
		return 0
	}
	if x >= 1 {
		return 1
	}
	return 1 / (1 + math.Exp(1/x-1/(1-x)))
}
