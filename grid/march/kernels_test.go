package march

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
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
		if special && r.IntN(8) == 0 {
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
			t.Fatalf("%s: index %d of %d: %v, plain %v", what, i, len(want), got[i], want[i])
		}
	}
}

// compareForms runs the three kernels in every form on length n and compares
// all that they wrote, and that nothing was written beyond.
func compareForms(t testing.TB, seed uint64, n, terms int, special bool) {
	t.Helper()
	const margin = 9
	r := rand.New(rand.NewPCG(seed, uint64(n)))
	vec := func() []float64 {
		v := make([]float64, n+margin)
		awkward(r, v, special)
		return v
	}
	x, y, p, q := vec(), vec(), vec(), vec()
	k := make([][]float64, terms)
	for j := range k {
		k[j] = vec()
	}
	c := make([]float64, terms+4)
	awkward(r, c, special)
	clone := func(v []float64) []float64 { return append([]float64(nil), v...) }
	type result struct{ u, w, y, alias, px, py []float64 }
	run := func(s instructions) result {
		o := result{clone(x), clone(y), clone(y), clone(x), clone(x), clone(y)}
		s.accumulate(o.u[:n], o.w[:n], c[0])
		s.combine(o.y[:n], x[:n], k, c[:terms])
		s.combine(o.alias[:n], o.alias[:n], k, c[:terms])
		s.pair(o.px[:n], o.py[:n], p[:n], q[:n], (*[4]float64)(c[terms:]))
		return o
	}
	want := run(goCode)
	for _, s := range forms()[1:] {
		got := run(s)
		name := fmt.Sprintf("form %d, length %d, %d terms", s, n, terms)
		sameBits(t, name+": accumulate u", got.u, want.u)
		sameBits(t, name+": accumulate w", got.w, want.w)
		sameBits(t, name+": combine", got.y, want.y)
		sameBits(t, name+": combine in place", got.alias, want.alias)
		sameBits(t, name+": pair x", got.px, want.px)
		sameBits(t, name+": pair y", got.py, want.py)
	}
}

func TestVectorKernelsGiveTheBitsOfThePlainOnes(t *testing.T) {
	for n := 0; n < 150; n++ {
		compareForms(t, 1, n, n%8, false)
		compareForms(t, 2, n, 1+n%13, true)
	}
}

func FuzzVectorKernels(f *testing.F) {
	f.Add(uint64(1), uint16(37), uint8(3), true)
	f.Add(uint64(2), uint16(1000), uint8(11), false)
	f.Fuzz(func(t *testing.T, seed uint64, n uint16, terms uint8, special bool) {
		compareForms(t, seed, int(n%2048), int(terms%16), special)
	})
}

// TestPlainKernelsDoWhatTheySay checks the references on numbers small enough
// to be exact.
func TestPlainKernelsDoWhatTheySay(t *testing.T) {
	u, w := []float64{1, 2}, []float64{3, 4}
	accumulate(u, w, 2)
	sameBits(t, "accumulate u", u, []float64{7, 10})
	sameBits(t, "accumulate w", w, []float64{6, 8})
	y := make([]float64, 2)
	combine(y, []float64{1, 2}, [][]float64{{1, 1}, {2, 3}}, []float64{5, 7})
	sameBits(t, "combine", y, []float64{20, 28})
	a, b := []float64{1, 0}, []float64{0, 1}
	pair(a, b, []float64{1, 2}, []float64{3, 4}, &[4]float64{1, 10, 100, 1000})
	sameBits(t, "pair x", a, []float64{32, 42})
	sameBits(t, "pair y", b, []float64{3100, 4201})
}

// chain is x_i” = x_{i+1} - 2 x_i + x_{i-1} - x_i'/8 + i sin t on a ring, as a
// second-order system; asLinear hides that.
type chain struct{ n int }

type asLinear struct{ Linear }

func (c chain) RHS(dst, u []float64, t float64) {
	c.Apply(dst, u)
	c.force(dst[c.n:], math.Sin(t))
}

func (c chain) Apply(dst, u []float64) {
	copy(dst, u[c.n:])
	c.Accelerate(dst[c.n:], u[:c.n], u[c.n:], nil)
}

func (c chain) Accelerate(dst, x, y []float64, sum *Sum) {
	for i := range dst {
		dst[i] = x[(i+1)%c.n] - 2*x[i] + x[(i+c.n-1)%c.n] - y[i]/8
	}
	if sum != nil {
		for i := 0; i < c.n; i += 3 { // in pieces
			sum.Add(x, y, i, min(i+3, c.n))
		}
	}
}

func (c chain) force(dst []float64, a float64) {
	for i := range dst {
		dst[i] += float64(i) * a
	}
}

// Prepare pins the force at t = 0: derivatives 0, 1, 0, -1, ...
func (c chain) Prepare(t, dt float64) {}

func (c chain) AddForce(dst []float64, j int, scale float64) {
	c.AddAcceleration(dst[c.n:], j, scale)
}

