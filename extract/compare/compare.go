// Package compare sets a modeller's waveform, flux and dynamics against a
// certified result and says, mode by mode, whether they agree inside the error
// bar, by how much they differ and from when, or that the reference cannot
// tell.
//
// Everything is compared on the reference's samples, in the reference's
// convention: h = A e^{-i phi}, strain r h_lm/mu against retarded time u, G =
// c = M = 1. A model is converted as its Convention says and never otherwise;
// where another convention would fit better, a hint says so.
package compare

import (
	"fmt"
	"math"
	"math/cmplx"
	"path/filepath"

	"nullmark/extract/result"
)

// Input is everything a comparison needs. Nothing in it is changed.
type Input struct {
	Title      string
	Name       string         // the model's name
	Reference  *result.Bundle // with series and bars
	Model      Waveform       // nil: no waveform to compare
	Convention Convention
	// Tortoise gives r_*(r) of the reference's hole, with the constant of its
	// slicing; needed for markers and for time_is "particle".
	Tortoise func(r float64) float64
	// Align is the window of u in which one time and one phase shift are
	// fitted; nil compares without any shift.
	Align *[2]float64
	Noise *Noise // nil: flat
	// Parameters is D in "invisible below D/(2 SNR^2)"; 0 means 1.
	Parameters int
	Flux       *FluxInput
	Force      *Force
	// MasterHorizon says that the reference's horizon series are master
	// functions, from which the balance can measure the flux at each instant;
	// otherwise it uses the certified average.
	MasterHorizon bool
	// Numbers, when set, is another result whose certified numbers are set
	// against the reference's.
	Numbers *result.Result
}

// Compare carries out the comparison. Errors are *InputError or *table.Fault.
func Compare(in Input) (*result.Comparison, *result.Curves, error) {
	conv, err := in.Convention.resolved()
	if err != nil {
		return nil, nil, err
	}
	if in.Parameters == 0 {
		in.Parameters = 1
	}
	c := &result.Comparison{Schema: result.ComparisonSchema, Title: in.Title, Model: in.Name,
		Hints: []string{}, Warnings: []string{}, Modes: []result.ModeComparison{}}
	c.Settings = result.Settings{Quantity: conv.Quantity, Phase: conv.Phase, PhaseOf: conv.PhaseOf, TimeIs: conv.TimeIs, Per: conv.Per,
		Align: "none", Noise: "flat", Parameters: in.Parameters}
	if in.Noise != nil && len(in.Noise.Frequency) > 0 {
		c.Settings.Noise, c.Settings.TotalMass = filepath.Base(in.Noise.File), in.Noise.TotalMass
	}
	if in.Align != nil {
		c.Settings.Align = fmt.Sprintf("one time and one phase shift over u = %.6g … %.6g", in.Align[0], in.Align[1])
	}
	curves := &result.Curves{}
	if in.Model != nil {
		c.Settings.Read = conv.words()
		w := &waves{in: in, conv: conv, c: c}
		if err := w.run(curves); err != nil {
			return nil, nil, err
		}
		for _, n := range in.Model.Notes() {
			c.Warnings = append(c.Warnings, n)
		}
	} else {
		c.Overall = result.Overall{Verdict: result.CannotTell, Sentence: "No waveform was given to compare."}
	}
	if in.Flux != nil {
		if c.Flux, err = in.Flux.compare(in.Reference); err != nil {
			return nil, nil, err
		}
	}
	if in.Force != nil {
		if c.Balance, err = in.Force.balance(in.Reference, in.Tortoise, in.MasterHorizon); err != nil {
			return nil, nil, err
		}
	}
	t := in.Reference.Result.Total
	if (in.Flux != nil && in.Flux.Rows == nil || in.Force != nil) && t != nil && t.Truncation == nil {
		c.Warnings = append(c.Warnings, "The reference's totals hold only the modes that were run, without an estimate of the others: a model's total flux or loss will lie above them.")
	}
	if in.Numbers != nil {
		var apart bool
		if c.Numbers, apart = numbers(in.Numbers, in.Reference.Result); apart {
			c.Warnings = append(c.Warnings, "The radiated totals of the two results cover different stretches of u and are not set against each other; the waveforms are.")
		}
	}
	return c, curves, nil
}

// waves is the comparison of waveforms in progress.
type waves struct {
	in    Input
	conv  Convention
	c     *result.Comparison
	ret   *retardation // nil where the reference has no orbit
	times axis         // the model's retarded times
	from  int          // kept rows of the model's file
	to    int
	u     []float64 // the reference's samples compared
	first int       // index of u[0] in the series
	shift [2]float64
}

