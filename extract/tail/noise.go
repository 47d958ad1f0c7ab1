package tail

import "math"

// noise estimates the round-off level of a series from the series itself: the
// sixth differences of a smooth signal that is sampled densely vanish, those of
// white noise of size e have the rms e sqrt(C(12,6)). The rms is taken over
// blocks. Round-off that is not white is underestimated: the difference to a
// second run, in the fits, is what tells of it.
type noise struct {
	block  int
	levels []float64
}

const diffOrder = 6

func newNoise(s Series) *noise {
	n := &noise{block: 32}
	d := make([]float64, len(s.Values))
	c := [diffOrder + 1]float64{1, -6, 15, -20, 15, -6, 1}
	norm := 1 / math.Sqrt(924)
	for k := range d {
		i := max(0, min(k-diffOrder/2, len(d)-diffOrder-1))
		v := 0.0
		for j, w := range c {
			v += w * s.Values[i+j]
		}
		d[k] = v * norm
	}
	for a := 0; a < len(d); a += n.block {
		b := min(a+n.block, len(d))
		sum := 0.0
		for k := a; k < b; k++ {
			sum += d[k] * d[k]
		}
		n.levels = append(n.levels, math.Sqrt(sum/float64(b-a)))
	}
	return n
}

// level is the absolute round-off level around sample k.
func (n *noise) level(k int) float64 {
	return n.levels[min(k/n.block, len(n.levels)-1)]
}

// quiet finds the stretch [begin, end] inside [lo, hi] on which a power law may
// be sought: the longest in ln u without a zero of psi, ended early where the
// noise exceeds the fraction eaten of the signal. full is where noise takes
// over for good (the end of the series if it does not).
func quiet(s Series, n *noise, lo, hi float64) (begin, end, full float64) {
	a, b := s.index(lo), s.index(hi)
	full = s.time(b)
	for k := b; k > a && n.level(k) > eaten*math.Abs(s.Values[k]); k-- {
		full = s.time(k)
	}
	start := a
	bestLen := 0.0
	closeAt := func(k int) {
		if t0, t1 := s.time(start), s.time(k); t0 > 0 && t1 > t0 && math.Log(t1/t0) > bestLen {
			bestLen, begin, end = math.Log(t1/t0), t0, t1
		}
	}
	for k := a + 1; k <= b; k++ {
		zero := s.Values[k] == 0 || math.Signbit(s.Values[k]) != math.Signbit(s.Values[k-1])
		if zero || n.level(k) > eaten*math.Abs(s.Values[k]) {
			closeAt(k - 1)
			start = k
		}
	}
	closeAt(b)
	return begin, end, full
}
