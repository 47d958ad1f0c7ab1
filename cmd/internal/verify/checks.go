package verify

import (
	"fmt"
	"math"
	"slices"

	"nullmark/extract/result"
)

// The groups, in the order of the data path.
const (
	groupEquation   = "equation"
	groupSlicing    = "slicing"
	groupSource     = "source"
	groupExtraction = "extraction"
	groupOrbits     = "orbits"
	groupBars       = "error bars"
)

func frequencyDomain() Source {
	return Source{"frequency domain", "computed for this project independently in the frequency domain " +
		"(Teukolsky s = -2, series solutions in 110 to 260 bits, cross-checked with Regge–Wheeler/Zerilli and with s = +2): " +
		"published/circular_schwarzschild.json"}
}

func exactRelation() Source {
	return Source{"exact", "a circular orbit's perturbation depends on phi - Omega t alone, so Edot = Omega Ldot in every mode at both ends; Omega = r0^(-3/2)"}
}

func martel() Source {
	return Source{"Martel 2004", "K. Martel, Phys. Rev. D 69, 044025 (2004), circular orbit of p = 7.9456, " +
		"energy flux by mode in the frequency domain, from memory; the tolerance is the distance to the same paper's time-domain column"}
}

func postNewtonian() Source {
	return Source{"Tanaka+ 1996", "H. Tagoshi & M. Sasaki, Prog. Theor. Phys. 92, 745 (1994); T. Tanaka, H. Tagoshi, M. Sasaki, " +
		"Prog. Theor. Phys. 96, 1087 (1996); read in M. Sasaki & H. Tagoshi, Living Rev. Relativity 6, 6 (2003), eqs 174 to 177; " +
		"the tolerance is the estimated next term"}
}

func absorption() Source {
	return Source{"Poisson+ 1995", "E. Poisson & M. Sasaki, Phys. Rev. D 51, 5753 (1995): absorption over quadrupole flux -> v^8, " +
		"from memory; the tolerance allows a relative correction of 10 v^2"}
}

func promise() Source {
	return Source{"as documented", "what the README promises for error bars, the truth taken from the independent frequency-domain table: " +
		"at least 97 % of the bars hold it, and the median bar is 1 to 10 times the true error"}
}

// Checks returns the built-in checks in the order in which they run.
func Checks() []Check {
	var all []Check
	all = append(all, equationChecks()...)
	all = append(all, ringingChecks()...)
	all = append(all, slicingChecks()...)
	all = append(all, tailChecks()...)
	all = append(all, sourceChecks()...)
	all = append(all, extractionChecks()...)
	all = append(all, orbitChecks()...)
	all = append(all, barChecks()...)
	all = append(all, kerrChecks()...)
	all = append(all, pulseBarChecks()...)
	return all
}

// circular is the shipped case at another radius, with every mode up to lMax
// held to a relative accuracy.
func circular(r0 float64, lMax int, relative string) Case {
	return Case{"circular.yaml", []string{fmt.Sprintf("orbit.radius=%v", r0), fmt.Sprintf("waves.l_max=%d", lMax), "accuracy.relative=" + relative}}
}

// everyMode is the case that most checks at one radius share.
func everyMode(r0 float64) Case { return circular(r0, 8, "1e-6") }

// ofMode makes the way to one number of one mode of a case.
func ofMode(l, m int, number func(*result.Mode) (result.Q, bool)) func([]*result.Result) (result.Q, error) {
	return func(r []*result.Result) (result.Q, error) {
		mode := r[0].Find(l, m)
		if mode == nil {
			return result.Q{}, fmt.Errorf("the result has no mode (%d,%d)", l, m)
		}
		q, ok := number(mode)
		if !ok {
			return result.Q{}, fmt.Errorf("the mode (%d,%d) of the result does not hold this number", l, m)
		}
		return q, nil
	}
}

