package worldline

import "math"

// spline is an interpolating spline of degree splineDegree with knots at the
// data ("not a knot" at the ends), stored as one Chebyshev series an interval.
// C. de Boor, A Practical Guide to Splines (1978), chapters IX, X and XIII.
const (
	splineDegree = 9
	splineCoef   = splineDegree + 1
)

type spline struct {
	t     []float64
	base  []float64             // value at t[i]
	coef  [][splineCoef]float64 // value - base in xi in [-1,1]
	slope [][splineCoef]float64 // d/dt
}

// newSpline needs at least splineCoef increasing t.
func newSpline(t, v []float64) *spline {
	n, k := len(t), splineDegree
	knots := make([]float64, 0, n+k+1)
	for range k + 1 {
		knots = append(knots, t[0])
	}
	knots = append(knots, t[(k+1)/2:n-(k+1)/2]...)
	for range k + 1 {
		knots = append(knots, t[n-1])
	}
	span := func(x float64, from int) int {
		i := max(from, k)
		for i < n-1 && x >= knots[i+1] {
			i++
		}
		return i
	}
	// banded collocation matrix, totally positive: no pivoting is needed
	width := 2*k + 1
	band := make([]float64, n*width)
	// What is solved for is the departure from the chord: the rounding of the
	// solution goes with its size, and an azimuth grows without end.
	chord := (v[n-1] - v[0]) / (t[n-1] - t[0])
	b := make([]float64, n)
	for i := range b {
		b[i] = math.FMA(-chord, t[i], v[i])
	}
	u := append([]float64(nil), b...)
	var basis [splineCoef]float64
	at := 0
	for i := range n {
		at = span(t[i], at)
		bsplines(&basis, knots, at, t[i])
		for j := range basis {
			if c := at - k + j - i + k; c >= 0 && c < width {
				band[i*width+c] = basis[j]
			}
		}
	}
	for i := range n {
		for r := i + 1; r <= min(n-1, i+k); r++ {
			w := band[r*width+i-r+k]
			if w == 0 {
				continue
			}
			w /= band[i*width+k]
			for c := i; c <= min(n-1, i+k); c++ {
				band[r*width+c-r+k] -= w * band[i*width+c-i+k]
			}
			b[r] -= w * b[i]
		}
	}
	for i := n - 1; i >= 0; i-- {
		for c := i + 1; c <= min(n-1, i+k); c++ {
			b[i] -= band[i*width+c-i+k] * b[c]
		}
		b[i] /= band[i*width+k]
	}
	s := &spline{
		t: t, base: v,
		coef:  make([][splineCoef]float64, n-1),
		slope: make([][splineCoef]float64, n-1),
	}
	at = 0
	for i := range n - 1 {
		h := t[i+1] - t[i]
		at = span(t[i]+h/2, at)
		var val, c [splineCoef]float64
		for j := range val {
			x := t[i] + h/2*(1+math.Cos(math.Pi*(float64(j)+0.5)/splineCoef))
			bsplines(&basis, knots, at, x)
			for m := range basis {
				val[j] += basis[m] * (b[at-k+m] - u[i])
			}
		}
		for m := range c {
			for j := range val {
				c[m] += val[j] * math.Cos(math.Pi*float64(m)*(float64(j)+0.5)/splineCoef)
			}
			c[m] *= 2.0 / splineCoef
		}
		c[0] = c[0]/2 + chord*h/2
		c[1] += chord * h / 2
		s.coef[i] = c
		var d [splineCoef + 2]float64
		for m := splineCoef - 2; m >= 0; m-- {
			d[m] = d[m+2] + 2*float64(m+1)*c[m+1]
		}
		d[0] /= 2
		for m := range splineCoef {
			s.slope[i][m] = d[m] * 2 / h
		}
	}
	return s
}

// bsplines fills the k+1 B-splines that do not vanish on [knots[i],knots[i+1]).
func bsplines(b *[splineCoef]float64, knots []float64, i int, x float64) {
	var left, right [splineCoef]float64
	b[0] = 1
	for j := 1; j < splineCoef; j++ {
		left[j] = x - knots[i+1-j]
		right[j] = knots[i+j] - x
		saved := 0.0
		for r := range j {
			w := b[r] / (right[r+1] + left[j-r])
			b[r] = saved + right[r+1]*w
			saved = left[j-r] * w
		}
		b[j] = saved
	}
}

// find returns the interval that holds t.
func (s *spline) find(t float64) int {
	lo, hi := 0, len(s.t)-1
	for hi-lo > 1 {
		mid := int(uint(lo+hi) >> 1)
		if t >= s.t[mid] {
			lo = mid
		} else {
			hi = mid
		}
	}
	return lo
}

// at returns the increment over base[i] and the time derivative in interval i.
func (s *spline) at(i int, t float64) (inc, slope float64) {
	x := 2*(t-s.t[i])/(s.t[i+1]-s.t[i]) - 1
	return series10(&s.coef[i], x), series10(&s.slope[i], x)
}

func series10(c *[splineCoef]float64, x float64) float64 {
	x2 := 2 * x
	var b1, b2 float64
	for k := splineCoef - 1; k >= 1; k-- {
		b1, b2 = c[k]+x2*b1-b2, b1
	}
	return c[0] + x*b1 - b2
}
