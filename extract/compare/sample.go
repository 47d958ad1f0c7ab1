package compare

import (
	"math"
	"math/cmplx"
)

// taps is the number of samples a local interpolant goes through.
const taps = 10

// axis is a strictly increasing set of sample times.
type axis struct {
	t       []float64
	uniform bool
	dt      float64 // mean spacing
}

func newAxis(t []float64) axis {
	n := len(t)
	a := axis{t: t, uniform: true, dt: (t[n-1] - t[0]) / float64(n-1)}
	tol := 1e-9*a.dt + 4*2.2e-16*math.Max(math.Abs(t[0]), math.Abs(t[n-1]))
	for i, x := range t {
		if math.Abs(x-t[0]-float64(i)*a.dt) > tol {
			a.uniform = false
			break
		}
	}
	return a
}

// find returns j with t[j] <= u <= t[j+1], starting the search at hint.
func (a axis) find(u float64, hint int) int {
	n := len(a.t)
	j := min(max(hint, 0), n-2)
	for j < n-2 && a.t[j+1] <= u {
		j++
		if j-hint > 8 { // far off: bisect the rest
			lo, hi := j, n-2
			for lo < hi {
				mid := (lo + hi + 1) / 2
				if a.t[mid] <= u {
					lo = mid
				} else {
					hi = mid - 1
				}
			}
			return lo
		}
	}
	for j > 0 && a.t[j] > u {
		j--
	}
	return j
}

// fornberg fills w[k], k < len(nodes), with the weights of the deriv-th
// derivative at x over the given distinct nodes.
//
// Source: B. Fornberg, Math. Comp. 51, 699 (1988).
func fornberg(w []float64, x float64, nodes []float64, deriv int) {
	n := len(nodes)
	var c [3][taps + 3]float64
	c[0][0] = 1
	c1, c4 := 1.0, nodes[0]-x
	for i := 1; i < n; i++ {
		mn := min(i, deriv)
		c2, c5 := 1.0, c4
		c4 = nodes[i] - x
		for j := 0; j < i; j++ {
			c3 := nodes[i] - nodes[j]
			c2 *= c3
			if j == i-1 {
				for k := mn; k > 0; k-- {
					c[k][i] = c1 * (float64(k)*c[k-1][i-1] - c5*c[k][i-1]) / c2
				}
				c[0][i] = -c1 * c5 * c[0][i-1] / c2
			}
			for k := mn; k > 0; k-- {
				c[k][j] = (c4*c[k][j] - float64(k)*c[k-1][j]) / c3
			}
			c[0][j] = c4 * c[0][j] / c3
		}
		c1 = c2
	}
	copy(w, c[deriv][:n])
}

// binomials[n] are the barycentric weights of n equidistant nodes.
var binomials = func() (b [taps + 1][]float64) {
	for n := 1; n <= taps; n++ {
		row := make([]float64, n)
		row[0] = 1
		for k := 1; k < n; k++ {
			row[k] = -row[k-1] * float64(n-k) / float64(k)
		}
		b[n] = row
	}
	return b
}()

// weightsAt fills w with interpolation weights at u for samples first … first+n-1.
func (a axis) weightsAt(w []float64, u float64, first int) {
	n := len(w)
	if !a.uniform {
		fornberg(w, u, a.t[first:first+n], 0)
		return
	}
	x := (u - a.t[first]) / a.dt
	sum := 0.0
	for k, b := range binomials[n] {
		d := x - float64(k)
		if d == 0 {
			for i := range w {
				w[i] = 0
			}
			w[k] = 1
			return
		}
		w[k] = b / d
		sum += w[k]
	}
	for k := range w {
		w[k] /= sum
	}
}

// carrier returns the mean rotation rate omega of z ~ e^{-i omega t} over the
// samples, weighted with |z|^2; taking it out leaves a slow function.
func carrier(t []float64, z []complex128) float64 {
	var s complex128
	for k := 1; k < len(z); k++ {
		s += z[k] * cmplx.Conj(z[k-1])
	}
	if s == 0 {
		return 0
	}
	return -cmplx.Phase(s) * float64(len(z)-1) / (t[len(t)-1] - t[0])
}