// ofTotal makes the way to one number of the sums of a case.
func ofTotal(number func(*result.Total) (result.Q, bool)) func([]*result.Result) (result.Q, error) {
	return func(r []*result.Result) (result.Q, error) {
		if r[0].Total == nil {
			return result.Q{}, fmt.Errorf("the result has no sum over modes")
		}
		q, ok := number(r[0].Total)
		if !ok {
			return result.Q{}, fmt.Errorf("the sum over modes of the result does not hold this number")
		}
		return q, nil
	}
}

func energy(f *result.Flux) (result.Q, bool) {
	if f == nil {
		return result.Q{}, false
	}
	return f.Energy, true
}

func energyInfinity(m *result.Mode) (result.Q, bool) { return energy(m.Infinity) }
func energyHorizon(m *result.Mode) (result.Q, bool)  { return energy(m.Horizon) }

// amplitude and phase of the strain; the bars are the projections of the bars
// of its parts.
func amplitude(m *result.Mode) (result.Q, bool) {
	if m.Strain == nil {
		return result.Q{}, false
	}
	re, im := m.Strain.Re, m.Strain.Im
	a := math.Hypot(re.Value, im.Value)
	return result.Q{Value: a, Error: (math.Abs(re.Value)*re.Error + math.Abs(im.Value)*im.Error) / a}, true
}

func phase(m *result.Mode) (result.Q, bool) {
	if m.Strain == nil {
		return result.Q{}, false
	}
	re, im := m.Strain.Re, m.Strain.Im
	a2 := re.Value*re.Value + im.Value*im.Value
	return result.Q{Value: math.Atan2(im.Value, re.Value),
		Error: (math.Abs(im.Value)*re.Error + math.Abs(re.Value)*im.Error) / a2}, true
}

// energyPerAngularMomentum is Edot/Ldot; the relative bars add.
func energyPerAngularMomentum(f *result.Flux) (result.Q, bool) {
	if f == nil {
		return result.Q{}, false
	}
	e, l := f.Energy, f.AngularMomentum
	ratio := e.Value / l.Value
	return result.Q{Value: ratio, Error: math.Abs(ratio) * (math.Abs(e.Error/e.Value) + math.Abs(l.Error/l.Value))}, true
}

// scaled divides a number and its bar by a positive constant.
func scaled(q result.Q, by float64) result.Q {
	return result.Q{Value: q.Value / by, Error: q.Error / by}
}

// equationChecks: the strong-field fluxes by mode, where a wrong coefficient
// of either equation shows; both parities.
func equationChecks() []Check {
	var all []Check
	ref := referenceOrbit(6)
	for _, lm := range [][2]int{{2, 2}, {2, 1}, {3, 3}, {3, 2}, {4, 4}, {4, 1}} {
		l, m := lm[0], lm[1]
		want := ref.mode(l, m)
		all = append(all,
			Check{groupEquation, fmt.Sprintf("(%d,%d) energy, infinity, r0 = 6", l, m), frequencyDomain(),
				want.EnergyInfinity, referenceDigits * want.EnergyInfinity, false, []Case{everyMode(6)}, ofMode(l, m, energyInfinity)},
			Check{groupEquation, fmt.Sprintf("(%d,%d) energy, horizon, r0 = 6", l, m), frequencyDomain(),
				want.EnergyHorizon, referenceDigits * want.EnergyHorizon, false, []Case{everyMode(6)}, ofMode(l, m, energyHorizon)})
	}
	return all
}

// slicingChecks: the phase of the strain against retarded time, which moves
// with any shift of the label u, and the same fluxes with other layers.
func slicingChecks() []Check {
	var all []Check
	for _, r0 := range []float64{6, 10} {
		ref := referenceOrbit(r0)
		for _, lm := range [][2]int{{2, 2}, {2, 1}, {3, 3}} {
			l, m := lm[0], lm[1]
			s := ref.mode(l, m).Strain
			all = append(all, Check{groupSlicing, fmt.Sprintf("(%d,%d) strain phase (rad), r0 = %v", l, m, r0), frequencyDomain(),
				math.Atan2(s[1], s[0]), referenceDigits, false, []Case{everyMode(r0)}, ofMode(l, m, phase)})
		}
	}
	return all
}

