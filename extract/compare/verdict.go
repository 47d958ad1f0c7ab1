package compare

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"

	"nullmark/extract/result"
)

// A difference counts as found from found times the bar on; between once and
// found times the bar nothing is said, because bars cover most errors and not
// all. A difference below quiet times the bar needs no better reference.
const (
	found = 2.0
	quiet = 0.1
)

// judge makes the entry of one mode.
func (w *waves) judge(p *pair) result.ModeComparison {
	mc := result.ModeComparison{L: p.l, M: p.m}
	peak := math.NaN()
	ref, okRef := w.referencePeak(p)
	if okRef {
		peak = ref.U.Value
		if mod, ok := findPeak(p.u, p.model, p.readBar); ok {
			mc.Peak = &result.PeakComparison{Model: mod, Reference: ref, Difference: lessPeak(mod, ref)}
		}
	}
	marks, stages := w.marks(peak), w.stages(peak)
	c := &p.curves
	if c.Phase != nil {
		mc.PhaseDifference = condense(p.u, c.Phase, c.PhaseBar, marks, stages)
		mc.FrequencyDifference = condense(p.u, c.Freq, c.FreqBar, marks, stages)
	}
	mc.AmplitudeDifference = condense(p.u, c.Amp, c.AmpBar, marks, stages)
	if q, ok := mismatch(p.u, p.ref, p.model, p.bars(), w.in.Noise); ok {
		mc.Mismatch = &q
		mc.SNRVisible, mc.SNRIs = visible(q, w.in.Parameters)
	}
	worst, first := 0, -1
	for i := range p.u {
		r := p.ratio(i)
		if r > p.ratio(worst) {
			worst = i
		}
		if first < 0 && r > 1 {
			first = i
		}
	}
	mc.Significance = p.ratio(worst)
	if first >= 0 {
		u := p.u[first]
		mc.Leaves = &u
	}
	w.verdict(p, &mc, worst, first, stages)
	return mc
}

func (p *pair) bars() []float64 {
	b := make([]float64, len(p.u))
	for i := range b {
		b[i] = p.bar(i)
	}
	return b
}

// referencePeak is the certified peak of the mode, or one found in its series.
func (w *waves) referencePeak(p *pair) (result.Peak, bool) {
	if p.m == 0 { // no phase, hence no frequency
		return result.Peak{}, false
	}
	if m := w.in.Reference.Result.Find(p.l, p.m); m != nil && m.Peak != nil {
		return *m.Peak, m.Peak.U.Value > p.u[0] && m.Peak.U.Value < p.u[len(p.u)-1]
	}
	// Only motion that ends in the hole has the one peak that is meant here.
	o := w.in.Reference.Result.Orbit
	if o == nil {
		return result.Peak{}, false
	}
	if _, ok := o.Markers["light_ring"]; !ok {
		return result.Peak{}, false
	}
	return findPeak(p.u, p.ref, p.refBar)
}

// verdict decides and writes the sentence.
func (w *waves) verdict(p *pair, mc *result.ModeComparison, worst, first int, stages []stage) {
	res := w.in.Reference.Result
	asked := res.Accuracy.Asked
	refRel, readRel := 0.0, p.reading/p.scale // the largest bars against the peak
	for i := range p.u {
		refRel = math.Max(refRel, p.refBar[i]/p.scale)
	}
	unmet := false
	if m := res.Find(p.l, p.m); m != nil {
		unmet = !m.Met && refRel > asked
	}
	name := modeName(p.l, p.m)
	s := mc.Significance
	switch {
	case s > found:
		mc.Verdict = result.Differs
		mc.Sentence = fmt.Sprintf("%s differs: %s. %s.", name, strings.Join(w.parts(p, mc, first), "; "), w.when(p, first, stages))
	case s > 1 && readRel > refRel, s > quiet && readRel > math.Max(refRel, asked):
		mc.Verdict = result.CannotTell
		mc.Sentence = fmt.Sprintf("%s cannot be told: the model's samples are too far apart or too coarsely rounded (reading them adds a bar of %s of the peak, the reference's own is %s); write the model more finely.",
			name, barText(readRel), barText(refRel))
	case s > 1:
		mc.Verdict = result.CannotTell
		need := settle(p.bar(worst), cmplx.Abs(p.model[worst]-p.ref[worst])/4, asked)
		mc.Settles = &need
		mc.Sentence = fmt.Sprintf("%s cannot be told: the difference reaches %s times the error bar, too little to count (at u = %s); accuracy.relative: %s would settle it.",
			name, fmt.Sprintf("%.3g", s), short(p.u[worst]), barText(need))
	case unmet && s > quiet:
		mc.Verdict = result.CannotTell
		need := settle(refRel, asked, asked)
		mc.Settles = &need
		mc.Sentence = fmt.Sprintf("%s cannot be told to the asked accuracy: the difference is inside the error bar, but that is %s of the peak where %s was asked; accuracy.relative: %s would settle it, with a longer span or finer grid if the run allows.",
			name, barText(refRel), barText(asked), barText(need))
	default:
		mc.Verdict = result.Inside
		mc.Sentence = fmt.Sprintf("%s agrees inside the error bar%s.", name, inside(mc))
	}
}

