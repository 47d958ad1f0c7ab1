package worldline

import (
	"math"
	"sync"
)

// The pieces of a dense solution: derivatives are polynomials of this degree
// through the Chebyshev points of a piece, the increments of the unknowns are
// their integrals.
const (
	degree   = 16
	nodes    = degree + 1
	ncoef    = degree + 2
	maxVars  = 4
	maxSweep = 60
)

// spectral holds the collocation tables of one piece in xi in [-1,1]:
// points[j] = -cos(pi j/degree); toSeries[k][j] maps values to Chebyshev
// coefficients; integral[i][j] maps values of a derivative to the integral from
// -1 to points[i] (C. W. Clenshaw & A. R. Curtis, Numer. Math. 2, 197 (1960)).
type spectral struct {
	points   [nodes]float64
	toSeries [nodes][nodes]float64
	integral [nodes][nodes]float64
}

var tables = sync.OnceValue(func() *spectral {
	s := new(spectral)
	n := degree
	cheb := func(k, j int) float64 { // T_k(points[j]), exact symmetries
		a := k * j % (2 * n)
		v := math.Cos(math.Pi * float64(a) / float64(n))
		if 2*a == n || 2*a == 3*n {
			v = 0
		}
		if k%2 == 1 {
			v = -v
		}
		return v
	}
	for j := range nodes {
		s.points[j] = cheb(1, j)
		for k := range nodes {
			w := 2 / float64(n)
			if j == 0 || j == n {
				w /= 2
			}
			if k == 0 || k == n {
				w /= 2
			}
			s.toSeries[k][j] = w * cheb(k, j)
		}
	}
	for j := range nodes {
		var d [nodes]float64
		for k := range nodes {
			d[k] = s.toSeries[k][j]
		}
		c := integrate(&d)
		for i := range nodes {
			sum := 0.0
			for k := ncoef - 1; k >= 0; k-- {
				sum += c[k] * cheb(k, i)
			}
			s.integral[i][j] = sum
		}
	}
	for j := range nodes {
		s.integral[0][j] = 0
	}
	return s
})

// integrate turns the Chebyshev series d into that of its integral from -1.
func integrate(d *[nodes]float64) (c [ncoef]float64) {
	get := func(k int) float64 {
		if k >= nodes {
			return 0
		}
		return d[k]
	}
	c[1] = d[0] - get(2)/2
	for k := 2; k < ncoef; k++ {
		c[k] = (get(k-1) - get(k+1)) / (2 * float64(k))
	}
	for k := ncoef - 1; k >= 1; k-- {
		if k%2 == 1 {
			c[0] += c[k]
		} else {
			c[0] -= c[k]
		}
	}
	return c
}

// clenshaw evaluates sum c_k T_k(x).
func clenshaw(c *[ncoef]float64, x float64) float64 {
	x2 := 2 * x
	var b1, b2 float64
	for k := ncoef - 1; k >= 1; k-- {
		b1, b2 = c[k]+x2*b1-b2, b1
	}
	return c[0] + x*b1 - b2
}

// system is a first-order autonomous system of at most maxVars unknowns.
// Unknown 1 is always the azimuth.
type system interface {
	vars() int
	// rates fills d = dx/dt and reports whether x is inside the domain.
	rates(chart int8, x, d *[maxVars]float64) bool
	// scale is the size that errors of unknown i are held against.
	scale(chart int8, x *[maxVars]float64, i int) float64
	// rechart may move x = hi+lo to the other radial chart between two pieces.
	rechart(chart int8, hi, lo *[maxVars]float64) int8
}

// march integrates a system piece by piece. The unknowns are carried as
// unevaluated sums hi+lo, so that rounding does not accumulate.
type march struct {
	sys    system
	t, h   float64 // h is signed: the length that is tried next
	hi, lo [maxVars]float64
	chart  int8
	dense  *dense
}

const (
	tailTolerance = 1e-17 // of the scale, for the last coefficients of an increment
	noise         = 1e-15 // relative round-off of a rate
)

// maxPieces bounds the memory of a solution (about 0.6 kB a piece).
const maxPieces = 1 << 20