// sourceChecks: fluxes away from the strong field, and the sums.
func sourceChecks() []Check {
	var all []Check
	ref := referenceOrbit(10)
	for _, lm := range [][2]int{{2, 2}, {2, 1}, {3, 3}} {
		l, m := lm[0], lm[1]
		want := ref.mode(l, m)
		all = append(all,
			Check{groupSource, fmt.Sprintf("(%d,%d) energy, infinity, r0 = 10", l, m), frequencyDomain(),
				want.EnergyInfinity, referenceDigits * want.EnergyInfinity, false, []Case{everyMode(10)}, ofMode(l, m, energyInfinity)},
			Check{groupSource, fmt.Sprintf("(%d,%d) energy, horizon, r0 = 10", l, m), frequencyDomain(),
				want.EnergyHorizon, referenceDigits * want.EnergyHorizon, false, []Case{everyMode(10)}, ofMode(l, m, energyHorizon)})
	}
	// From memory, frequency domain beside time domain.
	kase := Case{"circular.yaml", []string{"orbit.radius=7.9456", "waves.modes=[[2,2],[2,1],[3,3]]", "accuracy.relative=1e-6"}}
	for _, c := range []struct {
		l, m            int
		frequency, time float64
	}{
		{2, 2, 1.7063e-4, 1.7051e-4},
		{2, 1, 8.1633e-7, 8.1623e-7},
		{3, 3, 2.5471e-5, 2.5432e-5},
	} {
		all = append(all, Check{groupSource, fmt.Sprintf("(%d,%d) energy, infinity, r0 = 7.9456", c.l, c.m), martel(),
			c.frequency, math.Abs(c.frequency - c.time), false, []Case{kase}, ofMode(c.l, c.m, energyInfinity)})
	}
	return all
}

// extractionChecks: amplitudes, the exact relation between the two fluxes, the
// sums with their missing tail, and the weak-field limits.
func extractionChecks() []Check {
	var all []Check
	for _, r0 := range []float64{6, 10} {
		ref := referenceOrbit(r0)
		s := ref.mode(2, 2).Strain
		a := math.Hypot(s[0], s[1])
		omega := math.Pow(r0, -1.5)
		all = append(all,
			Check{groupExtraction, fmt.Sprintf("(2,2) strain amplitude, r0 = %v", r0), frequencyDomain(),
				a, referenceDigits * a, false, []Case{everyMode(r0)}, ofMode(2, 2, amplitude)},
			Check{groupExtraction, fmt.Sprintf("Edot/Ldot, infinity, r0 = %v", r0), exactRelation(), omega, 1e-15 * omega, false, []Case{everyMode(r0)},
				ofTotal(func(t *result.Total) (result.Q, bool) { return energyPerAngularMomentum(t.Infinity) })},
			Check{groupExtraction, fmt.Sprintf("Edot/Ldot, horizon, r0 = %v", r0), exactRelation(), omega, 1e-15 * omega, false, []Case{everyMode(r0)},
				ofTotal(func(t *result.Total) (result.Q, bool) { return energyPerAngularMomentum(t.Horizon) })},
			Check{groupExtraction, fmt.Sprintf("all l, energy, infinity, r0 = %v", r0), frequencyDomain(),
				ref.Total.EnergyInfinity, referenceDigits * ref.Total.EnergyInfinity, false, []Case{everyMode(r0)},
				ofTotal(func(t *result.Total) (result.Q, bool) { return energy(t.Infinity) })},
			Check{groupExtraction, fmt.Sprintf("all l, energy, horizon, r0 = %v", r0), frequencyDomain(),
				ref.Total.EnergyHorizon, referenceDigits * ref.Total.EnergyHorizon, false, []Case{everyMode(r0)},
				ofTotal(func(t *result.Total) (result.Q, bool) { return energy(t.Horizon) })})
	}
	for _, c := range []struct {
		r0   float64
		slow bool
	}{{50, false}, {100, true}, {200, true}} {
		v := 1 / math.Sqrt(c.r0)
		series, next := Series(v)
		leading := quadrupole(v)
		all = append(all,
			Check{groupExtraction, fmt.Sprintf("flux/quadrupole, infinity, r0 = %v", c.r0), postNewtonian(), series, next, c.slow, []Case{farOut(c.r0)},
				ofTotal(func(t *result.Total) (result.Q, bool) {
					q, ok := energy(t.Infinity)
					return scaled(q, leading), ok
				})},
			Check{groupExtraction, fmt.Sprintf("horizon flux/(quadrupole v^8), r0 = %v", c.r0), absorption(), 1, 10 * v * v, c.slow, []Case{farOut(c.r0)},
				ofTotal(func(t *result.Total) (result.Q, bool) {
					q, ok := energy(t.Horizon)
					return scaled(q, leading*math.Pow(v, 8)), ok
				})})
	}
	return all
}

