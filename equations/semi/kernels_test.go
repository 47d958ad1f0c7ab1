package semi

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"nullmark/equations"
	"nullmark/grid"
	"nullmark/grid/march"
	"nullmark/grid/stencil"
	"nullmark/hyperboloidal"
)

// forms lists the kernels that this processor can run, the plain ones first.
func forms() []instructions {
	all := []instructions{goCode}
	for s := goCode + 1; s <= fastest(); s++ {
		all = append(all, s)
	}
	return all
}

// force runs the test with the given kernels.
func force(t testing.TB, s instructions) {
	was := active
	active = s
	t.Cleanup(func() { active = was })
}

// awkward fills v with numbers of all sizes and, if special, with the values
// that arithmetic treats apart: zeros of both signs, denormals, infinities, NaN.
func awkward(r *rand.Rand, v []float64, special bool) {
	odd := []float64{0, math.Copysign(0, -1), math.SmallestNonzeroFloat64, -3e-310, math.Inf(1), math.Inf(-1), math.NaN(), math.MaxFloat64}
	for i := range v {
		v[i] = (r.Float64() - .5) * math.Exp(40*(r.Float64()-.5))
		if special && r.IntN(64) == 0 {
			v[i] = odd[r.IntN(len(odd))]
		}
	}
}

// sameBits compares bit for bit; only NaNs may differ from each other in sign
// and payload, which the processor takes from the operand that comes first.
func sameBits(t testing.TB, what string, got, want []float64) {
	t.Helper()
	for i := range want {
		if math.Float64bits(got[i]) != math.Float64bits(want[i]) && !(math.IsNaN(got[i]) && math.IsNaN(want[i])) {
			t.Fatalf("%s: row %d, lane %d: %v, plain %v", what, i/lanes, i%lanes, got[i], want[i])
		}
	}
}

// compareForms runs every kernel in every form over count rows that begin at
// row at, and compares the whole output, so that a store outside of the range
// shows too.
func compareForms(t testing.TB, seed uint64, at, count, reach, width int, special bool) {
	t.Helper()
	r := rand.New(rand.NewPCG(seed, uint64(count)))
	at += 6 + reach
	n := at + count + 6 + reach + width
	vec := func(k int) []float64 {
		v := make([]float64, k)
		awkward(r, v, special)
		return v
	}
	out, psi, pi, diag := vec(n*lanes), vec(n*lanes), vec(n*lanes), vec(n*lanes)
	d2, w13, wAny := vec(reach+1), vec(count*rowStride), vec(count*2*width)
	flat, first := [7]float64(vec(7)), [6]float64(vec(6))
	kernels := []struct {
		name string
		run  func(s instructions, o []float64)
	}{
		{"flat12", func(s instructions, o []float64) { s.flat12(o, psi, diag, &flat, at, at+count) }},
		{"flatAny", func(s instructions, o []float64) { s.flatAny(o, psi, diag, d2, at, at+count) }},
		{"rows13", func(s instructions, o []float64) { s.rows13(o, psi, pi, diag, w13, &first, at, at+count) }},
		{"rowsAny, sliding", func(s instructions, o []float64) {
			s.rowsAny(o, psi, pi, diag, wAny, width, at-reach, 1, at, at+count)
		}},
		{"rowsAny, fixed", func(s instructions, o []float64) {
			s.rowsAny(o, psi, pi, diag, wAny, width, at, 0, at, at+count)
		}},
	}
	for _, k := range kernels {
		want := append([]float64(nil), out...)
		k.run(goCode, want)
		for _, s := range forms()[1:] {
			got := append([]float64(nil), out...)
			k.run(s, got)
			sameBits(t, fmt.Sprintf("%s, form %d, %d rows, reach %d, width %d", k.name, s, count, reach, width), got, want)
		}
	}
}

func TestVectorKernelsGiveTheBitsOfThePlainOnes(t *testing.T) {
	for count := 0; count < 24; count++ {
		for reach := 1; reach <= 6; reach++ {
			compareForms(t, 1, count%3, count, reach, 1+(count+reach)%15, false)
			compareForms(t, 2, count%5, count, reach, 2*reach+2, true)
		}
	}
}

func FuzzVectorKernels(f *testing.F) {
	f.Add(uint64(1), uint8(0), uint8(37), uint8(6), uint8(14), true)
	f.Add(uint64(2), uint8(3), uint8(200), uint8(2), uint8(6), false)
	f.Fuzz(func(t *testing.T, seed uint64, at, count, reach, width uint8, special bool) {
		compareForms(t, seed, int(at), int(count), int(reach%8), int(width%24), special)
	})
}

