package verify

import (
	"fmt"
	"math"
	"slices"

	"nullmark/extract/result"
)

// tone is one quasinormal frequency M omega of a hole without spin.
type tone struct {
	l, n   int
	re, im float64
}

// gravitational are the frequencies of the master functions: the digits of E. W.
// Leaver's tables (2M = 1 there, six digits) continued with his method by a
// program that shares nothing with this one.
func gravitational() []tone {
	return []tone{
		{2, 0, 0.373671684418, -0.088962315689},
		{2, 1, 0.346710996879, -0.273914875291},
		{3, 0, 0.599443288437, -0.092703047945},
		{3, 1, 0.582643803033, -0.281298113435},
		{4, 0, 0.809178377532, -0.094163960989},
	}
}

// leaverDigits is half a unit of the last digit above.
const leaverDigits = 5e-13

func leaver() Source {
	return Source{"Leaver 1985", "E. W. Leaver, Proc. R. Soc. A 402, 285 (1985), table 1 (2M = 1 there, six digits), from memory; " +
		"twelve digits by his continued fraction, computed for this project independently in 33 to 78 digits"}
}

// scalar are the frequencies of a scalar field, as published.
func scalar() []tone {
	return []tone{
		{0, 0, 0.1105, -0.1049},
		{1, 0, 0.2929, -0.0977},
		{2, 0, 0.4836, -0.0968},
	}
}

func berti() Source {
	return Source{"Berti+ 2009", "E. Berti, V. Cardoso & A. Starinets, Class. Quantum Grav. 26, 163001 (2009), scalar frequencies, four digits, from memory"}
}

func price() Source {
	return Source{"Price 1972", "R. H. Price, Phys. Rev. D 5, 2419 (1972); C. Gundlach, R. H. Price & J. Pullin, Phys. Rev. D 49, 883 (1994): " +
		"2l+3 at fixed radius and on the horizon, l+2 at null infinity; one more for data that are static at first. Exact numbers"}
}

// spinning are the fundamentals of holes with spin by (l,m).
func spinning() []struct {
	a      float64
	l, m   int
	re, im float64
} {
	return []struct {
		a      float64
		l, m   int
		re, im float64
	}{
		{0.5, 2, 1, 0.4206323930, -0.0861729943},
		{0.5, 2, 2, 0.4641230260, -0.0856388350},
		{0.5, 3, 3, 0.7409210977, -0.0886762575},
		{0.7, 2, 1, 0.4551214854, -0.0820852262},
		{0.7, 2, 2, 0.5326002436, -0.0807928732},
		{0.7, 3, 3, 0.8436868622, -0.0828556820},
	}
}

func spinningSource() Source {
	return Source{"Leaver (spin)", "E. W. Leaver, Proc. R. Soc. A 402, 285 (1985), table 2, and E. Berti, V. Cardoso & A. Starinets, " +
		"Class. Quantum Grav. 26, 163001 (2009), from memory; ten digits by the former's continued fraction, computed for this project independently"}
}

// ofTone makes the way to one part of a frequency.
func ofTone(l, m, n int, where string, imaginary bool) func([]*result.Result) (result.Q, error) {
	return func(r []*result.Result) (result.Q, error) {
		for _, g := range r[0].Ringing {
			if g.L == l && g.M == m && g.N == n && g.Where == where {
				if imaginary {
					return g.Im, nil
				}
				return g.Re, nil
			}
		}
		return result.Q{}, fmt.Errorf("the result has no frequency (%d,%d), n = %d at %s", l, m, n, where)
	}
}

// ofTail makes the way to the exponent of a tail.
func ofTail(l, m int, where string) func([]*result.Result) (result.Q, error) {
	return func(r []*result.Result) (result.Q, error) {
		for _, g := range r[0].Tail {
			if g.L == l && g.M == m && g.Where == where {
				return g.Exponent, nil
			}
		}
		return result.Q{}, fmt.Errorf("the result has no tail of (%d,%d) at %s", l, m, where)
	}
}

// ringing is the shipped case of that name.
func ringing(changes ...string) Case { return Case{"ringing.yaml", changes} }

func scalarField(lMax int) []string {
	return []string{"waves.equation=teukolsky", "waves.spin_weight=0", fmt.Sprintf("waves.l_max=%d", lMax)}
}

// toneRows are the two parts of a frequency of one mode at one end.
func toneRows(group, prefix string, t tone, m int, where string, src Source, digits float64, slow bool, c Case) []Check {
	name := fmt.Sprintf("%s(%d,%d) n = %d, %s", prefix, t.l, m, t.n, where)
	return []Check{
		{group, "Re omega " + name, src, t.re, digits, slow, []Case{c}, ofTone(t.l, m, t.n, where, false)},
		{group, "Im omega " + name, src, t.im, digits, slow, []Case{c}, ofTone(t.l, m, t.n, where, true)},
	}
}

