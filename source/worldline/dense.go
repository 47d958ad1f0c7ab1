package worldline

import (
	"fmt"
	"math"
	"slices"
)

// Radial charts of the first unknown.
const (
	chartY     int8 = iota // y = r-2
	chartLog               // ln(y/2), near the horizon
	chartAngle             // an angle that parametrises the orbit
)

// piece is one stretch of a dense solution: the unknowns at its start, as hi+lo
// without rounding, and (in dense.coef) the series of their increments in
// xi = 2(t-t0)/h-1.
type piece struct {
	t0, h  float64
	hi, lo [maxVars]float64
	phase  float64 // azimuth at t0 less whole turns
	chart  int8
}

// dense is a piecewise polynomial solution.
type dense struct {
	nv     int
	edges  []float64 // len(pieces)+1, ascending after finish
	pieces []piece
	coef   [][ncoef]float64 // nv for each piece
}

func (d *dense) add(p piece, c *[maxVars][ncoef]float64, nv int) {
	d.nv = nv
	_, p.phase = reduce(p.hi[1], p.lo[1])
	d.pieces = append(d.pieces, p)
	d.coef = append(d.coef, c[:nv]...)
}

// finish orders the pieces of a backward solution (may be nil) and a forward
// one and fills the edges.
func finish(back, ahead *dense) *dense {
	d := ahead
	if back != nil && len(back.pieces) > 0 {
		nv := back.nv
		d = &dense{nv: nv}
		for i := len(back.pieces) - 1; i >= 0; i-- {
			d.pieces = append(d.pieces, back.pieces[i])
			d.coef = append(d.coef, back.coef[i*nv:(i+1)*nv]...)
		}
		if len(ahead.pieces) > 0 && ahead.nv != nv {
			panic("worldline: pieces of different systems joined")
		}
		d.pieces = append(d.pieces, ahead.pieces...)
		d.coef = append(d.coef, ahead.coef...)
	}
	d.pieces = slices.Clip(d.pieces)
	d.coef = slices.Clip(d.coef)
	d.edges = make([]float64, 0, len(d.pieces)+1)
	for i := range d.pieces {
		p := &d.pieces[i]
		d.edges = append(d.edges, min(p.t0, p.t0+p.h))
	}
	last := &d.pieces[len(d.pieces)-1]
	d.edges = append(d.edges, max(last.t0, last.t0+last.h))
	return d
}

// start and end of the solution.
func (d *dense) start() float64 { return d.edges[0] }
func (d *dense) end() float64   { return d.edges[len(d.edges)-1] }

// at evaluates the unknowns at t and the azimuth less whole turns.
func (d *dense) at(t float64, x *[maxVars]float64) (chart int8, phase float64) {
	lo, hi := 0, len(d.pieces)
	if !(t >= d.edges[0] && t <= d.edges[hi]) {
		panic(fmt.Sprintf("worldline: time %v outside [%v, %v]", t, d.edges[0], d.edges[hi]))
	}
	for hi-lo > 1 {
		mid := int(uint(lo+hi) >> 1)
		if t >= d.edges[mid] {
			lo = mid
		} else {
			hi = mid
		}
	}
	return d.in(lo, t, x)
}

// in evaluates piece i at t.
func (d *dense) in(i int, t float64, x *[maxVars]float64) (chart int8, phase float64) {
	p := &d.pieces[i]
	xi := 2*(t-p.t0)/p.h - 1
	c := d.coef[i*d.nv : (i+1)*d.nv]
	for v := range c {
		inc := clenshaw(&c[v], xi)
		x[v] = p.hi[v] + (p.lo[v] + inc)
		if v == 1 {
			phase = p.phase + inc
		}
	}
	return p.chart, phase
}

const (
	turnHi = 2 * math.Pi
	turnLo = 2.4492935982947064e-16 // 2 pi - turnHi
)

// reduce takes whole turns off the angle hi+lo: the remainder lies in
// [-pi, pi] and is exact to round-off of its own size.
func reduce(hi, lo float64) (turns, rest float64) {
	turns = math.RoundToEven(hi / turnHi)
	return turns, math.FMA(-turns, turnHi, hi) + (lo - turns*turnLo)
}

// cross returns the zeros of g on [t0,t1], found by sign changes between
// samples (a few a piece) and bisection with secants, to the last digits of t.
func (d *dense) cross(t0, t1 float64, g func(t float64) float64) []float64 {
	const per = 8
	var zeros []float64
	prevT, prevG := math.NaN(), math.NaN()
	visit := func(t float64) {
		if t < t0 || t > t1 {
			return
		}
		v := g(t)
		switch {
		case v == 0:
			zeros = append(zeros, t)
		case prevG != 0 && (prevG < 0) != (v < 0) && !math.IsNaN(prevG):
			zeros = append(zeros, bracketed(g, prevT, t, prevG, v))
		}
		prevT, prevG = t, v
	}
	visit(max(t0, d.start()))
	for i := range d.pieces {
		a, b := d.edges[i], d.edges[i+1]
		for k := 1; k <= per; k++ {
			t := a + (b-a)*float64(k)/per
			if k == per {
				t = b
			}
			if t != prevT {
				visit(t)
			}
		}
	}
	return zeros
}

// bracketed finds a zero of g in [a,b], where ga and gb differ in sign, by the
// Illinois form of false position guarded by bisection.
func bracketed(g func(float64) float64, a, b, ga, gb float64) float64 {
	side := 0
	for i := range 200 {
		if math.Abs(b-a) <= 2e-16*max(math.Abs(a), math.Abs(b)) {
			break
		}
		c := (a*gb - b*ga) / (gb - ga)
		if i%8 == 7 || !(c > min(a, b) && c < max(a, b)) {
			c = a + (b-a)/2
			if c == a || c == b {
				break
			}
		}
		gc := g(c)
		switch {
		case gc == 0:
			return c
		case (gc < 0) == (ga < 0):
			a, ga = c, gc
			if side == 1 {
				gb /= 2
			}
			side = 1
		default:
			b, gb = c, gc
			if side == -1 {
				ga /= 2
			}
			side = -1
		}
	}
	if math.Abs(ga) < math.Abs(gb) {
		return a
	}
	return b
}