// TestUnrolledKernelsAgreeWithTheGeneralOnes: flat12 sums in the order of
// flatAny and has its bits; rows13 takes first differences of pi in pairs and
// may differ from rowsAny by roundings.
func TestUnrolledKernelsAgreeWithTheGeneralOnes(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	const n, lo, hi = 40, 6, 34
	vec := func(k int) []float64 {
		v := make([]float64, k)
		for i := range v {
			v[i] = r.Float64() - .5
		}
		return v
	}
	psi, pi, diag := vec(n*lanes), vec(n*lanes), vec(n*lanes)
	a, b := make([]float64, n*lanes), make([]float64, n*lanes)
	d2 := [7]float64(vec(7))
	flat12(a, psi, diag, &d2, lo, hi)
	flatAny(b, psi, diag, d2[:], lo, hi)
	sameBits(t, "flat12", a, b)

	d1 := [6]float64(vec(6))
	w := vec((hi - lo) * rowStride)
	var general []float64
	for i := range hi - lo {
		v := w[i*rowStride:]
		for j := -6; j <= 6; j++ {
			switch {
			case j < 0:
				general = append(general, v[6+j], -v[12]*d1[-j-1])
			case j == 0:
				general = append(general, 0, v[13])
			case j > 0:
				general = append(general, v[5+j], v[12]*d1[j-1])
			}
		}
	}
	rows13(a, psi, pi, diag, w, &d1, lo, hi)
	rowsAny(b, psi, pi, diag, general, 13, lo-6, 1, lo, hi)
	for i := lo * lanes; i < hi*lanes; i++ {
		// 26 products below 1/4: 1e-15 is two roundings of their sum.
		if d := math.Abs(a[i] - b[i]); !(d <= 2e-15) {
			t.Fatalf("rows13: row %d: %v and %v", i/lanes, a[i], b[i])
		}
	}
}

// block is four complex modes of a wave problem on n points.
func block(t testing.TB, n, order int) *Master {
	t.Helper()
	s := hyperboloidal.Layers{Si: -20, Ri: 0, Ro: 20, So: 50, Profile: hyperboloidal.Flat(2)}
	geo, err := NewGeometry(s, grid.New(s.Si, s.So, n), order)
	if err != nil {
		t.Fatal(err)
	}
	var pots []equations.Potential
	for l := 2; l < 6; l++ {
		p := equations.Master(equations.EquatorialParity(l, l-l%2), l)
		pots = append(pots, p, p)
	}
	return NewMaster(geo, pots, nil)
}

func wave(m *Master) []float64 {
	u := make([]float64, m.Length())
	for i, p := range m.Geometry().Points {
		for l := range lanes {
			u[i*lanes+l] = math.Exp(-p.Rho*p.Rho/20) * float64(l+1)
			u[len(u)/2+i*lanes+l] = math.Sin(p.Rho/4 + float64(l))
		}
	}
	return u
}

// TestRowsCoverTheGridOnce: every row belongs to one range, the ranges are few,
// and the weights of a range are as many as its kernel reads.
func TestRowsCoverTheGridOnce(t *testing.T) {
	for order := 2; order <= stencil.MaxOrder; order += 2 {
		geo := block(t, 201, order).Geometry()
		at := 0
		for _, r := range geo.ranges {
			if r.lo != at || r.hi <= r.lo {
				t.Errorf("order %d: rows [%d, %d) after row %d", order, r.lo, r.hi, at)
			}
			at = r.hi
			want := map[form]int{flatRows: 0, centredRows: rowStride, anyRows: 2 * r.width}[r.form] * (r.hi - r.lo)
			if len(r.w) != want {
				t.Errorf("order %d: %d weights for rows [%d, %d), want %d", order, len(r.w), r.lo, r.hi, want)
			}
		}
		// left end, layer, flat part, layer, right end
		if at != 201 || len(geo.ranges) > 5 {
			t.Errorf("order %d: %d ranges up to row %d", order, len(geo.ranges), at)
		}
	}
}

// TestApplyIsTheOperator compares the kernels with their tables against the
// operator put together point by point from plain difference operators, for
// all orders. The bound is 1e-14 of the largest value; measured 4e-16.
func TestApplyIsTheOperator(t *testing.T) {
	for order := 2; order <= stencil.MaxOrder; order += 2 {
		m := block(t, 173, order)
		g := m.Geometry()
		n := g.Grid.N
		u := wave(m)
		got := make([]float64, len(u))
		m.Apply(got, u)
		d1, d2 := stencil.New(1, order).Scaled(g.Grid.Dx), stencil.New(2, order).Scaled(g.Grid.Dx)
		psi, pi := make([]float64, n), make([]float64, n)
		dpsi, ddpsi, dpi := make([]float64, n), make([]float64, n), make([]float64, n)
		worst, size := 0.0, 0.0
		for l := range lanes {
			for i := range n {
				psi[i], pi[i] = u[i*lanes+l], u[(n+i)*lanes+l]
			}
			d1.Apply(dpsi, psi)
			d2.Apply(ddpsi, psi)
			d1.Apply(dpi, pi)
			v := equations.Master(equations.EquatorialParity(2+l/2, (2+l/2)-(2+l/2)%2), 2+l/2)
			for i, p := range g.Points {
				k := 1 / (2 - p.Boost)
				want := k * (p.Boost*ddpsi[i] + p.BoostPrime*dpsi[i] - 2*p.Height*dpi[i] - p.HeightPrime*pi[i] - p.Stretch*v.Reduced(p.X)*psi[i])
				worst = math.Max(worst, math.Abs(got[(n+i)*lanes+l]-want))
				size = math.Max(size, math.Abs(want))
				if got[i*lanes+l] != pi[i] {
					t.Fatalf("order %d: the first half of A u is not Pi at row %d", order, i)
				}
			}
		}
		if !(worst <= 1e-14*size) {
			t.Errorf("order %d: off by %g of %g", order, worst, size)
		}
	}
}

