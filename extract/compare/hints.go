package compare

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"
)

// reading is another way in which the file could have been meant.
type reading struct {
	conj, odd, flip bool
	turn            int // odd-parity modes times i^turn
	scale           int // index into scales
}

// scales are factors that normalisations differ by.
var scales = []struct {
	factor func(l int) float64
	says   func(quantity string) string
}{
	{func(int) float64 { return 1 }, nil},
	{spinFactor, func(q string) string {
		if q == "strain" {
			return "quantity: master"
		}
		return "a further factor sqrt((l+2)!/(l-2)!) is applied"
	}},
	{func(l int) float64 { return 1 / spinFactor(l) }, func(q string) string {
		if q == "master" {
			return "quantity: strain"
		}
		return "a factor sqrt((l-2)!/(l+2)!) is applied"
	}},
	{func(int) float64 { return 2 }, func(string) string { return "the amplitudes are doubled" }},
	{func(int) float64 { return 0.5 }, func(string) string { return "the amplitudes are halved" }},
	{func(l int) float64 { return spinFactor(l) / 2 }, func(q string) string {
		if q == "master" {
			return "the amplitudes are halved (the master function is the full-strain one, h = sqrt((l+2)!/(l-2)!) Psi/2)"
		}
		return "quantity: master, and the amplitudes are halved (h = sqrt((l+2)!/(l-2)!) Psi/2)"
	}},
}

func (r reading) apply(z complex128, l, m int) complex128 {
	if r.conj {
		z = cmplx.Conj(z)
	}
	f := complex(scales[r.scale].factor(l), 0)
	if r.odd && m%2 != 0 {
		f = -f
	}
	if r.flip {
		f = -f
	}
	if (l+m)%2 != 0 {
		switch r.turn {
		case 1:
			f *= 1i
		case 3:
			f *= -1i
		}
	}
	return f * z
}

func (r reading) changes() int {
	n := 0
	for _, b := range []bool{r.conj, r.odd, r.flip, r.turn != 0, r.scale != 0} {
		if b {
			n++
		}
	}
	return n
}

func (r reading) words(c Convention) string {
	var s []string
	if r.conj {
		s = append(s, "phase: "+other(c.Phase, "minus", "plus"))
	}
	if r.odd {
		s = append(s, "phase_of: "+other(c.PhaseOf, "particle", "heavy-body"))
	}
	if r.scale != 0 {
		s = append(s, scales[r.scale].says(c.Quantity))
	}
	if r.flip {
		s = append(s, "the sign of h is reversed")
	}
	if r.turn == 1 {
		s = append(s, "modes of odd l + m are multiplied by i")
	}
	if r.turn == 3 {
		s = append(s, "modes of odd l + m are multiplied by -i")
	}
	return strings.Join(s, " and ")
}

func other(is, a, b string) string {
	if is == a {
		return b
	}
	return a
}

// misfit is the mean over modes of sum |d|^2 / sum |ref|^2, on about 400
// samples a mode, and the largest ratio of |d| to its bar.
func misfit(pairs []*pair, model func(p *pair, i int) complex128) (rms, ratio float64) {
	for _, p := range pairs {
		step := max(1, len(p.u)/400)
		var a, b float64
		for i := 0; i < len(p.u); i += step {
			d := model(p, i) - p.ref[i]
			a += sq(d)
			b += sq(p.ref[i])
			if bar := p.bar(i); bar > 0 {
				ratio = math.Max(ratio, cmplx.Abs(d)/bar)
			}
		}
		if b > 0 {
			rms += a / b
		}
	}
	return math.Sqrt(rms / float64(len(pairs))), ratio
}

