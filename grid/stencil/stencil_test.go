package stencil

import (
	"fmt"
	"math"
	"math/big"
	"testing"
)

// each runs a test body for every derivative and order that New builds.
func each(t *testing.T, body func(t *testing.T, deriv, order int)) {
	for deriv := 1; deriv <= 2; deriv++ {
		for order := 2; order <= MaxOrder; order += 2 {
			t.Run(fmt.Sprintf("derivative %d order %d", deriv, order), func(t *testing.T) { body(t, deriv, order) })
		}
	}
}

// TestTextbookWeights: tables 1 to 3 of B. Fornberg, Math. Comp. 51, 699 (1988)
// (centred and one-sided approximations on an equispaced grid), from memory.
func TestTextbookWeights(t *testing.T) {
	for _, c := range []struct {
		x0    int64
		nodes []int64
		deriv int
		want  []string
	}{
		{0, span(-1, 1), 1, []string{"-1/2", "0", "1/2"}},
		{0, span(-2, 2), 1, []string{"1/12", "-2/3", "0", "2/3", "-1/12"}},
		{0, span(-3, 3), 1, []string{"-1/60", "3/20", "-3/4", "0", "3/4", "-3/20", "1/60"}},
		{0, span(-4, 4), 1, []string{"1/280", "-4/105", "1/5", "-4/5", "0", "4/5", "-1/5", "4/105", "-1/280"}},
		{0, span(-1, 1), 2, []string{"1", "-2", "1"}},
		{0, span(-2, 2), 2, []string{"-1/12", "4/3", "-5/2", "4/3", "-1/12"}},
		{0, span(-3, 3), 2, []string{"1/90", "-3/20", "3/2", "-49/18", "3/2", "-3/20", "1/90"}},
		{0, span(-4, 4), 2, []string{"-1/560", "8/315", "-1/5", "8/5", "-205/72", "8/5", "-1/5", "8/315", "-1/560"}},
		{0, span(0, 2), 1, []string{"-3/2", "2", "-1/2"}},
		{0, span(0, 4), 1, []string{"-25/12", "4", "-3", "4/3", "-1/4"}},
		{0, span(0, 3), 2, []string{"2", "-5", "4", "-1"}},
		{0, span(0, 4), 2, []string{"35/12", "-26/3", "19/2", "-14/3", "11/12"}},
		{0, span(-2, 2), 4, []string{"1", "-4", "6", "-4", "1"}},
		{1, span(0, 2), 0, []string{"0", "1", "0"}},
		// Order of the nodes and distance between them are free.
		{2, []int64{5, 2, -1}, 1, []string{"1/6", "0", "-1/6"}},
	} {
		got := Weights(c.x0, c.nodes, c.deriv)
		for j, w := range got {
			if want, _ := new(big.Rat).SetString(c.want[j]); w.Cmp(want) != 0 {
				t.Errorf("derivative %d at %d from nodes %v: weight %d is %s, want %s", c.deriv, c.x0, c.nodes, j, w.RatString(), c.want[j])
			}
		}
	}
}

// matrix reads the rows of an operator off its action on unit vectors.
func matrix(op *Operator, n int) [][]float64 {
	rows := make([][]float64, n)
	for i := range rows {
		rows[i] = make([]float64, n)
	}
	u, d := make([]float64, n), make([]float64, n)
	for j := range u {
		u[j] = 1
		op.Apply(d, u)
		for i := range d {
			rows[i][j] = d[i]
		}
		u[j] = 0
	}
	return rows
}

// residual is what the row says about (x-i)^degree minus the derivative of that
// at x = i, exactly, and the bound of what rounding the weights can do to it.
func residual(row []float64, i, deriv, degree int) (res *big.Rat, bound float64) {
	res = new(big.Rat)
	if degree == deriv {
		f, _ := new(big.Int).MulRange(1, int64(deriv)).Float64()
		res.SetFloat64(-f)
	}
	for j, w := range row {
		if w == 0 {
			continue
		}
		p := new(big.Int).Exp(big.NewInt(int64(j-i)), big.NewInt(int64(degree)), nil)
		x, _ := p.Float64()
		bound += math.Abs(w*x) * 0x1p-53
		q := new(big.Rat).SetFloat64(w)
		res.Add(res, q.Mul(q, new(big.Rat).SetInt(p)))
	}
	return res, bound
}