func (w *waves) run(curves *result.Curves) error {
	s := w.in.Reference.Series
	if s == nil || len(s.U) < 2 || len(s.Modes) == 0 {
		return &InputError{What: "the reference holds no waveform", Remedy: "run it with output.keep: [waveform]"}
	}
	if s.Prefix != "" && s.Prefix != "h" {
		return &InputError{What: "the reference is a pulse, not an orbit's waveform", Remedy: "compare a model with the result of an orbit"}
	}
	ret, retErr := newRetardation(s, w.in.Tortoise)
	if retErr == nil {
		w.ret = ret
	}
	t := w.in.Model.Times()
	w.from, w.to = 0, len(t)
	if w.conv.TimeIs == "particle" {
		if retErr != nil {
			return retErr
		}
		u, from, to, err := ret.shift(t)
		if err != nil {
			return err
		}
		t, w.from, w.to = u, from, to
	}
	if len(t) < taps {
		return &InputError{What: fmt.Sprintf("the model has %d samples", len(t)), Remedy: fmt.Sprintf("give at least %d", taps)}
	}
	w.times = newAxis(t)
	common, err := w.common()
	if err != nil {
		return err
	}
	if err := w.window(0); err != nil {
		return err
	}
	if w.in.Align != nil {
		if err := w.align(common); err != nil {
			return err
		}
	}
	w.c.Range = [2]float64{w.u[0], w.u[len(w.u)-1]}
	var pairs []*pair
	for _, lm := range common {
		p, err := w.pair(lm)
		if err != nil {
			return err
		}
		p.measure()
		pairs = append(pairs, p)
	}
	curves.U = w.u
	for _, p := range pairs {
		w.c.Modes = append(w.c.Modes, w.judge(p))
		curves.Modes = append(curves.Modes, p.curves)
	}
	w.overall(pairs)
	return w.hints(pairs)
}

// common returns the modes that both sides have and warns about the others.
func (w *waves) common() ([][2]int, error) {
	has := map[[2]int]bool{}
	var ours, theirs []string
	for _, m := range w.in.Reference.Series.Modes {
		has[[2]int{m.L, m.M}] = true
	}
	var both [][2]int
	in := map[[2]int]bool{}
	for _, lm := range w.in.Model.Modes() {
		in[lm] = true
		if has[lm] {
			both = append(both, lm)
		} else {
			theirs = append(theirs, modeName(lm[0], lm[1]))
		}
	}
	for _, m := range w.in.Reference.Series.Modes {
		if !in[[2]int{m.L, m.M}] {
			ours = append(ours, modeName(m.L, m.M))
		}
	}
	if len(theirs) > 0 {
		w.c.Warnings = append(w.c.Warnings, "The reference does not hold the model's "+list(theirs)+": not compared.")
	}
	if len(ours) > 0 {
		w.c.Warnings = append(w.c.Warnings, "The model does not hold the reference's "+list(ours)+": not compared.")
	}
	if len(both) == 0 {
		return nil, &InputError{What: "model and reference have no mode in common", Remedy: "add the model's modes to waves.modes and run again, or name others in model.waveform.modes"}
	}
	return both, nil
}

// window picks the reference's samples that are past the start-up and that the
// model, shifted by dt, covers.
func (w *waves) window(dt float64) error {
	s := w.in.Reference.Series
	t := w.times.t
	lo, hi := math.Max(s.JunkUntil, t[0]-dt), t[len(t)-1]-dt
	n := len(s.U)
	a, b := 0, n
	for a < n && s.U[a] < lo {
		a++
	}
	for b > a && s.U[b-1] > hi {
		b--
	}
	if b-a < taps {
		return &InputError{What: fmt.Sprintf("the model's times %s … %s and the reference's %s … %s (after its start-up) do not overlap in at least %d samples",
			short(t[0]), short(t[len(t)-1]), short(math.Max(s.JunkUntil, s.U[0])), short(s.U[n-1]), taps),
			Remedy: "give both against the same retarded time, or run the reference longer (span.until)"}
	}
	w.first, w.u = a, s.U[a:b]
	return nil
}

// loaded is a mode of the model as strain on the model's own times.
type loaded struct {
	z       []complex128
	own     []float64    // the model's own bar, nil where it has none
	miss    []complex128 // the error of integrating it, up to a linear function; nil where there is none
	rounded float64
}

// outlandish is a size that no waveform has.
const outlandish = 1e40

// raw loads a mode and converts it.
func (w *waves) raw(lm [2]int) (loaded, error) {
	s, err := w.in.Model.Load(lm[0], lm[1])
	if err != nil {
		return loaded{}, err
	}
	r := loaded{z: s.Z[w.from:w.to], rounded: s.Rounded}
	for i, x := range r.z {
		if math.Abs(real(x)) > outlandish || math.Abs(imag(x)) > outlandish {
			return loaded{}, &InputError{What: fmt.Sprintf("the model's mode %s is %.3g in row %d, at time %s", modeName(lm[0], lm[1]), x, w.from+i, short(w.in.Model.Times()[w.from+i])),
				Remedy: "check the file: r h/mu is of order one or smaller"}
		}
	}
	if s.Err != nil {
		r.own = s.Err[w.from:w.to]
		f := math.Abs(w.conv.factor(lm[0], lm[1]))
		for i := range r.own {
			r.own[i] *= f
		}
	}
	r.miss = w.conv.toStrain(lm[0], lm[1], w.times, r.z)
	return r, nil
}

