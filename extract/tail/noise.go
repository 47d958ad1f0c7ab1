package tail

import "math"

// noise estimates the round-off level of a series from the series itself: the
// sixth differences of a smooth signal that is sampled densely vanish, those of
// white noise of size e have the rms e sqrt(C(12,6)). The rms is taken over
// blocks. Round-off that is not white is underestimated: the difference to a
// second run is what tells of it.
type noise struct {
	block int
	white []float64 // rms level of white noise, a block
	apart []float64 // rms difference to the second run, a block; zero without one
}

const diffOrder = 6

// ringOut keeps the half waves of the ringing from counting as long.
const ringOut = 100.0

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
		sum, apart := 0.0, 0.0
		for k := a; k < b; k++ {
			sum += d[k] * d[k]
			if s.Other != nil {
				apart += (s.Values[k] - s.Other[k]) * (s.Values[k] - s.Other[k])
			}
		}
		n.white = append(n.white, math.Sqrt(sum/float64(b-a)))
		n.apart = append(n.apart, math.Sqrt(apart/float64(b-a)))
	}
	return n
}

// level is the absolute round-off level around sample k.
func (n *noise) level(k int) float64 {
	b := min(k/n.block, len(n.white)-1)
	return math.Max(n.white[b], n.apart[b])
}

// eats tells whether at sample k, of value v, noise has taken over: white noise
// above the fraction eaten of the signal, or two runs that differ by more than
// the fraction parted.
func (n *noise) eats(k int, v float64) bool {
	b := min(k/n.block, len(n.white)-1)
	return n.white[b] > eaten*math.Abs(v) || n.apart[b] > parted*math.Abs(v)
}

// quiet finds the stretch [begin, end] inside [lo, hi] on which a power law may
// be sought: of those after the peak without a zero of psi, and where noise has
// not taken over, the one with the largest ratio
// of its end to its start, times counted from ringOut before the peak. full is
// where noise takes over for good (the end of the series if it does not).
func quiet(s Series, n *noise, lo, hi float64) (begin, end, full float64) {
	a, b := s.index(lo), s.index(hi)
	peak := 0
	for k, v := range s.Values {
		if math.Abs(v) > math.Abs(s.Values[peak]) {
			peak = k
		}
	}
	a = max(a, min(peak, b))
	zero := s.time(peak) - ringOut
	full = s.time(b)
	for k := b; k > a && n.eats(k, s.Values[k]); k-- {
		full = s.time(k)
	}
	start := a
	longest := 1.0
	closeAt := func(k int) {
		if t0, t1 := s.time(start), s.time(k); t1 > t0 && (t1-zero)/(t0-zero) > longest {
			longest, begin, end = (t1-zero)/(t0-zero), t0, t1
		}
	}
	for k := a + 1; k <= b; k++ {
		crosses := s.Values[k] == 0 || math.Signbit(s.Values[k]) != math.Signbit(s.Values[k-1])
		if crosses || n.eats(k, s.Values[k]) {
			closeAt(k - 1)
			start = k
		}
	}
	closeAt(b)
	return begin, end, full
}