// resample writes z(u[i]) into dst and an estimate of the interpolation's
// error into miss (added to what is there). The times u increase and lie in
// the axis' range. A sample that exists is copied. Each value comes from the
// polynomial through the nearest samples after their common rotation has been
// taken out; its error estimate is the distance to the polynomial of two
// samples fewer.
func (a axis) resample(dst []complex128, miss []float64, u []float64, z []complex128) {
	n := len(z)
	full := min(taps, n)
	part := max(full-2, 1)
	var w, v [taps]float64
	var slow [taps]complex128
	j := 0
	for i, x := range u {
		j = a.find(x, j)
		if a.t[j] == x {
			dst[i] = z[j]
			continue
		}
		if a.t[j+1] == x {
			dst[i] = z[j+1]
			continue
		}
		first := min(max(j-full/2+1, 0), n-full)
		om := carrier(a.t[first:first+full], z[first:first+full])
		if a.uniform {
			s, c := math.Sincos(om * (a.t[first] - x))
			r := complex(c, s)
			s, c = math.Sincos(om * a.dt)
			q := complex(c, s)
			for k := 0; k < full; k++ {
				slow[k] = z[first+k] * r
				r *= q
			}
		} else {
			for k := 0; k < full; k++ {
				s, c := math.Sincos(om * (a.t[first+k] - x))
				slow[k] = z[first+k] * complex(c, s)
			}
		}
		a.weightsAt(w[:full], x, first)
		inner := min(max(j-part/2+1, first), first+full-part)
		a.weightsAt(v[:part], x, inner)
		var hi, lo complex128
		for k := 0; k < full; k++ {
			hi += complex(w[k], 0) * slow[k]
		}
		for k := 0; k < part; k++ {
			lo += complex(v[k], 0) * slow[inner-first+k]
		}
		dst[i] = hi
		miss[i] += cmplx.Abs(hi - lo)
	}
}

// addBar adds to dst, at the increasing times u, the larger of the two
// neighbouring bars; a nil bar adds nothing.
func (a axis) addBar(dst, u, bar []float64) {
	if bar == nil {
		return
	}
	j := 0
	for i, x := range u {
		j = a.find(x, j)
		dst[i] += math.Max(bar[j], bar[j+1])
	}
}

// resampleReal is resample for a real, slowly varying function, without an
// error estimate.
func (a axis) resampleReal(dst, u, y []float64) {
	n := len(y)
	full := min(taps, n)
	var w [taps]float64
	j := 0
	for i, x := range u {
		j = a.find(x, j)
		first := min(max(j-full/2+1, 0), n-full)
		a.weightsAt(w[:full], x, first)
		s := 0.0
		for k := 0; k < full; k++ {
			s += w[k] * y[first+k]
		}
		dst[i] = s
	}
}

// rate writes dz/dt at the samples, by the polynomial through the nearest
// samples (most of them, 9 or fewer) after their common rotation has been
// taken out. dst and z must not be the same.
func (a axis) rate(dst, z []complex128, most int) {
	n := len(z)
	full := min(most, n)
	var w [taps]float64
	known := -1 // position in the stencil that w is for, on a uniform axis
	for i := range z {
		first := min(max(i-full/2, 0), n-full)
		if !a.uniform || i-first != known {
			fornberg(w[:full], a.t[i], a.t[first:first+full], 1)
			known = i - first
		}
		om := carrier(a.t[first:first+full], z[first:first+full])
		var d complex128
		for k := 0; k < full; k++ {
			s, c := math.Sincos(om * (a.t[first+k] - a.t[i]))
			d += complex(w[k], 0) * z[first+k] * complex(c, s)
		}
		dst[i] = d - complex(0, om)*z[i]
	}
}

// twiceIntegrated returns H with H” = z, H = H' = 0 at the first sample: each
// interval integrates the polynomial through the nearest samples, at most of
// them (8 or fewer).
func (a axis) twiceIntegrated(z []complex128, most int) []complex128 {
	n := len(z)
	full := min(most, n)
	out := make([]complex128, n)
	var once, twice [taps]float64
	known := -1
	var h, slope complex128
	for i := 0; i+1 < n; i++ {
		first := min(max(i-full/2+1, 0), n-full)
		if !a.uniform || i-first != known {
			integrals(once[:full], twice[:full], a.t[first:first+full], i-first)
			known = i - first
		}
		var i1, i2 complex128
		for k := 0; k < full; k++ {
			i1 += complex(once[k], 0) * z[first+k]
			i2 += complex(twice[k], 0) * z[first+k]
		}
		dt := a.t[i+1] - a.t[i]
		h += slope*complex(dt, 0) + i2
		slope += i1
		out[i+1] = h
	}
	return out
}

// integrals fills the weights of int f and of int (b-s) f(s) ds over
// [nodes[p], nodes[p+1]] = [a, b] for the interpolating polynomial of f, by
// Gauss–Legendre quadrature with five points (exact to degree 9).
func integrals(once, twice, nodes []float64, p int) {
	x := [5]float64{-0.906179845938663992797626878299, -0.538469310105683091036314420700, 0, 0.538469310105683091036314420700, 0.906179845938663992797626878299}
	g := [5]float64{0.236926885056189087514264040720, 0.478628670499366468041291514836, 0.568888888888888888888888888889, 0.478628670499366468041291514836, 0.236926885056189087514264040720}
	for k := range once {
		once[k], twice[k] = 0, 0
	}
	lo, hi := nodes[p], nodes[p+1]
	var w [taps]float64
	for q := range x {
		s := lo + (hi-lo)*(1+x[q])/2
		fornberg(w[:len(nodes)], s, nodes, 0)
		f := g[q] * (hi - lo) / 2
		for k := range once {
			once[k] += f * w[k]
			twice[k] += f * (hi - s) * w[k]
		}
	}
}