// ringingChecks: the frequencies at which the equations ring by themselves, without
// any source: both parities of l = 2 to 4 and the first overtone of l = 2.
func ringingChecks() []Check {
	var all []Check
	for _, t := range gravitational() {
		for m := t.l - 1; m <= t.l; m++ { // odd, even
			for _, where := range []string{"infinity", "horizon"} {
				if t.l == 2 || t.n == 0 && where == "infinity" {
					all = append(all, toneRows(groupEquation, "", t, m, where, leaver(), leaverDigits, false, ringing())...)
				}
			}
		}
	}
	for _, t := range spinning() {
		c := Case{"kerr-ringing.yaml", []string{fmt.Sprintf("hole.spin=%v", t.a)}}
		for _, where := range []string{"infinity", "horizon"} {
			all = append(all, toneRows(groupEquation, fmt.Sprintf("a = %v ", t.a), tone{t.l, 0, t.re, t.im}, t.m, where, spinningSource(), 5e-11, true, c)...)
		}
	}
	for _, t := range scalar() {
		c := ringing(append(scalarField(2), "pulse.width=2")...)
		all = append(all, toneRows(groupEquation, "scalar ", t, 0, "infinity", berti(), 5e-5, true, c)...)
	}
	return all
}

// tailChecks: the decay at late times, which the field far away decides: it goes
// wrong with the slicing at either end.
func tailChecks() []Check {
	var all []Check
	add := func(name string, l, m, more int, slow bool, changes ...string) {
		for _, where := range []string{"infinity", "horizon", "radius 10"} {
			p := 2*l + 3 + more
			if where == "infinity" {
				p = l + 2 + more
			}
			all = append(all, Check{groupSlicing, fmt.Sprintf("%s(%d,%d) tail, %s", name, l, m, where), price(),
				float64(p), 1e-12, slow, []Case{{"tail.yaml", changes}}, ofTail(l, m, where)})
		}
	}
	add("", 2, 1, 0, false)
	add("static ", 2, 1, 1, true, "pulse.moving=static")
	add("", 3, 3, 0, true, "waves.modes=[[3,3]]")
	add("scalar ", 0, 0, 0, true, scalarField(1)...)
	add("scalar ", 1, 0, 0, true, scalarField(1)...)
	return all
}

// pulsePromise is what the bars of frequencies are held to.
func pulsePromise() Source {
	return Source{"as documented", "what the README promises for error bars of frequencies, the truth being those of E. W. Leaver's method: " +
		"at least 95 % of the bars hold it, and the median bar is 1 to 10 times the true error"}
}

// pulses are cases of the calibration: places, widths and motions.
func pulses() []Case {
	var all []Case
	for _, moving := range []string{"in", "static", "out"} {
		for _, centre := range []float64{4, 7, 11, 16, 23} {
			for _, width := range []float64{1, 1.7, 2.6, 3.7} {
				all = append(all, ringing("pulse.moving="+moving, fmt.Sprintf("pulse.centre=%v", centre), fmt.Sprintf("pulse.width=%v", width),
					"waves.modes=[[2,2],[3,3],[4,4]]", "accuracy.relative=1e-9"))
			}
		}
	}
	return all
}

// pulseBarChecks: do the bars of frequencies hold the truth?
func pulseBarChecks() []Check {
	over := func(statistic func(ratios []float64) float64) func([]*result.Result) (result.Q, error) {
		return func(r []*result.Result) (result.Q, error) {
			var ratios []float64
			for _, res := range r {
				for _, g := range res.Ringing {
					for _, t := range gravitational() {
						if t.l == g.L && t.n == g.N {
							// the worse of the two parts
							ratios = append(ratios, math.Min((g.Re.Error+leaverDigits)/math.Max(math.Abs(g.Re.Value-t.re), 1e-18),
								(g.Im.Error+leaverDigits)/math.Max(math.Abs(g.Im.Value-t.im), 1e-18)))
						}
					}
				}
			}
			if len(ratios) < 2*len(r) {
				return result.Q{}, fmt.Errorf("only %d frequencies in %d results", len(ratios), len(r))
			}
			slices.Sort(ratios)
			return result.Q{Value: statistic(ratios)}, nil
		}
	}
	return []Check{
		// Between 0.95 and 1.
		{groupBars, "share of bars of frequencies that hold the truth", pulsePromise(), 0.975, 0.025, true, pulses(), over(func(r []float64) float64 {
			outside, _ := slices.BinarySearch(r, 1)
			return 1 - float64(outside)/float64(len(r))
		})},
		{groupBars, "log10(median bar/true error) of frequencies", pulsePromise(), 0.5, 0.5, true, pulses(), over(func(r []float64) float64 {
			return math.Log10(r[len(r)/2])
		})},
	}
}