func (c chain) AddAcceleration(dst []float64, j int, scale float64) {
	c.force(dst, scale*[]float64{0, 1, 0, -1}[j%4])
}

// TestTaylorOfSecondOrderIsTheSameSeries compares the block form with the one
// for any linear system, at every order: the same polynomial, other roundings.
func TestTaylorOfSecondOrderIsTheSameSeries(t *testing.T) {
	c := chain{n: 11}
	for order := 1; order <= 12; order++ {
		u, v := make([]float64, 2*c.n), make([]float64, 2*c.n)
		for i := range u {
			u[i] = math.Sin(float64(3 * i * i))
		}
		copy(v, u)
		blocks, general := NewTaylor(c, order, len(u)), NewTaylor(asLinear{c}, order, len(v))
		if blocks.second == nil || general.second != nil {
			t.Fatal("the two forms are not both in use")
		}
		for range 20 {
			blocks.Step(u, 0, .5)
			general.Step(v, 0, .5)
		}
		for i := range u {
			// Values grow to a few hundred in 20 steps; 1e-12 is some 10 roundings.
			if d := math.Abs(u[i] - v[i]); !(d <= 1e-12*(1+math.Abs(v[i]))) {
				t.Errorf("order %d: index %d: %v and %v", order, i, u[i], v[i])
			}
		}
	}
}

// TestRungeKuttaSumsAsItsTableauSays repeats a step with plain sums.
func TestRungeKuttaSumsAsItsTableauSays(t *testing.T) {
	const at, dt = .4, .3
	c := chain{n: 21}
	for _, tab := range []*Tableau{RK4(), RK8()} {
		u := make([]float64, 2*c.n)
		for i := range u {
			u[i] = math.Cos(float64(i * i))
		}
		var k [][]float64
		add := func(a []float64) []float64 {
			y := append([]float64(nil), u...)
			for j, v := range a {
				for i := range y {
					y[i] += float64(v*dt) * k[j][i]
				}
			}
			return y
		}
		for i := range tab.B {
			k = append(k, make([]float64, len(u)))
			c.RHS(k[i], add(tab.A[i]), at+tab.C[i]*dt)
		}
		want := add(tab.B)
		NewRungeKutta(c, tab, len(u)).Step(u, at, dt)
		for i := range u {
			// A zero weight or a fused product may round otherwise: values of
			// order 10, so four roundings.
			if d := math.Abs(u[i] - want[i]); !(d <= 1e-14) {
				t.Errorf("%s: index %d: %v, want %v", tab.Name, i, u[i], want[i])
			}
		}
	}
}

func TestSteppersDoNotAllocate(t *testing.T) {
	c := chain{n: 40}
	u := make([]float64, 2*c.n)
	for name, s := range map[string]Stepper{
		"Taylor, second order": NewTaylor(c, 8, len(u)),
		"Taylor":               NewTaylor(asLinear{c}, 8, len(u)),
		"Runge-Kutta":          NewRungeKutta(c, RK8(), len(u)),
	} {
		for _, f := range forms() {
			force(t, f)
			if n := testing.AllocsPerRun(10, func() { s.Step(u, 0, .01) }); n != 0 {
				t.Errorf("%s, form %d: %v allocations a step", name, f, n)
			}
		}
	}
}

// TestStepsAreTheSameInEveryForm takes whole steps.
func TestStepsAreTheSameInEveryForm(t *testing.T) {
	c := chain{n: 37}
	run := func(make func() Stepper) []float64 {
		u := []float64{}
		for i := range 2 * c.n {
			u = append(u, math.Cos(float64(i*i)))
		}
		s := make()
		for k := range 30 {
			s.Step(u, float64(k)*.25, .25)
		}
		return u
	}
	for name, s := range map[string]func() Stepper{
		"Taylor 8":    func() Stepper { return NewTaylor(c, 8, 2*c.n) },
		"Taylor 7":    func() Stepper { return NewTaylor(c, 7, 2*c.n) },
		"general":     func() Stepper { return NewTaylor(asLinear{c}, 8, 2*c.n) },
		"Runge-Kutta": func() Stepper { return NewRungeKutta(c, RK8(), 2*c.n) },
	} {
		force(t, goCode)
		want := run(s)
		for _, f := range forms()[1:] {
			force(t, f)
			sameBits(t, fmt.Sprintf("%s, form %d", name, f), run(s), want)
		}
	}
}

func BenchmarkStages(b *testing.B) {
	const n = 2 * 200 * 8
	k := make([][]float64, 8)
	c := make([]float64, len(k))
	u := make([]float64, n)
	for j := range k {
		k[j], c[j] = make([]float64, n), float64(j)
	}
	for _, f := range forms() {
		b.Run(fmt.Sprintf("combine/form%d", f), func(b *testing.B) {
			for b.Loop() {
				f.combine(u, u, k, c)
			}
		})
		b.Run(fmt.Sprintf("accumulate/form%d", f), func(b *testing.B) {
			for b.Loop() {
				f.accumulate(u, k[0], 1)
			}
		})
	}
}