// pair samples a mode of the model, shifted, on the reference's samples.
func (w *waves) pair(lm [2]int) (*pair, error) {
	s := w.in.Reference.Series
	p := &pair{l: lm[0], m: lm[1], u: w.u}
	for i := range s.Modes {
		if md := &s.Modes[i]; md.L == p.l && md.M == p.m {
			if len(md.WaveErr) != len(md.Wave) {
				return nil, &InputError{What: "the reference's mode " + modeName(p.l, p.m) + " has no error bars", Remedy: "run it with two rungs or more"}
			}
			p.ref, p.refBar = md.Wave[w.first:w.first+len(w.u)], md.WaveErr[w.first:w.first+len(w.u)]
		}
	}
	raw, err := w.raw(lm)
	if err != nil {
		return nil, err
	}
	n := len(w.u)
	at := w.u
	if w.shift[0] != 0 {
		at = make([]float64, n)
		lo, hi := w.times.t[0], w.times.t[len(w.times.t)-1]
		for i, x := range w.u {
			at[i] = math.Min(math.Max(x+w.shift[0], lo), hi)
		}
	}
	p.model, p.readBar = make([]complex128, n), make([]float64, n)
	w.times.resample(p.model, p.readBar, at, raw.z)
	if w.shift[1] != 0 {
		si, co := math.Sincos(-float64(p.m) * w.shift[1])
		for i := range p.model {
			p.model[i] *= complex(co, si)
		}
	}
	var mid, off, drift float64 // of the constants that curvature lacks
	if w.conv.Quantity == "curvature" {
		d := make([]complex128, n)
		for i := range d {
			d[i] = p.model[i] - p.ref[i]
		}
		was := append([]complex128(nil), d...)
		bars := p.bars()
		mid, off, drift = lessLinear(w.u, d, was, bars)
		for i := range d {
			p.model[i] = p.ref[i] + d[i]
		}
		// The error of integrating goes through the same fit.
		e, unused := make([]complex128, n), make([]float64, n)
		w.times.resample(e, unused, at, raw.miss)
		lessLinear(w.u, e, append([]complex128(nil), e...), bars)
		for i := range e {
			p.readBar[i] += cmplx.Abs(e[i])
		}
	}
	if raw.rounded > 0 {
		// A rounded number is off by its own rounding; a rounded time by the
		// time's, times the rate of change.
		for i := range p.readBar {
			a, b := max(i-1, 0), min(i+1, n-1)
			rate := math.Sqrt(sq(p.model[b]-p.model[a])) / (w.u[b] - w.u[a])
			p.readBar[i] += raw.rounded * (math.Sqrt(sq(p.model[i])) + rate*math.Abs(at[i]))
		}
	}
	for _, e := range p.readBar {
		p.reading = math.Max(p.reading, e)
	}
	w.times.addBar(p.readBar, at, raw.own)
	for i, x := range w.u {
		p.readBar[i] += off + drift*math.Abs(x-mid)
	}
	return p, nil
}

// marks are the marked times of a mode, those of the orbit at u = t; peak is the
// u of the reference's peak, NaN without one.
func (w *waves) marks(peak float64) []marker {
	out := []marker{{"start", w.u[0]}}
	if o := w.in.Reference.Result.Orbit; o != nil {
		for _, name := range sortedKeys(o.Markers) {
			// The orbit's times are times t of the particle; as for all labels on
			// waves, u = t stands for them.
			out = append(out, marker{name, o.Markers[name]})
		}
	}
	if !math.IsNaN(peak) {
		out = append(out, marker{"peak", peak}, marker{"peak + 50 M", peak + 50})
	}
	out = append(out, marker{"end", w.u[len(w.u)-1]})
	byTime(out)
	return out
}

// stages cuts the samples into inspiral (before the ISCO crossing), plunge (to
// the mode's peak) and ringdown; motion that never comes near the light ring
// is inspiral throughout.
func (w *waves) stages(peak float64) []stage {
	n := len(w.u)
	isco, ring := math.Inf(-1), false
	if o := w.in.Reference.Result.Orbit; o != nil {
		if t, ok := o.Markers["isco"]; ok {
			isco = t
		}
		_, ring = o.Markers["light_ring"]
	}
	if math.IsNaN(peak) && !ring && math.IsInf(isco, -1) {
		return []stage{{"inspiral", 0, n}}
	}
	if math.IsNaN(peak) {
		peak = math.Inf(1)
	}
	a, b := 0, 0
	for a < n && w.u[a] < isco {
		a++
	}
	b = a
	for b < n && w.u[b] < peak {
		b++
	}
	var out []stage
	for _, s := range []stage{{"inspiral", 0, a}, {"plunge", a, b}, {"ringdown", b, n}} {
		if s.to > s.from {
			out = append(out, s)
		}
	}
	return out
}
