package compare

import (
	"fmt"
	"math"

	"nullmark/extract/result"
)

// FluxRow is the certified flux at infinity of one circular orbit.
type FluxRow struct {
	X      float64 // (M Omega)^(2/3)
	Energy result.Q
	AngMom *result.Q // nil: not known
	L, M   int       // both zero: the sum of all modes
}

// FluxColumn is one column of a model's flux curve; L = M = 0 is the total.
type FluxColumn struct {
	L, M           int
	Energy, AngMom []float64 // nil: not there
}

// Expansion is a published flux to draw beside, divided by (32/5) x^5.
type Expansion struct {
	Name  string
	Ratio func(x float64) float64
}

// FluxInput is a model's flux curve and what it is held against.
type FluxInput struct {
	File    string
	X       []float64 // increasing, above zero
	Columns []FluxColumn
	Rows    []FluxRow // certified circular orbits; nil: the reference itself
	Context []Expansion
}

// newtonian is the leading flux at x: (32/5) x^5 of energy, (32/5) x^(7/2) of
// angular momentum.
func newtonian(of string, x float64) float64 {
	if of == "energy" {
		return 6.4 * math.Pow(x, 5)
	}
	return 6.4 * math.Pow(x, 3.5)
}

func (f *FluxInput) compare(ref *result.Bundle) (*result.FluxComparison, error) {
	if len(f.X) < 2 {
		return nil, &InputError{What: "the model's flux curve has fewer than two rows"}
	}
	if f.X[0] <= 0 {
		return nil, &InputError{What: fmt.Sprintf("the model's flux curve starts at x = %v", f.X[0]), Remedy: "x = (M Omega)^(2/3) is above zero"}
	}
	rows := f.Rows
	if rows == nil {
		var err error
		if rows, err = rowsOf(ref.Result); err != nil {
			return nil, err
		}
	}
	out := &result.FluxComparison{}
	top, worst, where := 0.0, result.Q{}, 0.0
	what := ""
	outside := 0
	for _, col := range f.Columns {
		for _, of := range []string{"energy", "angular momentum"} {
			y := col.Energy
			if of != "energy" {
				y = col.AngMom
			}
			if y == nil {
				continue
			}
			c := result.FluxCurve{Of: of, L: col.L, M: col.M}
			for _, r := range rows {
				q := r.Energy
				if of != "energy" {
					if r.AngMom == nil {
						continue
					}
					q = *r.AngMom
				}
				if r.L != col.L || r.M != col.M || q.Value == 0 {
					continue
				}
				if r.X < f.X[0] || r.X > f.X[len(f.X)-1] {
					outside++
					continue
				}
				model, miss := f.at(of, y, r.X)
				n := newtonian(of, r.X)
				ratio := result.Q{Value: model / q.Value, Error: math.Abs(model/q.Value)*q.Error/math.Abs(q.Value) + miss/math.Abs(q.Value)}
				c.X = append(c.X, r.X)
				c.Newtonian = append(c.Newtonian, result.Q{Value: q.Value / n, Error: q.Error / n})
				c.Ratio = append(c.Ratio, ratio)
				if s := math.Abs(ratio.Value-1) / math.Max(ratio.Error, 1e-15); s > top {
					top, worst, where = s, ratio, r.X
					what = of
					if col.L > 0 {
						what += " in " + modeName(col.L, col.M)
					}
				}
			}
			if len(c.X) == 0 {
				continue
			}
			out.Curves = append(out.Curves, c)
			own := result.FluxCurve{Of: of, L: col.L, M: col.M, Name: "model"}
			for i := 0; i < len(f.X); i += (len(f.X) + mostShown - 1) / mostShown {
				own.X = append(own.X, f.X[i])
				own.Newtonian = append(own.Newtonian, result.Q{Value: y[i] / newtonian(of, f.X[i])})
			}
			out.Model = append(out.Model, own)
		}
	}
	if len(out.Curves) == 0 {
		return nil, &InputError{What: fmt.Sprintf("the model's flux curve (x = %s … %s) covers none of the certified orbits", short(f.X[0]), short(f.X[len(f.X)-1])),
			Remedy: "extend the curve, or sweep radii inside it"}
	}
	for _, e := range f.Context {
		c := result.FluxCurve{Of: "energy", Name: e.Name}
		const n = 60
		for i := 0; i <= n; i++ {
			x := f.X[0] + (f.X[len(f.X)-1]-f.X[0])*float64(i)/n
			c.X = append(c.X, x)
			c.Newtonian = append(c.Newtonian, result.Q{Value: e.Ratio(x)})
		}
		out.Context = append(out.Context, c)
	}
	percent := fmt.Sprintf("%s ± %s %%", signed(100*(worst.Value-1)), barText(100*worst.Error))
	switch {
	case top > found:
		out.Verdict = result.Differs
		out.Sentence = fmt.Sprintf("The model's flux differs: most clearly its %s, by %s at x = %s.", what, percent, short(where))
	case top > 1:
		out.Verdict = result.CannotTell
		out.Sentence = fmt.Sprintf("The model's flux cannot be told from the reference's: the %s is off by %s at x = %s.", what, percent, short(where))
	default:
		out.Verdict = result.Inside
		out.Sentence = "The model's flux agrees with the reference's inside the error bar."
	}
	if outside > 0 {
		out.Sentence += fmt.Sprintf(" %s outside the model's range of x.", count(outside, "certified value")+" lie")
	}
	return out, nil
}