// inside says how small the bar was.
func inside(mc *result.ModeComparison) string {
	a, f := mc.AmplitudeDifference, mc.PhaseDifference
	switch {
	case a != nil && f != nil:
		return fmt.Sprintf(": phase to %s rad, amplitude to %s, on average (the largest difference is %s of the bar)", barText(f.Mean.Error), barText(a.Mean.Error), short2(mc.Significance))
	case a != nil:
		return fmt.Sprintf(": to %s of the peak on average (the largest difference is %s of the bar)", barText(a.Mean.Error), short2(mc.Significance))
	}
	return ", which is larger than the signal"
}

func short2(x float64) string { return tidy(fmt.Sprintf("%.2g", x)) }

// settle is the accuracy, rounded down to one digit, that brings a relative
// bar from now to want: bars scale with what was asked.
func settle(now, want, asked float64) float64 {
	x := want
	if asked > 0 && now > 0 {
		x = asked * math.Min(1, want/now)
	}
	if !(x > 0) {
		return 0
	}
	p := math.Pow(10, math.Floor(math.Log10(x)))
	d := math.Floor(x/p*(1+1e-12)) * p
	// One decimal digit, without the tail of the product.
	return parse(fmt.Sprintf("%.0e", d))
}

func parse(s string) float64 {
	var x float64
	fmt.Sscanf(s, "%g", &x)
	return x
}

// parts says by how much phase and amplitude differ.
func (w *waves) parts(p *pair, mc *result.ModeComparison, first int) []string {
	var out []string
	if d := mc.PhaseDifference; d != nil && beyond(d.Max) {
		switch shape(p.u, p.curves.Phase, p.curves.PhaseBar, d) {
		case drifts:
			out = append(out, fmt.Sprintf("its phase drifts by %s rad per M, to %s rad", withBar(d.Slope), withBar(d.Max)))
		case offset:
			text := fmt.Sprintf("its phase is off by %s rad throughout", withBar(d.Mean))
			if math.Abs(math.Remainder(d.Mean.Value-math.Pi, 2*math.Pi)) < 0.01 {
				text += " (the sign of the mode is reversed)"
			}
			out = append(out, text)
		default:
			text := fmt.Sprintf("its phase is off by up to %s rad", withBar(d.Max))
			if late := after(p, first); late != nil {
				text = fmt.Sprintf("its phase drifts by %s rad per M from about u = %s on, to %s rad", withBar(late.Slope), short(p.u[first]), withBar(d.Max))
			}
			out = append(out, text)
		}
	}
	if d := mc.AmplitudeDifference; d != nil && beyond(d.Max) {
		way := "large"
		if d.Max.Value < 0 {
			way = "small"
		}
		what := "its amplitude is too " + way + " by "
		of := " of the reference"
		if p.m == 0 {
			what, of = "it is off by ", " of the peak"
		}
		switch shape(p.u, p.curves.Amp, p.curves.AmpBar, d) {
		case offset:
			out = append(out, what+plain(math.Abs(d.Mean.Value))+" ± "+barText(d.Mean.Error)+of+" throughout")
		case drifts:
			out = append(out, what+"up to "+plain(math.Abs(d.Max.Value))+" ± "+barText(d.Max.Error)+of+", changing by "+withBar(d.Slope)+" per M")
		default:
			out = append(out, what+"up to "+plain(math.Abs(d.Max.Value))+" ± "+barText(d.Max.Error)+of)
		}
	}
	if mc.Peak != nil && beyond(mc.Peak.Difference.U) {
		d, way := mc.Peak.Difference.U, "late"
		if d.Value < 0 {
			way = "early"
		}
		out = append(out, fmt.Sprintf("its peak comes %s ± %s M %s", plain(math.Abs(d.Value)), barText(d.Error), way))
	}
	if len(out) == 0 {
		out = append(out, fmt.Sprintf("model and reference are up to %s error bars apart, phase and amplitude taken together", short2(mc.Significance)))
	}
	return out
}

