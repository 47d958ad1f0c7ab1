// Package stencil holds finite-difference operators on a uniform grid as data:
// weights of any even order for first and second derivatives, with biased rows
// at both ends, and high-order filters. The weights are generated in exact
// rational arithmetic and rounded to float64 once.
package stencil

import (
	"fmt"
	"math/big"
)

// Weights returns the exact weights w_j such that sum_j w_j g(nodes_j) equals
// the deriv-th derivative of g at x0 for every polynomial g of degree below
// len(nodes). Nodes must be distinct; the nodes are in units of the spacing.
//
// Source: B. Fornberg, Math. Comp. 51, 699 (1988), the recursion of section 3,
// carried out in rationals. It panics when deriv is negative or not below
// len(nodes).
func Weights(x0 int64, nodes []int64, deriv int) []*big.Rat {
	n := len(nodes)
	if deriv < 0 || deriv >= n {
		panic(fmt.Sprintf("stencil: derivative %d wants more than %d nodes", deriv, n))
	}
	rat := func(a int64) *big.Rat { return new(big.Rat).SetInt64(a) }
	// delta[k][j]: weight of node j for the k-th derivative.
	delta := make([][]*big.Rat, deriv+1)
	for k := range delta {
		delta[k] = make([]*big.Rat, n)
		for j := range delta[k] {
			delta[k][j] = new(big.Rat)
		}
	}
	delta[0][0].SetInt64(1)
	c1 := rat(1)
	for i := 1; i < n; i++ {
		c2 := rat(1)
		for j := 0; j < i; j++ {
			c3 := rat(nodes[i] - nodes[j])
			c2.Mul(c2, c3)
			if j == i-1 {
				// The new node's weights come from the previous node's old ones.
				for k := min(i, deriv); k >= 0; k-- {
					t := new(big.Rat)
					if k > 0 {
						t.Mul(rat(int64(k)), delta[k-1][i-1])
					}
					s := new(big.Rat).Mul(rat(nodes[i-1]-x0), delta[k][i-1])
					t.Sub(t, s)
					t.Mul(t, c1)
					delta[k][i].Quo(t, c2)
				}
			}
			for k := min(i, deriv); k >= 0; k-- {
				t := new(big.Rat).Mul(rat(nodes[i]-x0), delta[k][j])
				if k > 0 {
					t.Sub(t, new(big.Rat).Mul(rat(int64(k)), delta[k-1][j]))
				}
				delta[k][j].Quo(t, c3)
			}
		}
		c1.Set(c2)
	}
	return delta[deriv]
}

// MaxOrder is the highest order that New accepts.
const MaxOrder = 12

// Operator is the deriv-th derivative of order Order for unit spacing: divide
// by dx^Deriv. Rows 0..Half-1 and the last Half rows are biased.
type Operator struct {
	Deriv, Order int
	Half         int         // half width of the centred stencil
	Centre       []float64   // weights at offsets -Half..Half
	Left         [][]float64 // Left[i][j]: weight of node j in row i < Half
	Right        [][]float64 // Right[i][j]: weight of node N-1-j in row N-1-i
	scale        float64
}

// New returns the first (deriv = 1) or second (deriv = 2) derivative of an even
// order from 2 to MaxOrder. Centred rows use order+1 nodes; biased rows use
// order+1 nodes for the first and order+2 for the second derivative, so that
// every row has the order asked for. It panics on other arguments.
func New(deriv, order int) *Operator {
	if deriv < 1 || deriv > 2 {
		panic(fmt.Sprintf("stencil: derivative %d: only 1 and 2 are built", deriv))
	}
	if order < 2 || order > MaxOrder || order%2 != 0 {
		panic(fmt.Sprintf("stencil: order %d: want an even number from 2 to %d", order, MaxOrder))
	}
	half := order / 2
	op := &Operator{Deriv: deriv, Order: order, Half: half, scale: 1}
	op.Centre = floats(Weights(0, span(-half, half), deriv))
	width := order + deriv // nodes of a biased row
	for i := 0; i < half; i++ {
		left := floats(Weights(int64(i), span(0, width-1), deriv))
		right := make([]float64, width)
		for j, w := range left {
			if deriv%2 == 1 {
				w = -w
			}
			right[j] = w
		}
		op.Left = append(op.Left, left)
		op.Right = append(op.Right, right)
	}
	return op
}

// Scaled returns the operator for spacing dx (a copy; the receiver is not
// changed).
func (op *Operator) Scaled(dx float64) *Operator {
	s := 1 / dx
	if op.Deriv == 2 {
		s /= dx
	}
	mul := func(w []float64) []float64 {
		out := make([]float64, len(w))
		for i, v := range w {
			out[i] = v * s
		}
		return out
	}
	out := &Operator{Deriv: op.Deriv, Order: op.Order, Half: op.Half, Centre: mul(op.Centre), scale: op.scale * s}
	for i := range op.Left {
		out.Left = append(out.Left, mul(op.Left[i]))
		out.Right = append(out.Right, mul(op.Right[i]))
	}
	return out
}

// MinPoints is the smallest grid on which the operator has all its rows apart.
func (op *Operator) MinPoints() int { return 2*op.Half + len(op.Left[0]) }

// Apply writes the derivative of u into dst; both have the length of the grid
// (at least MinPoints) and must not overlap. It is the plain form for one real
// field, kept as the reference of the lane kernels.
func (op *Operator) Apply(dst, u []float64) {
	n := len(u)
	if len(dst) != n || n < op.MinPoints() {
		panic(fmt.Sprintf("stencil: %d points into %d, at least %d wanted", n, len(dst), op.MinPoints()))
	}
	for i := 0; i < op.Half; i++ {
		var a, b float64
		for j, w := range op.Left[i] {
			a += w * u[j]
		}
		for j, w := range op.Right[i] {
			b += w * u[n-1-j]
		}
		dst[i], dst[n-1-i] = a, b
	}
	for i := op.Half; i < n-op.Half; i++ {
		var a float64
		for k, w := range op.Centre {
			a += w * u[i-op.Half+k]
		}
		dst[i] = a
	}
}

// Row returns the weights and the first column of row i on a grid of n points.
func (op *Operator) Row(i, n int) (first int, w []float64) {
	switch {
	case i < op.Half:
		return 0, op.Left[i]
	case i >= n-op.Half:
		r := op.Right[n-1-i]
		w = make([]float64, len(r))
		for j, v := range r {
			w[len(r)-1-j] = v
		}
		return n - len(r), w
	}
	return i - op.Half, op.Centre
}

func span(a, b int) []int64 {
	var out []int64
	for i := a; i <= b; i++ {
		out = append(out, int64(i))
	}
	return out
}

func floats(r []*big.Rat) []float64 {
	out := make([]float64, len(r))
	for i, v := range r {
		out[i], _ = v.Float64()
	}
	return out
}