// leading is the exact residual of row i on (x-i)^{order+deriv}, from the
// derivatives of the polynomial that vanishes at the row's nodes.
func leading(op *Operator, i, n int) float64 {
	product := func(lo, hi, skip int) float64 { // prod_{j != i, skip} (i-j)
		p := 1.0
		for j := lo; j <= hi; j++ {
			if j != i && j != skip {
				p *= float64(i - j)
			}
		}
		return p
	}
	lo, hi := i-op.Half, i+op.Half
	centred := i >= op.Half && i < n-op.Half
	if !centred {
		lo, hi = 0, op.Order+op.Deriv-1
		if i >= n-op.Half {
			lo, hi = n-op.Order-op.Deriv, n-1
		}
	}
	switch {
	case op.Deriv == 1:
		return -product(lo, hi, i)
	case centred: // one degree more by symmetry: ((x-i) P)'' = 2 P'
		return -2 * product(lo, hi, i)
	}
	s := 0.0 // P'' = 2 sum_j prod_{k != i,j} (i-k)
	for j := lo; j <= hi; j++ {
		if j != i {
			s += product(lo, hi, j)
		}
	}
	return -2 * s
}

// TestExactnessAndFailure: every row, the biased ones at both ends included, is
// exact on polynomials up to degree order+deriv-1 and errs at order+deriv by
// exactly the derivative of its node polynomial.
func TestExactnessAndFailure(t *testing.T) {
	each(t, func(t *testing.T, deriv, order int) {
		op := New(deriv, order)
		n := op.MinPoints() + 3
		for i, row := range matrix(op, n) {
			where := "centred"
			if i < op.Half || i >= n-op.Half {
				where = "biased"
			}
			for degree := 0; degree < order+deriv; degree++ {
				res, bound := residual(row, i, deriv, degree)
				if r, _ := res.Float64(); math.Abs(r) > bound {
					t.Errorf("%s row %d of %d on degree %d: off by %g, rounding explains %g", where, i, n, degree, r, bound)
				}
			}
			res, bound := residual(row, i, deriv, order+deriv)
			want := leading(op, i, n)
			if r, _ := res.Float64(); math.Abs(r-want) > bound || math.Abs(want) < 1e3*bound {
				t.Errorf("%s row %d of %d on degree %d: off by %g (rounding %g), want the failure %g", where, i, n, order+deriv, r, bound, want)
			}
		}
	})
}

// TestRowsAgree: Row names the weights that Apply uses.
func TestRowsAgree(t *testing.T) {
	each(t, func(t *testing.T, deriv, order int) {
		op := New(deriv, order).Scaled(0.3)
		n := op.MinPoints() + 1
		for i, row := range matrix(op, n) {
			first, w := op.Row(i, n)
			for j := range row {
				v := 0.0
				if j >= first && j < first+len(w) {
					v = w[j-first]
				}
				if v != row[j] {
					t.Errorf("row %d, column %d: Row says %g, Apply %g", i, j, v, row[j])
				}
			}
		}
	})
}

// TestConvergence differentiates e^{ikx}, which is no polynomial, at two
// spacings: every row of the fine grid that has its twin on the coarse one (the
// same place in the stencil's layout) errs less by 2^order.
func TestConvergence(t *testing.T) {
	each(t, func(t *testing.T, deriv, order int) {
		op := New(deriv, order)
		n := op.MinPoints() + 1
		errs := func(theta float64) []float64 { // theta = k dx, k = 1
			re, im := make([]float64, n), make([]float64, n)
			dre, dim := make([]float64, n), make([]float64, n)
			for i := range re {
				im[i], re[i] = math.Sincos(theta * float64(i))
			}
			s := op.Scaled(theta)
			s.Apply(dre, re)
			s.Apply(dim, im)
			out := make([]float64, n)
			for i := range out {
				wre, wim := -im[i], re[i]
				if deriv == 2 {
					wre, wim = -re[i], -im[i]
				}
				out[i] = math.Hypot(dre[i]-wre, dim[i]-wim)
			}
			return out
		}
		theta := 0.1 // where round-off stays a thousandth of the error
		if order > 4 {
			theta = 0.04 * float64(order)
		}
		coarse, fine := errs(theta), errs(theta/2)
		for i := range coarse {
			got := math.Log2(coarse[i] / fine[i])
			// Measured: 0 to 0.14 below the order, the row's next term.
			if math.Abs(got-float64(order)) > 0.2 {
				t.Errorf("row %d: errors %.3g and %.3g, order %.2f instead of %d", i, coarse[i], fine[i], got, order)
			}
		}
	})
}

