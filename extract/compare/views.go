package compare

import (
	"math"
	"math/cmplx"

	"nullmark/extract/result"
)

// harmonic is the spin-weighted spherical harmonic -2Y_lm(theta, 0) in the
// convention -2Y_22 = sqrt(5/64 pi) (1+cos theta)^2:
//
//	(-1)^s sqrt((2l+1)/4pi) d^l_{m,-s}(theta), s = -2, with Wigner's d as a sum
//
// Source: J. N. Goldberg et al., J. Math. Phys. 8, 2155 (1967), with the sign
// of the formula above.
func harmonic(l, m int, theta float64) float64 {
	f := func(n int) float64 { return math.Gamma(float64(n + 1)) }
	c, s := math.Cos(theta/2), math.Sin(theta/2)
	sum := 0.0
	for k := max(0, m-2); k <= min(l+m, l-2); k++ {
		t := math.Sqrt(f(l+m)*f(l-m)*f(l+2)*f(l-2)) / (f(l+m-k) * f(l-2-k) * f(k) * f(k+2-m))
		if k%2 == 1 {
			t = -t
		}
		sum += t * math.Pow(c, float64(2*l+m-2*k-2)) * math.Pow(s, float64(2*k+2-m))
	}
	return math.Sqrt(float64(2*l+1)/(4*math.Pi)) * sum
}

// view sums the modes as seen from inclination theta and azimuth 0; modes with
// m > 0 whose partner is not listed stand for both by
// h_{l,-m} = (-1)^l conj(h_lm), exact for equatorial orbits.
func view(pairs []*pair, theta float64) (model, ref []complex128, bar []float64) {
	n := len(pairs[0].u)
	model, ref, bar = make([]complex128, n), make([]complex128, n), make([]float64, n)
	listed := map[[2]int]bool{}
	for _, p := range pairs {
		listed[[2]int{p.l, p.m}] = true
	}
	for _, p := range pairs {
		y := complex(harmonic(p.l, p.m, theta), 0)
		var y2 complex128
		if p.m > 0 && !listed[[2]int{p.l, -p.m}] {
			y2 = complex(harmonic(p.l, -p.m, theta), 0)
			if p.l%2 == 1 {
				y2 = -y2
			}
		}
		w := cmplx.Abs(y) + cmplx.Abs(y2)
		for i := range model {
			model[i] += y*p.model[i] + y2*cmplx.Conj(p.model[i])
			ref[i] += y*p.ref[i] + y2*cmplx.Conj(p.ref[i])
			bar[i] += w * p.bar(i)
		}
	}
	return model, ref, bar
}

// views are the mismatches of the summed modes from above and from the side.
func views(pairs []*pair, noise *Noise, d int) []result.View {
	var out []result.View
	for _, v := range []struct {
		from  string
		theta float64
	}{{"face-on", 0}, {"edge-on", math.Pi / 2}} {
		model, ref, bar := view(pairs, v.theta)
		if q, ok := mismatch(pairs[0].u, ref, model, bar, noise); ok {
			s, is := visible(q, d)
			out = append(out, result.View{From: v.from, Mismatch: q, SNRVisible: s, SNRIs: is})
		}
	}
	return out
}