// hints tries other conventions when the model is far off (by more than 2 % of
// the signal) and names one that brings it at least ten times closer. Among
// readings that do so about equally well the one with the fewest changes is
// named.
func (w *waves) hints(pairs []*pair) error {
	base, ratio := misfit(pairs, func(p *pair, i int) complex128 { return p.model[i] })
	if ratio <= found || base < 0.02 {
		return nil
	}
	type guess struct {
		words   string
		rms     float64
		ratio   float64
		changes int
	}
	var guesses []guess
	for _, conj := range []bool{false, true} {
		for _, odd := range []bool{false, true} {
			for _, flip := range []bool{false, true} {
				for _, turn := range []int{0, 1, 3} {
					for scale := range scales {
						r := reading{conj, odd, flip, turn, scale}
						if r.changes() == 0 {
							continue
						}
						g := guess{words: r.words(w.conv), changes: r.changes()}
						g.rms, g.ratio = misfit(pairs, func(p *pair, i int) complex128 { return r.apply(p.model[i], p.l, p.m) })
						guesses = append(guesses, g)
					}
				}
			}
		}
	}
	if w.conv.Quantity != "curvature" {
		psi := map[*pair][]complex128{}
		for _, p := range pairs {
			a := newAxis(p.u)
			once, twice := make([]complex128, len(p.u)), make([]complex128, len(p.u))
			a.rate(once, p.ref, 9)
			a.rate(twice, once, 9)
			psi[p] = twice
		}
		g := guess{words: "quantity: curvature", changes: 1, ratio: math.Inf(1)}
		// Distance of the file's numbers from h''/2, relative to those.
		for _, p := range pairs {
			var a, b float64
			f := complex(1/w.conv.factor(p.l, p.m)*w.conv.perNu(), 0)
			if w.conv.PhaseOf == "heavy-body" && p.m%2 != 0 {
				f = -f
			}
			for i := range p.u {
				a += sq(f*p.model[i] - psi[p][i]/2)
				b += sq(psi[p][i] / 2)
			}
			g.rms += a / b
		}
		g.rms = math.Sqrt(g.rms / float64(len(pairs)))
		guesses = append(guesses, g)
	}
	if g, ok, err := w.otherTime(pairs); err != nil {
		return err
	} else if ok {
		guesses = append(guesses, guess{words: "time_is: " + other(w.conv.TimeIs, "retarded", "particle"), rms: g, ratio: math.Inf(1), changes: 1})
	}
	best := math.Inf(1)
	for _, g := range guesses {
		best = math.Min(best, g.rms)
	}
	if best > base/10 {
		return nil
	}
	pick := -1
	for i, g := range guesses {
		if g.rms <= 2*best+1e-12 && (pick < 0 || g.changes < guesses[pick].changes || g.changes == guesses[pick].changes && g.rms < guesses[pick].rms) {
			pick = i
		}
	}
	g := guesses[pick]
	if g.ratio <= found {
		w.c.Hints = append(w.c.Hints, fmt.Sprintf("The difference vanishes if %s.", g.words))
	} else {
		w.c.Hints = append(w.c.Hints, fmt.Sprintf("The difference shrinks from %s to %s of the signal if %s.", short2(base), short2(g.rms), g.words))
	}
	return nil
}

// otherTime reads the loudest mode with the other meaning of time and returns
// its misfit, scaled to stand for all modes.
func (w *waves) otherTime(pairs []*pair) (float64, bool, error) {
	if w.ret == nil {
		return 0, false, nil
	}
	p := pairs[0]
	for _, q := range pairs {
		if q.scale > p.scale {
			p = q
		}
	}
	alt := &waves{in: w.in, conv: w.conv, ret: w.ret, c: w.c}
	t := w.in.Model.Times()
	if w.conv.TimeIs == "retarded" {
		alt.conv.TimeIs = "particle"
		u, from, to, err := w.ret.shift(t)
		if err != nil {
			return 0, false, nil
		}
		t, alt.from, alt.to = u, from, to
	} else {
		alt.conv.TimeIs, alt.from, alt.to = "retarded", 0, len(t)
	}
	if len(t) < taps {
		return 0, false, nil
	}
	alt.times = newAxis(t)
	if alt.window(0) != nil {
		return 0, false, nil
	}
	q, err := alt.pair([2]int{p.l, p.m})
	if err != nil {
		return 0, false, err
	}
	rms, _ := misfit([]*pair{q}, func(p *pair, i int) complex128 { return p.model[i] })
	return rms, true, nil
}
