package signal

import "math"

// gregory are the end corrections of the trapezoidal sum by differences of
// order 1 to 6: coefficients of the reciprocal logarithm's series.
//
// Source: J. Gregory's formula, e.g. F. B. Hildebrand, Introduction to
// Numerical Analysis (1974), section 5.9 (from memory; the test holds it to
// exactness for polynomials).
func gregory() [6]float64 {
	return [6]float64{1. / 12, 1. / 24, 19. / 720, 3. / 160, 863. / 60480, 275. / 24192}
}

// Integral is the integral of the uniform samples f over their whole span, with
// an estimate of the quadrature's error: the trapezoidal sum with Gregory's end
// corrections of order 7, against the same rule on every second sample. With
// fewer than 8 samples the corrections stop earlier.
func Integral(f []float64, dt float64) (value, quadrature float64) {
	value = rule(f, dt, 1)
	if len(f) < 3 {
		return value, math.Abs(value)
	}
	// An even number of samples has no half as many intervals: both are then
	// compared on all but the last interval.
	n := len(f)
	if n%2 == 0 {
		n--
	}
	return value, math.Abs(rule(f[:n], dt, 1)-rule(f[:n], dt, 2)) + 4*epsilon*absolute(f, dt)
}

func rule(f []float64, dt float64, stride int) float64 {
	n := (len(f)-1)/stride + 1
	if n < 2 {
		return 0
	}
	var sum float64
	for k := range n {
		w := 1.0
		if k == 0 || k == n-1 {
			w = 0.5
		}
		sum += w * f[k*stride]
	}
	var left, right [7]float64
	m := min(len(left), n)
	for k := range m {
		left[k], right[k] = f[k*stride], f[(n-1-k)*stride]
	}
	g := gregory()
	for d := 1; d < m; d++ {
		for k := 0; k < m-d; k++ {
			left[k] = left[k+1] - left[k]
			right[k] = right[k] - right[k+1]
		}
		// Forward differences at the left, backward ones at the right.
		sign := 1.0
		if d%2 == 1 {
			sign = -1
		}
		sum -= g[d-1] * (right[0] + sign*left[0])
	}
	return sum * dt * float64(stride)
}

func absolute(f []float64, dt float64) float64 {
	var sum float64
	for _, v := range f {
		sum += math.Abs(v)
	}
	return sum * dt
}

// Rest bounds what the integral of |f| beyond the last sample adds, from how
// fast f falls over the last two stretches of the given number of samples: the
// larger of what an exponential and what a power of the time since origin
// (counted in samples before the first of f, e.g. minus the index of a burst's
// middle) go on to give. noise bounds the errors of f; a stretch that is all
// inside it, or below 1e-12 of the whole, counts as settled and adds its own
// integral. ok is false when f
// does not fall: then nothing is known about the rest.
func Rest(f, noise []float64, dt float64, stretch int, origin float64) (bound float64, ok bool) {
	n := len(f)
	stretch = min(stretch, n/2)
	if stretch < 1 {
		return 0, false
	}
	last := absolute(f[n-stretch:], dt)
	before := absolute(f[n-2*stretch:n-stretch], dt)
	if last == 0 {
		return 0, true
	}
	settled := noise != nil
	for k := n - stretch; k < n && settled; k++ {
		settled = math.Abs(f[k]) <= noise[k]
	}
	if settled {
		return last, true
	}
	if last <= negligible*absolute(f, dt) {
		return last, true
	}
	r := last / before
	if !(r < 0.97) {
		return 0, false
	}
	bound = last * r / (1 - r)
	// Power t^-p: bisect the p for which the stretches' integrals have ratio r.
	c := float64(n) + origin
	b, a := c-float64(stretch), c-2*float64(stretch)
	if a > 0 {
		low, high := 1.05, 200.0
		ratio := func(p float64) float64 {
			y, z := math.Pow(b/a, 1-p), math.Pow(c/a, 1-p)
			return (y - z) / (1 - y)
		}
		if ratio(low) <= r {
			return 0, false // an integral that hardly converges
		}
		if ratio(high) < r {
			for range 60 {
				if p := (low + high) / 2; ratio(p) > r {
					low = p
				} else {
					high = p
				}
			}
			// The integral beyond c in terms of that over the last stretch.
			bound = math.Max(bound, last/(math.Pow(c/b, high-1)-1))
		}
	}
	return doubt * bound, true
}

// negligible is the fraction of the whole below which a stretch counts as
// settled whatever it does: the floor of an evolution.
const negligible = 1e-12

// doubt multiplies an extrapolated rest: neither law holds exactly.
const doubt = 1.5

// Reverse returns f backwards, in new memory.
func Reverse(f []float64) []float64 {
	out := make([]float64, len(f))
	for k, v := range f {
		out[len(f)-1-k] = v
	}
	return out
}