// TestSymbol compares the action on e^{i k x} with the truncated series of the
// exact symbol in s = sin(k/2): with asin(s)/sqrt(1-s^2) = sum 4^m m!^2 s^{2m+1}/(2m+1)!
// and asin(s)^2 = (1/2) sum (2s)^{2m}/(m^2 C(2m,m)) (Abramowitz and Stegun,
// chapter 15, from memory), order 2h keeps h terms.
func TestSymbol(t *testing.T) {
	each(t, func(t *testing.T, deriv, order int) {
		op := New(deriv, order)
		for k := 0.0; k <= math.Pi+1e-9; k += math.Pi / 16 {
			var even, odd, size float64
			for j, w := range op.Centre {
				x := k * float64(j-op.Half)
				even += w * math.Cos(x)
				odd += w * math.Sin(x)
				size += math.Abs(w)
			}
			s := math.Sin(k / 2)
			want, term := 0.0, 1.0
			for m := 0; m < order/2; m++ {
				if deriv == 1 {
					// term = 4^m m!^2 s^{2m}/(2m+1)!
					if m > 0 {
						term *= 4 * float64(m*m) * s * s / float64(2*m*(2*m+1))
					}
					want += math.Sin(k) * term
					continue
				}
				q := float64(m + 1)
				if m == 0 {
					term = 2 * s * s // (2s)^2/C(2,1)
				} else {
					term *= 4 * s * s * q * q / (2 * q * (2*q - 1))
				}
				want -= 2 * term / (q * q)
			}
			got, other := odd, even
			if deriv == 2 {
				got, other = even, odd
			}
			if math.Abs(got-want) > 4e-16*size || math.Abs(other) > 4e-16*size {
				t.Errorf("k = %.4f: symbol %.17g and %.3g, want %.17g and 0", k, got, other, want)
			}
		}
	})
}

func TestScaledCopies(t *testing.T) {
	op := New(2, 4)
	before := op.Centre[0]
	s := op.Scaled(0.5)
	if op.Centre[0] != before || s.Centre[0] != 4*before || s.Left[0][0] != 4*op.Left[0][0] || s.Right[1][2] != 4*op.Right[1][2] {
		t.Errorf("spacing 0.5 gives %v from %v", s.Centre, op.Centre)
	}
	if first := New(1, 4).Scaled(0.5); first.Centre[0] != 2*New(1, 4).Centre[0] {
		t.Errorf("a first derivative scales to %v", first.Centre)
	}
}

func panics(f func()) (did bool) {
	defer func() { did = recover() != nil }()
	f()
	return
}

func TestPanics(t *testing.T) {
	op := New(1, 4)
	n := op.MinPoints()
	for name, f := range map[string]func(){
		"derivative 0":        func() { New(0, 4) },
		"derivative 3":        func() { New(3, 4) },
		"odd order":           func() { New(1, 5) },
		"order 0":             func() { New(1, 0) },
		"order 14":            func() { New(1, MaxOrder+2) },
		"too few nodes":       func() { Weights(0, span(0, 1), 2) },
		"negative":            func() { Weights(0, span(0, 1), -1) },
		"short grid":          func() { op.Apply(make([]float64, n-1), make([]float64, n-1)) },
		"different lengths":   func() { op.Apply(make([]float64, n), make([]float64, n+1)) },
		"filter odd":          func() { NewFilter(7, 0.5) },
		"filter too high":     func() { NewFilter(22, 0.5) },
		"filter order 0":      func() { NewFilter(0, 0.5) },
		"filter strength 0":   func() { NewFilter(8, 0) },
		"filter too strong":   func() { NewFilter(8, 1.1) },
		"filter not a number": func() { NewFilter(8, math.NaN()) },
	} {
		if !panics(f) {
			t.Errorf("%s: no panic", name)
		}
	}
	if panics(func() { op.Apply(make([]float64, n), make([]float64, n)) }) {
		t.Errorf("the smallest grid of %d points is refused", n)
	}
}
