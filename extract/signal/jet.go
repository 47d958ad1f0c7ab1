package signal

import (
	"fmt"
	"math"
	"math/cmplx"
)

const (
	// reach is the number of nodes on each side of the middle one: local
	// polynomials have degree 2 reach.
	reach = 6
	// derivatives of a jet: 0 to 3.
	derivatives = 4
)

// Jet is the value and the first three derivatives of a series at a time, from
// the polynomial through 13 nodes a common number of samples apart.
type Jet struct {
	U float64
	// D[d] is the derivative of order d.
	D [4]complex128
	// Cut[d] estimates the modulus of D[d]'s interpolation error: its distance
	// from what two nodes fewer give, which is larger than the error while the
	// series is resolved, or, if larger, what samples missed by the polynomial
	// half-way between the nodes say.
	Cut [4]float64
	// Node[k] is the index of node k in the series, Weight[k][d] how much of
	// its value D[d] takes, Bar[k] its error bound: that of the series, no less
	// than how rough the samples are around.
	Node   []int
	Weight [][4]float64
	Bar    []float64
}

// Linear bounds the error of the real number Q whose first-order dependence on
// the errors of the jet is dQ = Re sum_d c[d] dD[d]: the samples' bars go
// through the weights (a strict bound, whatever the samples' errors are) and the
// interpolation errors through c.
func (j *Jet) Linear(c [4]complex128) float64 {
	var sum float64
	for d := range c {
		sum += cmplx.Abs(c[d]) * j.Cut[d]
	}
	return sum + j.through(c)
}

// through is sum over the nodes of |sum_d c[d] Weight[k][d]| Bar[k].
func (j *Jet) through(c [4]complex128) float64 {
	var sum float64
	for k, w := range j.Weight {
		var g complex128
		for d := range c {
			g += c[d] * complex(w[d], 0)
		}
		sum += cmplx.Abs(g) * j.Bar[k]
	}
	return sum
}

// At returns the jet at time u. The spacing of the nodes is the multiple of the
// sample spacing for which the bound of the second derivative (interpolation
// error plus the samples' bars through the weights) is least: wide where the
// samples are dense and rough, narrow where they are few. Near an end the nodes
// lie to one side. It fails when u is outside the samples.
func (s Series) At(u float64) (*Jet, error) {
	n := len(s.Values)
	x := (u - s.Start) / s.Dt
	if !(x >= -1e-6 && x <= float64(n-1)+1e-6) || n < 2*reach+1 {
		return nil, &Fault{fmt.Sprintf("time %g is not inside the samples [%g, %g]", u, s.Start, s.End())}
	}
	var best *Jet
	var least float64
	worse := 0
	rough := s.Roughness(int(math.Round(x)))
	for stride := 1; 2*reach*stride < n; stride += 1 + stride/3 {
		j := s.jet(u, x, stride, rough)
		const d = 2
		bound := j.Cut[d] + j.through([4]complex128{d: 1})
		switch {
		case best == nil || bound < least:
			best, least, worse = j, bound, 0
		default:
			worse++
		}
		if worse >= 5 {
			break
		}
	}
	return best, nil
}

// Roughness estimates by how much samples around k scatter from one to the next
// (round-off, grid noise), whatever their bars say: three times the root mean
// square of 20th differences, scaled so that independent errors of unit variance
// give one. What a smooth signal of angle x a sample leaves is about
// x^20/4e5 of it. 0 where there are fewer than 41 samples.
func (s Series) Roughness(k int) float64 {
	const (
		order  = 20
		window = 2*order + 1
		spread = 371276.9 // sqrt of the binomial coefficient (40 over 20)
	)
	if len(s.Values) < window {
		return 0
	}
	first := max(0, min(k-order, len(s.Values)-window))
	var d [window]complex128
	copy(d[:], s.Values[first:first+window])
	for n := range order {
		for i := 0; i < window-1-n; i++ {
			d[i] = d[i+1] - d[i]
		}
	}
	var sum float64
	for i := range window - order {
		sum += real(d[i])*real(d[i]) + imag(d[i])*imag(d[i])
	}
	return 3 * math.Sqrt(sum/(window-order)) / spread
}

