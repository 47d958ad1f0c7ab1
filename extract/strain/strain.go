// Package strain turns master functions at null infinity into the strain
// h = h+ - i hx = (1/r) sum h_lm -2Y_lm, and resamples series.
package strain

import (
	"math"

	"nullmark/extract/flux"
)

// Factor is r h_lm/(mu Psi): (1/2) sqrt((l+2)!/(l-2)!) for the even
// (Zerilli–Moncrief) and i times that for the odd (Cunningham–Price–Moncrief)
// master function. The odd sign is fixed by complex (2,1) strains computed
// independently in the frequency domain.
func Factor(l int, odd bool) complex128 {
	a := complex(math.Sqrt(flux.Norm(l))/2, 0)
	if odd {
		return a * 1i
	}
	return a
}

// Resample interpolates a uniformly sampled series (sample k at start + k dt)
// at the given ascending times with local polynomials of degree 9. Times
// outside the samples by more than a rounding are a programmer's error: it
// panics.
func Resample(values []complex128, start, dt float64, at []float64) []complex128 {
	const width = 10
	if len(values) < width {
		panic("strain: too few samples to interpolate")
	}
	// Barycentric weights of equidistant nodes: (-1)^j C(width-1, j).
	var w [width]float64
	w[0] = 1
	for j := 1; j < width; j++ {
		w[j] = -w[j-1] * float64(width-j) / float64(j)
	}
	out := make([]complex128, len(at))
	for i, t := range at {
		x := (t - start) / dt
		if x < -1e-6 || x > float64(len(values)-1)+1e-6 {
			panic("strain: time outside the samples")
		}
		k := int(math.Floor(x)) - width/2 + 1
		k = max(0, min(k, len(values)-width))
		var num complex128
		var den float64
		exact := false
		for j := 0; j < width; j++ {
			d := x - float64(k+j)
			if d == 0 {
				out[i], exact = values[k+j], true
				break
			}
			c := w[j] / d
			num += complex(c, 0) * values[k+j]
			den += c
		}
		if !exact {
			out[i] = num / complex(den, 0)
		}
	}
	return out
}