// at interpolates a flux curve after division by its leading power, in x, and
// estimates the error from two samples fewer.
func (f *FluxInput) at(of string, y []float64, x float64) (value, miss float64) {
	n := len(f.X)
	a := axis{t: f.X}
	j := a.find(x, 0)
	poly := func(k int) float64 {
		k = min(k, n)
		first := min(max(j-k/2+1, 0), n-k)
		var w [taps]float64
		fornberg(w[:k], x, f.X[first:first+k], 0)
		s := 0.0
		for i := 0; i < k; i++ {
			s += w[i] * y[first+i] / newtonian(of, f.X[first+i])
		}
		return s * newtonian(of, x)
	}
	if f.X[j] == x {
		return y[j], 0
	}
	if f.X[j+1] == x {
		return y[j+1], 0
	}
	value = poly(8)
	return value, math.Abs(value - poly(6))
}

// rowsOf takes the fluxes of a circular run.
func rowsOf(r *result.Result) ([]FluxRow, error) {
	if r.Orbit == nil || r.Orbit.Kind != "circular" || r.Orbit.Numbers["omega_phi"] == 0 {
		return nil, &InputError{What: "the reference is no circular orbit, so that it has no single x to hold a flux curve against",
			Remedy: "give the table of a sweep over circular orbits"}
	}
	x := math.Pow(math.Abs(r.Orbit.Numbers["omega_phi"]), 2./3)
	var rows []FluxRow
	add := func(f *result.Flux, l, m int) {
		if f != nil {
			am := f.AngularMomentum
			rows = append(rows, FluxRow{X: x, Energy: f.Energy, AngMom: &am, L: l, M: m})
		}
	}
	if r.Total != nil {
		add(r.Total.Infinity, 0, 0)
	}
	for i := range r.Modes {
		add(r.Modes[i].Infinity, r.Modes[i].L, r.Modes[i].M)
	}
	return rows, nil
}

// numbers sets the certified numbers of two results against each other. The
// bars of both count. Totals over different stretches of u, which apart
// reports, are left out.
func numbers(model, ref *result.Result) (out []result.NumberPair, apart bool) {
	const stretch = "totals" // the convention that names it
	apart = model.Conventions[stretch] != ref.Conventions[stretch]
	add := func(name string, a, b result.Q) {
		d := less(a, b)
		v := result.Inside
		switch s := math.Abs(d.Value); {
		case s > found*d.Error:
			v = result.Differs
		case s > d.Error:
			v = result.CannotTell
		}
		out = append(out, result.NumberPair{Name: name, Model: a, Reference: b, Difference: d, Verdict: v})
	}
	flux := func(name, measure string, a, b *result.Flux) {
		if a != nil && b != nil && !(apart && measure == "total") {
			add("energy "+name, a.Energy, b.Energy)
			add("angular momentum "+name, a.AngularMomentum, b.AngularMomentum)
		}
	}
	if model.Total != nil && ref.Total != nil && model.Total.Measure == ref.Total.Measure {
		flux("at infinity, all modes", ref.Total.Measure, model.Total.Infinity, ref.Total.Infinity)
		flux("into the horizon, all modes", ref.Total.Measure, model.Total.Horizon, ref.Total.Horizon)
	}
	for i := range ref.Modes {
		b := &ref.Modes[i]
		a := model.Find(b.L, b.M)
		if a == nil || a.Measure != b.Measure || a.Counts != b.Counts {
			continue
		}
		name := modeName(b.L, b.M)
		flux("at infinity, "+name, b.Measure, a.Infinity, b.Infinity)
		flux("into the horizon, "+name, b.Measure, a.Horizon, b.Horizon)
		if a.Strain != nil && b.Strain != nil {
			add("strain, real part, "+name, a.Strain.Re, b.Strain.Re)
			add("strain, imaginary part, "+name, a.Strain.Im, b.Strain.Im)
		}
		if a.Peak != nil && b.Peak != nil {
			add("time of the peak, "+name, a.Peak.U, b.Peak.U)
			add("amplitude at the peak, "+name, a.Peak.Amplitude, b.Peak.Amplitude)
			add("frequency at the peak, "+name, a.Peak.Frequency, b.Peak.Frequency)
		}
	}
	return out, apart
}