// after is the phase difference from sample first on where that is a straight
// line over at least a tenth of the samples, else nil.
func after(p *pair, first int) *result.Difference {
	n := len(p.u)
	if first <= 0 || n-first < max(n/10, taps) {
		return nil
	}
	u, y, b := p.u[first:], p.curves.Phase[first:], p.curves.PhaseBar[first:]
	d := condense(u, y, b, nil, nil)
	if d == nil || shape(u, y, b, d) != drifts || !beyond(d.Slope) {
		return nil
	}
	return d
}

type form int

const (
	neither form = iota
	offset       // constant to a tenth
	drifts       // linear in u to a tenth
)

// shape tells whether a curve is a constant, or a straight line.
func shape(u, y, b []float64, d *result.Difference) form {
	w := weights(y, b, d.Max)
	n, sy, so, sl, mid, all := 0, 0.0, 0.0, 0.0, 0.0, 0.0
	for i := range y {
		mid += w[i] * u[i]
		all += w[i]
	}
	mid /= all
	for i := range y {
		if w[i] == 0 {
			continue
		}
		n++
		o := y[i] - d.Mean.Value
		l := o - d.Slope.Value*(u[i]-mid)
		sy, so, sl = sy+w[i]*y[i]*y[i], so+w[i]*o*o, sl+w[i]*l*l
	}
	switch {
	case n < 3 || sy == 0:
		return neither
	case so < 0.01*sy:
		return offset
	case sl < 0.01*sy:
		return drifts
	}
	return neither
}

// when says from when the difference shows.
func (w *waves) when(p *pair, first int, stages []stage) string {
	if first <= 0 {
		return "It shows from the first sample compared, u = " + short(p.u[0])
	}
	where := ""
	if len(stages) > 1 {
		for _, s := range stages {
			if first >= s.from && first < s.to {
				where = " (" + s.name + ")"
			}
		}
	}
	return "It leaves the error bar at u = " + short(p.u[first]) + where
}

// overall sums up.
func (w *waves) overall(pairs []*pair) {
	o := &w.c.Overall
	var in, out, open []string
	var settles float64
	var worst *result.ModeComparison
	for i := range w.c.Modes {
		m := &w.c.Modes[i]
		switch m.Verdict {
		case result.Inside:
			in = append(in, modeName(m.L, m.M))
		case result.Differs:
			out = append(out, modeName(m.L, m.M))
			if worst == nil || m.Significance > worst.Significance {
				worst = m
			}
		default:
			open = append(open, modeName(m.L, m.M))
			if m.Settles != nil && (settles == 0 || *m.Settles < settles) {
				settles = *m.Settles
			}
		}
	}
	if settles > 0 {
		o.Settles = &settles
	}
	n := len(w.c.Modes)
	tail := ""
	if len(in) > 0 && len(in) < n {
		tail += fmt.Sprintf(" Inside the error bar: %s.", list(in))
	}
	if len(open) > 0 && len(open) < n {
		tail += fmt.Sprintf(" Cannot be told: %s.", list(open))
	}
	span := fmt.Sprintf("u = %s … %s", short(w.c.Range[0]), short(w.c.Range[1]))
	switch {
	case len(out) > 0:
		o.Verdict = result.Differs
		o.Sentence = fmt.Sprintf("The model differs from the reference in %d of %s over %s. Most clearly, %s%s", len(out), count(n, "mode"), span, worst.Sentence, tail)
		if len(out) == n && n == 1 {
			o.Sentence = fmt.Sprintf("The model differs from the reference over %s: %s", span, worst.Sentence)
		}
	case len(open) > 0:
		o.Verdict = result.CannotTell
		o.Sentence = fmt.Sprintf("Whether the model is right cannot be told in %d of %s over %s.", len(open), count(n, "mode"), span)
		if settles > 0 {
			o.Sentence += fmt.Sprintf(" A reference with accuracy.relative: %s would settle it.", barText(settles))
		}
		o.Sentence += tail
	default:
		o.Verdict = result.Inside
		o.Sentence = fmt.Sprintf("The model agrees with the reference inside the error bar in %s over %s.", all(n), span)
	}
	o.Views = views(pairs, w.in.Noise, w.in.Parameters)
	for i := range o.Views {
		if v := &o.Views[i]; o.Mismatch == nil || v.Mismatch.Value > o.Mismatch.Value {
			o.Mismatch, o.SNRVisible, o.SNRIs = &v.Mismatch, v.SNRVisible, v.SNRIs
		}
	}
}

func count(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}

func all(n int) string {
	if n == 1 {
		return "the one mode compared"
	}
	return fmt.Sprintf("all %d modes", n)
}

// beyond reports whether a value is larger than found times its bar.
func beyond(q result.Q) bool { return math.Abs(q.Value) > found*q.Error }