// TestAccelerateWithASumGoesPieceByPiece: with a sum the rows are done in
// pieces; the result must have the bits of Apply, and the sum those of one sweep.
func TestAccelerateWithASumGoesPieceByPiece(t *testing.T) {
	for order := 2; order <= stencil.MaxOrder; order += 2 {
		m := block(t, 307, order)
		u := wave(m)
		n := len(u) / 2
		applied := make([]float64, 2*n)
		m.Apply(applied, u)
		got, want := march.Sum{XX: 1, XY: .3, YX: -.7, YY: 2}, march.Sum{XX: 1, XY: .3, YX: -.7, YY: 2}
		got.X, got.Y = make([]float64, n), make([]float64, n)
		want.X, want.Y = make([]float64, n), make([]float64, n)
		dst := make([]float64, n)
		m.Accelerate(dst, u[:n], u[n:], &got)
		want.Add(u[:n], u[n:], 0, n)
		sameBits(t, fmt.Sprintf("order %d", order), dst, applied[n:])
		sameBits(t, fmt.Sprintf("order %d, sum of X", order), got.X, want.X)
		sameBits(t, fmt.Sprintf("order %d, sum of Y", order), got.Y, want.Y)
	}
}

// TestRunsAreTheSameInEveryForm takes whole steps of every stepper, for orders
// with and without unrolled kernels.
func TestRunsAreTheSameInEveryForm(t *testing.T) {
	for _, order := range []int{4, 12} {
		m := block(t, 151, order)
		run := func(s march.Stepper) []float64 {
			u := wave(m)
			for k := range 40 {
				s.Step(u, float64(k)*.2, .2)
			}
			return u
		}
		for name, s := range map[string]march.Stepper{
			"Taylor":      march.NewTaylor(m, 8, m.Length()),
			"Runge-Kutta": march.NewRungeKutta(m, march.RK8(), m.Length()),
		} {
			force(t, goCode)
			want := run(s)
			for _, f := range forms()[1:] {
				force(t, f)
				sameBits(t, fmt.Sprintf("%s, order %d, form %d", name, order, f), run(s), want)
			}
			if math.IsNaN(want[0]) || want[0] == 0 {
				t.Errorf("%s, order %d: nothing to compare: %v", name, order, want[0])
			}
		}
	}
}

func TestAStepDoesNotAllocate(t *testing.T) {
	m := block(t, 101, 12)
	u := wave(m)
	for name, s := range map[string]march.Stepper{
		"Taylor":      march.NewTaylor(m, 12, m.Length()),
		"Runge-Kutta": march.NewRungeKutta(m, march.RK8(), m.Length()),
	} {
		for _, f := range forms() {
			force(t, f)
			if n := testing.AllocsPerRun(10, func() { s.Step(u, 0, .1) }); n != 0 {
				t.Errorf("%s, form %d: %v allocations a step", name, f, n)
			}
		}
	}
}

// TestKernelsRefuseRowsOutsideTheirSlices: the vector forms check nothing
// themselves.
func TestKernelsRefuseRowsOutsideTheirSlices(t *testing.T) {
	const n = 30
	v := func(points int) []float64 { return make([]float64, points*lanes) }
	var d1 [6]float64
	var d2 [7]float64
	w := make([]float64, n*2*13)
	for _, f := range forms() {
		for name, run := range map[string]func(){
			"below":         func() { f.flat12(v(n), v(n), v(n), &d2, 5, 20) },
			"above":         func() { f.flat12(v(n), v(n), v(n), &d2, 6, 25) },
			"short out":     func() { f.flat12(v(20), v(n), v(n), &d2, 6, 24) },
			"short diag":    func() { f.flatAny(v(n), v(n), v(20), d2[:], 6, 24) },
			"above, any":    func() { f.flatAny(v(n), v(n), v(n), d2[:], 6, 25) },
			"short pi":      func() { f.rows13(v(n), v(n), v(n-1), v(n), w, &d1, 6, 24) },
			"few weights":   func() { f.rows13(v(n), v(n), v(n), v(n), w[:100:100], &d1, 6, 24) },
			"short pi, any": func() { f.rowsAny(v(n), v(n), v(n-1), v(n), w, 13, 0, 1, 6, 24) },
			"few, any":      func() { f.rowsAny(v(n), v(n), v(n), v(n), w[:100:100], 13, 0, 0, 6, 24) },
			"short here":    func() { f.rowsAny(v(n), v(n-7), v(n), v(n), w, 13, 0, 0, 6, 24) },
			"negative":      func() { f.rowsAny(v(n), v(n), v(n), v(n), w, 13, -1, 1, 6, 24) },
		} {
			func() {
				defer func() {
					if recover() == nil {
						t.Errorf("form %d: %s: no panic", f, name)
					}
				}()
				run()
			}()
		}
	}
}
