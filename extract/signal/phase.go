package signal

import (
	"math"
	"math/cmplx"
)

// Phase returns phi with h = |h| e^{-i phi}, continuous in time, and for each
// sample whether its branch is sure. The branch is the one nearest to what the
// last two sure steps extrapolate to, so that a series may turn by more than
// half a turn a sample as long as its rate changes slowly; only the very first
// step is taken to be less than half a turn. A sample whose modulus is within
// its bar has no phase of its own: it gets the extrapolated one and is not
// sure, and so is one that is more than 2 rad away from it (a zero was passed
// close by; the branch there is a convention).
func Phase(s Series) (phi []float64, sure []bool) {
	n := len(s.Values)
	phi, sure = make([]float64, n), make([]bool, n)
	step, change, known := 0.0, 0.0, 0
	for k, v := range s.Values {
		seen := cmplx.Abs(v) > 2*s.Bar(k) && v != 0
		if k == 0 {
			if seen {
				phi[0], sure[0] = -cmplx.Phase(v), true
			}
			continue
		}
		expected := phi[k-1] + step + change
		if !seen {
			phi[k] = expected
			continue
		}
		raw := -cmplx.Phase(v)
		phi[k] = raw + 2*math.Pi*math.Round((expected-raw)/(2*math.Pi))
		sure[k] = math.Abs(phi[k]-expected) <= 2 || known == 0
		if !sure[k] || !sure[k-1] {
			continue
		}
		now := phi[k] - phi[k-1]
		if known > 0 {
			// Half of the last change of the rate: a full linear extrapolation
			// doubles the noise of faint samples.
			change = (now - step) / 2
		}
		step = now
		known++
	}
	return phi, sure
}