// farOut is the case of the weak-field limits.
func farOut(r0 float64) Case { return circular(r0, 6, "1e-6") }

// barChecks: do the bars hold the truth, and are they no wider than they say?
// Every mode of both radii of the independent table, energy flux at both ends
// and both parts of the strain.
func barChecks() []Check {
	var all []Check
	for _, asked := range []struct {
		relative string
		slow     bool
	}{{"1e-6", false}, {"1e-9", true}} {
		all = append(all,
			Check{groupBars, "share of bars that hold the truth, asked " + asked.relative, promise(), 1, 0.03, asked.slow,
				bothRadii(asked.relative), overBars(func(b []barAndError) float64 {
					inside := 0
					for _, x := range b {
						if x.err <= x.bar {
							inside++
						}
					}
					return float64(inside) / float64(len(b))
				})},
			// Between 1 and 10 is between 0 and 1 in powers of ten.
			Check{groupBars, "log10(median bar/true error), asked " + asked.relative, promise(), 0.5, 0.5, asked.slow,
				bothRadii(asked.relative), overBars(func(b []barAndError) float64 {
					ratio := make([]float64, len(b))
					for i, x := range b {
						ratio[i] = x.bar / x.err
					}
					slices.Sort(ratio)
					return math.Log10(ratio[len(ratio)/2])
				})})
	}
	return all
}

// barAndError is one number's bar and its distance to the truth, which is
// known to the digits of the table.
type barAndError struct{ bar, err float64 }

// bothRadii are the cases of every orbit in the independent table.
func bothRadii(relative string) []Case {
	return []Case{circular(6, 8, relative), circular(10, 8, relative)}
}

// overBars makes the way to a statistic of all bars of these two cases.
func overBars(statistic func([]barAndError) float64) func([]*result.Result) (result.Q, error) {
	return func(r []*result.Result) (result.Q, error) {
		var all []barAndError
		for i, r0 := range []float64{6, 10} {
			pairs, err := compareAll(r[i], referenceOrbit(r0))
			if err != nil {
				return result.Q{}, err
			}
			all = append(all, pairs...)
		}
		return result.Q{Value: statistic(all)}, nil
	}
}

// compareAll pairs every number of a result that the table knows.
func compareAll(r *result.Result, ref circularOrbit) ([]barAndError, error) {
	var all []barAndError
	add := func(q result.Q, truth float64) {
		all = append(all, barAndError{q.Error + referenceDigits*math.Abs(truth), math.Abs(q.Value - truth)})
	}
	for _, want := range ref.Modes {
		got := r.Find(want.L, want.M)
		if got == nil || got.Infinity == nil || got.Horizon == nil || got.Strain == nil {
			return nil, fmt.Errorf("the result lacks a number of the mode (%d,%d)", want.L, want.M)
		}
		add(got.Infinity.Energy, want.EnergyInfinity)
		add(got.Horizon.Energy, want.EnergyHorizon)
		add(got.Strain.Re, want.Strain[0])
		add(got.Strain.Im, want.Strain[1])
	}
	return all, nil
}
