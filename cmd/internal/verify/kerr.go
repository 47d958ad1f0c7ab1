package verify

import (
	_ "embed"
	"encoding/json"
	"fmt"
	"math"

	"nullmark/extract/result"
)

const groupKerr = "Kerr"

// kerrReference is the table of circular equatorial orbits on Kerr, computed for
// this project in the frequency domain by a program that shares nothing with
// this one; its origin stands in the file.
//
//go:embed published/circular_kerr.json
var kerrReference []byte

// kerrOrbit is one orbit of that table. Fluxes count m and -m together.
type kerrOrbit struct {
	A, R0      float64
	Spheroidal []struct {
		L, M int
		E    float64 `json:"energy_horizon"`
	}
	Spherical []struct {
		L, M   int
		Strain [2]float64
	}
	PerM []struct {
		M     int
		Value float64
	} `json:"per_m_energy_infinity"`
}

// referenceKerr reads an orbit from the table; it panics where that lacks it.
func referenceKerr(a, r0 float64) kerrOrbit {
	var table struct{ Orbits []kerrOrbit }
	if err := json.Unmarshal(kerrReference, &table); err != nil {
		panic(fmt.Sprintf("verify: the embedded table of Kerr orbits: %v", err))
	}
	for _, o := range table.Orbits {
		if o.A == a && o.R0 == r0 {
			return o
		}
	}
	panic(fmt.Sprintf("verify: the embedded table has no Kerr orbit at %v, %v", a, r0))
}

func kerrFrequencyDomain() Source {
	return Source{"frequency domain", "computed for this project independently in the frequency domain " +
		"(Teukolsky s = -2, series solutions in 110 to 260 bits, cross-checked with s = +2): published/circular_kerr.json"}
}

func secondOpinion() Source {
	return Source{"second opinion", "this tool's own frequency-domain solver, which shares the source's formulas with the evolution " +
		"and neither slicing, grid, kernel, stepping nor demodulation; the tolerance is one number in ten"}
}

func kerrPostNewtonian() Source {
	return Source{"Tagoshi+ 1996", "H. Tagoshi, M. Shibata, T. Tanaka, M. Sasaki, Phys. Rev. D 54, 1439 (1996), read in M. Sasaki & H. Tagoshi, " +
		"Living Rev. Relativity 6, 6 (2003); the tolerance is the size of the term v^9 without spin"}
}

func kerrAbsorption() Source {
	return Source{"Tagoshi+ 1997", "H. Tagoshi, S. Mano, E. Takasugi, Prog. Theor. Phys. 98, 829 (1997), read in M. Sasaki & H. Tagoshi, " +
		"Living Rev. Relativity 6, 6 (2003), eq. 196; the tolerance, twice the last known coefficient at the next power, v^9, was set after the difference was known: it shows consistency, and the power of the residual is what a test holds"}
}

// kerrCase is a circular equatorial orbit on Kerr.
func kerrCase(a, r0 float64, waves, relative string) Case {
	return Case{"circular.yaml", []string{fmt.Sprintf("hole.spin=%v", a), fmt.Sprintf("orbit.radius=%v", r0), "waves.equation=teukolsky", waves, "accuracy.relative=" + relative}}
}

func ofPerM(m int, pick func(*result.PerM) *result.Flux) func([]*result.Result) (result.Q, error) {
	return func(r []*result.Result) (result.Q, error) {
		for i := range r[0].PerM {
			if p := &r[0].PerM[i]; p.M == m {
				if q, ok := energy(pick(p)); ok {
					return q, nil
				}
			}
		}
		return result.Q{}, fmt.Errorf("the result has no sum over l at m = %d", m)
	}
}

