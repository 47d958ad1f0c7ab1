package source

import "math"

// SpinHarmonics fills dst[i] with the spin-weighted spherical harmonics
// sY_{l m}(theta, 0), l = lmin + i, for lmin >= max(|s|,|m|), in the phase
// convention with -2Y22 = sqrt(5/64 pi)(1+cos theta)^2 and the Condon–Shortley
// 0Y_lm (J. N. Goldberg et al., J. Math. Phys. 8, 2155 (1967), up to (-1)^m).
// The lowest one is a closed form, the rest follow from the three-term
// recurrence of cos theta, which is stable upwards.
func SpinHarmonics(dst []float64, s, m, lmin int, theta float64) {
	low := max(s, -s, m, -m)
	if lmin < low {
		panic("source: spin-weighted harmonic below its lowest l")
	}
	z := math.Cos(theta)
	prev, cur := 0.0, lowestHarmonic(s, m, low, theta)
	for l := low; l < lmin+len(dst); l++ {
		if l >= lmin {
			dst[l-lmin] = cur
		}
		diag := 0.0
		if l > 0 {
			diag = -float64(m*s) / float64(l*(l+1))
		}
		next := (z - diag) * cur
		if l > low {
			next -= cosStep(s, m, l-1) * prev
		}
		prev, cur = cur, next/cosStep(s, m, l)
	}
}

// cosStep returns <l|cos theta|l+1> between harmonics of spin weight s.
func cosStep(s, m, l int) float64 {
	p := (l + 1) * (l + 1)
	return math.Sqrt(float64((p-m*m)*(p-s*s)) / (float64(p) * float64((2*l+1)*(2*l+3))))
}

func lowestHarmonic(s, m, l int, theta float64) float64 {
	c, n := math.Cos(theta/2), math.Sin(theta/2)
	norm := func(k int) float64 { // sqrt((2l+1)/4 pi C(2l, k))
		lg := func(i int) float64 { v, _ := math.Lgamma(float64(i) + 1); return v }
		b := 1.0
		if l <= 15 {
			for j := 1; j <= k; j++ {
				b = b * float64(2*l-k+j) / float64(j)
			}
		} else {
			b = math.Exp(lg(2*l) - lg(k) - lg(2*l-k))
		}
		return math.Sqrt(float64(2*l+1) / (4 * math.Pi) * b)
	}
	sign := func(odd int) float64 {
		if odd%2 != 0 {
			return -1
		}
		return 1
	}
	pow := func(b float64, k int) float64 { return math.Pow(b, float64(k)) }
	switch l {
	case m:
		return sign(l) * norm(l-s) * pow(c, l-s) * pow(n, l+s)
	case -m:
		return sign(s) * norm(l+s) * pow(c, l+s) * pow(n, l-s)
	case -s:
		return sign(l) * norm(l+m) * pow(c, l+m) * pow(n, l-m)
	default: // l == s
		return sign(m) * norm(l-m) * pow(c, l-m) * pow(n, l+m)
	}
}