// step adds one piece, no longer than limit in time.
func (m *march) step(limit float64) error {
	if len(m.dense.pieces) > maxPieces {
		return m.failure("it takes too many pieces: the motion is too long or too extreme")
	}
	tb := tables()
	nv := m.sys.vars()
	var f [nodes][maxVars]float64
	var x, base, d [maxVars]float64
	for i := range nv {
		base[i] = m.hi[i]
	}
	if !m.sys.rates(m.chart, &base, &d) {
		return m.failure("the start of a piece is outside the domain")
	}
	h := m.h
	if math.Abs(h) > limit {
		h = math.Copysign(limit, h)
	}
	for range 60 {
		h = dyadic(m.t, h)
		if h == 0 {
			break
		}
		for j := range f {
			f[j] = d
		}
		ok, shrink := m.sweep(tb, nv, h, &f, &x)
		if !ok {
			h /= 2
			continue
		}
		var c [maxVars][ncoef]float64
		worst := 0.0
		for i := range nv {
			var s [nodes]float64
			big := 0.0
			for k := range nodes {
				sum := 0.0
				for j := range nodes {
					sum += tb.toSeries[k][j] * f[j][i]
				}
				s[k] = sum
				big = max(big, math.Abs(sum))
			}
			c[i] = integrate(&s)
			half := h / 2
			for k := range c[i] {
				c[i][k] *= half
			}
			tail := max(math.Abs(s[nodes-1]), math.Abs(s[nodes-2])) * math.Abs(half) / (2 * degree)
			allowed := tailTolerance*m.sys.scale(m.chart, &base, i) + noise*big*math.Abs(half)/(2*degree)
			worst = max(worst, tail/allowed)
		}
		if worst > 1 {
			h *= max(0.4, 0.9*math.Pow(worst, -1.0/degree))
			continue
		}
		m.accept(nv, h, &c)
		grow := 1.6
		if worst > 1e-6 {
			grow = min(grow, 0.95*math.Pow(worst, -1.0/degree))
		}
		if shrink {
			grow = min(grow, 1)
		}
		m.h = h * max(grow, 0.7)
		return nil
	}
	return m.failure("no step is short enough")
}

// sweep iterates x = x0 + integral f(x) on the points of a piece. It reports
// whether that settled, and whether it took so long that pieces should not grow.
func (m *march) sweep(tb *spectral, nv int, h float64, f *[nodes][maxVars]float64, x *[maxVars]float64) (ok, slow bool) {
	last := math.Inf(1)
	var inc, old [nodes][maxVars]float64
	for it := range maxSweep {
		change := 0.0
		for i := range nodes {
			for v := range nv {
				sum := 0.0
				for j := range nodes {
					sum += tb.integral[i][j] * f[j][v]
				}
				inc[i][v] = sum * h / 2
			}
		}
		for i := range nodes {
			for v := range nv {
				x[v] = m.hi[v] + (m.lo[v] + inc[i][v])
				change = max(change, math.Abs(inc[i][v]-old[i][v])/m.sys.scale(m.chart, x, v))
			}
			if !m.sys.rates(m.chart, x, &f[i]) {
				return false, false
			}
		}
		old = inc
		if math.IsNaN(change) || change > 1e6 {
			return false, false
		}
		if change <= 1e-17 || (change < 1e-14 && change >= last/2) {
			return true, it > 30
		}
		last = change
	}
	return false, false
}

// accept stores a piece and moves to its end.
func (m *march) accept(nv int, h float64, c *[maxVars][ncoef]float64) {
	m.dense.add(piece{t0: m.t, h: h, hi: m.hi, lo: m.lo, chart: m.chart}, c, nv)
	for i := range nv {
		inc := 0.0
		for k := ncoef - 1; k >= 0; k-- {
			inc += c[i][k]
		}
		m.hi[i], m.lo[i] = twoSum(m.hi[i], m.lo[i]+inc)
	}
	m.t += h
	m.chart = m.sys.rechart(m.chart, &m.hi, &m.lo)
}

// dyadic rounds h to a multiple of 2^-24 (or of 2^-40 where pieces are short)
// so that the ends of pieces are exact.
func dyadic(t, h float64) float64 {
	unit := math.Ldexp(1, -24)
	if math.Abs(h) < 1e-3 && math.Abs(t) < 4096 {
		unit = math.Ldexp(1, -40)
	}
	return math.Trunc(h/unit) * unit
}

func (m *march) failure(what string) error {
	place := m.hi[0]
	var s State
	if m.chart != chartAngle {
		placeChecked(m.chart, m.hi[0], &s)
		place = s.Rstar
	}
	return &Failure{Step: len(m.dense.pieces), Time: m.t, Place: place, What: what}
}

func placeChecked(chart int8, w float64, s *State) {
	if chart == chartY && !(w > 0) {
		s.Rstar = math.Inf(-1)
		return
	}
	place(chart, w, s)
}

// twoSum returns a+b and its rounding error (D. E. Knuth, The Art of Computer
// Programming 2, section 4.2.2).
func twoSum(a, b float64) (s, e float64) {
	s = a + b
	t := s - a
	return s, (a - (s - t)) + (b - t)
}
