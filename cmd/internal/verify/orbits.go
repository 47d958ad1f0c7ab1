package verify

import (
	"encoding/json"
	"fmt"
	"math"

	"nullmark/extract/result"
)

func eccentricSource() Source {
	return Source{"frequency domain, e > 0", "computed for this project independently in the frequency domain: p = 7.50478, e = 0.188917, " +
		"published/eccentric_schwarzschild.json; the tolerance is half a unit of the last printed digit"}
}

func cutlerKennefickPoisson() Source {
	return Source{"Cutler+ 1994", "C. Cutler, D. Kennefick, E. Poisson, Phys. Rev. D 50, 3816 (1994), p = 7.50478, e = 0.188917: " +
		"energy and angular momentum at infinity, from memory; the tolerance is the distance to R. Fujita, W. Hikida, H. Tagoshi, Prog. Theor. Phys. 121, 843 (2009)"}
}

func infallSource() Source {
	return Source{"frequency domain, infall", "computed for this project independently in the frequency domain: energy in l = 2 of the fall from rest at infinity, published/infall.json"}
}

func davis() Source {
	return Source{"Davis+ 1971", "M. Davis, R. Ruffini, W. H. Press, R. H. Price, Phys. Rev. Lett. 27, 1466 (1971): total energy 0.0104, from memory; half a unit of the last digit"}
}

func merger() Source {
	return Source{"Barausse+ 2012", "E. Barausse et al., Phys. Rev. D 85, 024046 (2012): merger of a test-mass inspiral, a = 0, from memory; the tolerance of 0.5 % allows for the mass ratio"}
}

func kicks() Source {
	return Source{"kicks 2010-2022", "the literature of 2010 to 2022, from memory and one abstract: 0.0446 to 0.0467 for the kick of the plunge; the tolerance is half that range and 5 %"}
}

// orbitChecks: orbits that are not circular.
func orbitChecks() []Check {
	var all []Check
	ref := eccentricTable()
	eccentric := Case{"eccentric.yaml", []string{"waves.l_max=3", "accuracy.relative=1e-7"}}
	add := func(name string, n json.Number, ours func([]*result.Result) (result.Q, error), kase Case, slow bool) {
		v, half := cited(n)
		all = append(all, Check{groupOrbits, name, eccentricSource(), v, half, slow, []Case{kase}, ours})
	}
	for _, lm := range [][2]int{{2, 2}, {2, 1}, {3, 3}} {
		l, m := lm[0], lm[1]
		row := ref.mode(l, m)
		add(fmt.Sprintf("(%d,%d) energy, infinity, e = 0.19", l, m), row.EnergyInfinity, ofMode(l, m, energyInfinity), eccentric, false)
		add(fmt.Sprintf("(%d,%d) energy, horizon, e = 0.19", l, m), row.EnergyHorizon, ofMode(l, m, energyHorizon), eccentric, false)
	}
	full := Case{"eccentric.yaml", []string{"waves.l_max=8", "accuracy.relative=1e-7"}}
	totalOf := func(q func(*result.Total) result.Q) func([]*result.Result) (result.Q, error) {
		return ofTotal(func(t *result.Total) (result.Q, bool) {
			if t.Infinity == nil || t.Horizon == nil {
				return result.Q{}, false
			}
			return q(t), true
		})
	}
	energyOut := totalOf(func(t *result.Total) result.Q { return t.Infinity.Energy })
	spinOut := totalOf(func(t *result.Total) result.Q { return t.Infinity.AngularMomentum })
	add("energy, infinity, e = 0.19, all l", ref.Total.EnergyInfinity, energyOut, full, true)
	add("ang. momentum, infinity, e = 0.19, all l", ref.Total.AngMomInfinity, spinOut, full, true)
	add("energy, horizon, e = 0.19, all l", ref.Total.EnergyHorizon, totalOf(func(t *result.Total) result.Q { return t.Horizon.Energy }), full, true)
	all = append(all,
		Check{groupOrbits, "energy, infinity, e = 0.19, all l", cutlerKennefickPoisson(), 3.1680e-4, 0.0010e-4, true, []Case{full}, energyOut},
		Check{groupOrbits, "ang. momentum, infinity, e = 0.19, all l", cutlerKennefickPoisson(), 5.9656e-3, 0.0020e-3, true, []Case{full}, spinOut})

	inspiral := Case{"inspiral.yaml", []string{"orbit.from=6.3", "waves.modes=[[2,2]]", "accuracy.relative=1e-5"}}
	peakOf := func(pick func(*result.Peak) result.Q) func([]*result.Result) (result.Q, error) {
		return ofMode(2, 2, func(m *result.Mode) (result.Q, bool) {
			if m.Peak == nil {
				return result.Q{}, false
			}
			return pick(m.Peak), true
		})
	}
	top := math.Sqrt(24) * 0.2959
	all = append(all,
		Check{groupOrbits, "|r h22| at merger, nu = 1e-3", merger(), top, 0.005 * top, false, []Case{inspiral}, peakOf(func(p *result.Peak) result.Q { return p.Amplitude })},
		Check{groupOrbits, "frequency of h22 at merger, nu = 1e-3", merger(), 0.2733, 0.005 * 0.2733, false, []Case{inspiral}, peakOf(func(p *result.Peak) result.Q { return p.Frequency })})

	infall := Case{Shipped: "infall.yaml"}
	want := infallEnergy()
	all = append(all,
		Check{groupOrbits, "energy in l = 2, fall from rest", infallSource(), want, 1e-12 * want, true, []Case{infall},
			func(r []*result.Result) (q result.Q, err error) {
				for _, m := range r[0].Modes {
					if m.L == 2 {
						q.Value += m.Infinity.Energy.Value
						q.Error += m.Infinity.Energy.Error
					}
				}
				return q, nil
			}},
		Check{groupOrbits, "energy, fall from rest, all l", davis(), 0.0104, 0.00005, true, []Case{infall},
			ofTotal(func(t *result.Total) (result.Q, bool) { return energy(t.Infinity) })})

	kick := Case{"plunge.yaml", []string{"waves.modes=" + upTo(8), "accuracy.relative=1e-5"}}
	all = append(all, Check{groupOrbits, "kick of the plunge, l <= 8", kicks(), (0.0446 + 0.0467) / 2, (0.0467-0.0446)/2 + 0.05*0.0457, true, []Case{kick},
		ofTotal(func(t *result.Total) (result.Q, bool) {
			if t.Recoil == nil {
				return result.Q{}, false
			}
			return t.Recoil.Speed, true
		})})
	return all
}

// upTo lists all modes with m >= 0 up to lMax as a case file spells them.
func upTo(lMax int) string {
	s := "["
	for l := 2; l <= lMax; l++ {
		for m := 0; m <= l; m++ {
			if len(s) > 1 {
				s += ","
			}
			s += fmt.Sprintf("[%d,%d]", l, m)
		}
	}
	return s + "]"
}