func kerrChecks() []Check {
	var all []Check
	ref := referenceKerr(0.9, 6)
	near := []Case{kerrCase(0.9, 6, "waves.modes=[[2,2],[2,1],[3,3]]", "1e-6")}
	for _, p := range ref.PerM {
		if p.M <= 3 {
			all = append(all, Check{groupKerr, fmt.Sprintf("m = %d, all l, energy, infinity, a = 0.9, r0 = 6", p.M), kerrFrequencyDomain(),
				p.Value, referenceDigits * p.Value, false, near, ofPerM(p.M, func(p *result.PerM) *result.Flux { return p.Infinity })})
		}
	}
	for _, s := range ref.Spheroidal {
		if s.L == 2 || s.L == 3 && s.M == 3 {
			all = append(all, Check{groupKerr, fmt.Sprintf("(%d,%d) energy, horizon, a = 0.9, r0 = 6", s.L, s.M), kerrFrequencyDomain(),
				s.E, referenceDigits * math.Abs(s.E), false, near, ofMode(s.L, s.M, energyHorizon)})
		}
	}
	for _, s := range ref.Spherical {
		if s.L == 2 || s.L == 3 && s.M == 3 {
			a := math.Hypot(s.Strain[0], s.Strain[1])
			all = append(all,
				Check{groupKerr, fmt.Sprintf("(%d,%d) strain amplitude, a = 0.9, r0 = 6", s.L, s.M), kerrFrequencyDomain(),
					a, referenceDigits * a, false, near, ofMode(s.L, s.M, amplitude)},
				Check{groupKerr, fmt.Sprintf("(%d,%d) strain phase (rad), a = 0.9, r0 = 6", s.L, s.M), kerrFrequencyDomain(),
					math.Atan2(s.Strain[1], s.Strain[0]), referenceDigits, false, near, ofMode(s.L, s.M, phase)})
		}
	}
	agree := func(r []*result.Result) (result.Q, error) {
		inside := 0
		for _, o := range r[0].SecondOpinion {
			if o.InBars <= 1 {
				inside++
			}
		}
		if len(r[0].SecondOpinion) == 0 {
			return result.Q{}, fmt.Errorf("the result holds no second opinion")
		}
		return result.Q{Value: float64(inside) / float64(len(r[0].SecondOpinion))}, nil
	}
	all = append(all,
		Check{groupKerr, "share of numbers inside both bars, a = 0.9, r0 = 6", secondOpinion(), 1, 0.1, false, near, agree},
		Check{groupKerr, "share of numbers inside both bars, a = -0.9, r0 = 10", secondOpinion(), 1, 0.1, true,
			[]Case{kerrCase(-0.9, 10, "waves.l_max=3", "1e-8")}, agree})
	const a, r0 = 0.9, 20.0
	v := math.Pow(1/(math.Pow(r0, 1.5)+a), 1./3)
	far := []Case{kerrCase(a, r0, "waves.l_max=5", "1e-6")}
	series, next := KerrSeries(a, v)
	hor, beyond := KerrAbsorption(a, v)
	all = append(all,
		Check{groupKerr, "flux/quadrupole, infinity, a = 0.9, r0 = 20", kerrPostNewtonian(), series, next, true, far,
			ofTotal(func(t *result.Total) (result.Q, bool) {
				q, ok := energy(t.Infinity)
				return scaled(q, quadrupole(v)), ok
			})},
		Check{groupKerr, "horizon flux/quadrupole, a = 0.9, r0 = 20", kerrAbsorption(), hor, beyond, true, far,
			ofTotal(func(t *result.Total) (result.Q, bool) {
				q, ok := energy(t.Horizon)
				return scaled(q, quadrupole(v)), ok
			})})
	return all
}

// KerrSeries returns the energy flux at infinity of a test particle on a circular
// equatorial orbit around a hole of spin q, divided by (32/5) v^10, v = Omega^(1/3),
// through v^8, and the size of the term v^9 without spin.
//
// H. Tagoshi, M. Shibata, T. Tanaka, M. Sasaki, Phys. Rev. D 54, 1439 (1996), the
// spin's part; the rest as in Series.
func KerrSeries(q, v float64) (flux, next float64) {
	const pi = math.Pi
	q2 := q * q
	spin := [9]float64{
		3: -11. / 4 * q,
		4: 33. / 16 * q2,
		5: -59. / 16 * q,
		6: -65./6*pi*q + 611./504*q2,
		7: 162035./3888*q + 65./8*pi*q2 - 71./24*q*q2,
		8: -359./14*pi*q + 22667./4536*q2 + 17./16*q2*q2,
	}
	for k := len(spin) - 1; k >= 0; k-- {
		flux = flux*v + spin[k]
	}
	return flux + Truncated(v, 8), math.Abs(seriesCoefficients(v)[9]) * math.Pow(v, 9)
}

// KerrAbsorption returns the energy flux through the horizon for the same orbit,
// divided by (32/5) v^10: v^5 times a polynomial through v^3, with
// B2 = Im psi(3 + 2 i q/sqrt(1-q^2)). The spin must not be 0. next is twice the
// last known coefficient at the next power, v^9: the size that the missing terms
// may have when the coefficients go on as they do.
//
// H. Tagoshi, S. Mano, E. Takasugi, Prog. Theor. Phys. 98, 829 (1997); M. Sasaki &
// H. Tagoshi, Living Rev. Relativity 6, 6 (2003), eq. 196.
func KerrAbsorption(q, v float64) (value, next float64) {
	k := math.Sqrt((1 - q) * (1 + q))
	y := 2 * q / k
	// Im psi(1+iy) = -1/(2y) + (pi/2) coth(pi y), then psi(z+1) = psi(z) + 1/z.
	b2 := -1/(2*y) + math.Pi/2/math.Tanh(math.Pi*y) - y/(1+y*y) - y/(4+y*y)
	q2, q3 := q*q, q*q*q
	c3 := 2*q*b2 + 0.5 + 6.5*k*q2 + 35./6*q2 - q2*q2/4 + k/2 + 3*q2*q2*k + 6*q3*b2
	return math.Pow(v, 5) * (-q/4 - 3*q3/4 + (-q-33./16*q3)*v*v + c3*v*v*v), 2 * math.Abs(c3) * math.Pow(v, 9)
}