// jet builds the jet at sample coordinate x (time u) with nodes stride samples
// apart; rough is the least bar of a sample.
func (s Series) jet(u, x float64, stride int, rough float64) *Jet {
	const nodes = 2*reach + 1
	mid := int(math.Round(x))
	mid = max(reach*stride, min(mid, len(s.Values)-1-reach*stride))
	j := &Jet{U: u, Node: make([]int, nodes), Weight: make([][4]float64, nodes), Bar: make([]float64, nodes)}
	var at [nodes]float64
	floor := rough
	for k := range nodes {
		i := mid + (k-reach)*stride
		j.Node[k] = i
		at[k] = (float64(i) - x) * s.Dt
		floor = math.Max(floor, epsilon*cmplx.Abs(s.Values[i]))
	}
	for k, i := range j.Node {
		j.Bar[k] = math.Max(s.Bar(i), floor)
	}
	weights(at[:], j.Weight)
	var fewer [nodes - 2][4]float64
	weights(at[1:nodes-1], fewer[:])
	for d := range derivatives {
		var all, inner complex128
		for k, i := range j.Node {
			all += complex(j.Weight[k][d], 0) * s.Values[i]
		}
		for k := range fewer {
			inner += complex(fewer[k][d], 0) * s.Values[j.Node[k+1]]
		}
		j.D[d] = all
		j.Cut[d] = cmplx.Abs(all - inner)
	}
	if miss := s.misfit(j, at, x, stride); miss > 0 {
		rate := math.Pi / (float64(stride) * s.Dt)
		for d, scale := 0, miss; d < derivatives; d, scale = d+1, scale*rate {
			j.Cut[d] = math.Max(j.Cut[d], scale)
		}
	}
	return j
}

// misfit is by how much the polynomial misses samples half-way between the
// innermost nodes, beyond what the bars allow: it is what shows that nodes are
// too far apart when both polynomials are equally wrong.
func (s Series) misfit(j *Jet, at [2*reach + 1]float64, x float64, stride int) float64 {
	if stride == 1 {
		return 0
	}
	var worst float64
	for _, k := range [...]int{reach - 2, reach - 1, reach, reach + 1} {
		i := (j.Node[k] + j.Node[k+1]) / 2
		here := (float64(i) - x) * s.Dt
		shifted := at
		for n := range shifted {
			shifted[n] -= here
		}
		var w [2*reach + 1][4]float64
		weights(shifted[:], w[:])
		var p complex128
		allowed := s.Bar(i)
		for n := range w {
			p += complex(w[n][0], 0) * s.Values[j.Node[n]]
			allowed += math.Abs(w[n][0]) * j.Bar[n]
		}
		worst = math.Max(worst, cmplx.Abs(p-s.Values[i])-allowed)
	}
	return worst
}

// weights fills w[k][d] with the weight of node x[k] in the derivative of order
// d = 0..3 at 0 of the polynomial through all nodes.
//
// Source: B. Fornberg, Math. Comp. 51, 699 (1988), the recursion of section 2.
func weights(x []float64, w [][4]float64) {
	for k := range w {
		w[k] = [4]float64{}
	}
	w[0][0] = 1
	c1 := 1.0
	for i := 1; i < len(x); i++ {
		c2 := 1.0
		for k := range i {
			c3 := x[i] - x[k]
			c2 *= c3
			if k == i-1 {
				for d := min(i, derivatives-1); d >= 1; d-- {
					w[i][d] = c1 * (float64(d)*w[i-1][d-1] - x[i-1]*w[i-1][d]) / c2
				}
				w[i][0] = -c1 * x[i-1] * w[i-1][0] / c2
			}
			for d := min(i, derivatives-1); d >= 1; d-- {
				w[k][d] = (x[i]*w[k][d] - float64(d)*w[k][d-1]) / c3
			}
			w[k][0] *= x[i] / c3
		}
		c1 = c2
	}
}
