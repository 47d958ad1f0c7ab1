package semi

import (
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/mat"

	"nullmark/equations"
	"nullmark/grid"
	"nullmark/grid/stencil"
	"nullmark/hyperboloidal"
)

func coupledGeometry(t testing.TB, a float64, s, m, modes, points, order int) *CoupledGeometry {
	t.Helper()
	h, err := hyperboloidal.NewKerr(a)
	if err != nil {
		t.Fatal(err)
	}
	sl := hyperboloidal.KerrLayers{Hole: h, Si: -14, Ri: -2, Ro: 9, So: 24, Steepness: 3}
	g, err := NewCoupledGeometry(sl, equations.Teukolsky{S: s, M: m, Spin: a}, modes, grid.New(sl.Si, sl.So, points), order)
	if err != nil {
		t.Fatal(err)
	}
	return g
}

// The fused right-hand side against the equation written out: derivatives by
// the plain operators, angular matrices dense, the mass matrix solved by gonum.
func TestCoupledAgainstPlain(t *testing.T) {
	for _, c := range []struct {
		a                   float64
		s, m, modes, points int
		order               int
	}{{0.9, -2, 2, 5, 60, 12}, {-0.99, 2, 1, 4, 45, 8}, {0, 0, 0, 1, 40, 12}, {0.5, -2, -3, 2, 41, 4}} {
		g := coupledGeometry(t, c.a, c.s, c.m, c.modes, c.points, c.order)
		n, N := c.modes, c.points
		u := make([]float64, g.Length())
		for i := range u {
			u[i] = math.Sin(1.7*float64(i)) + math.Cos(0.03*float64(i*i))
		}
		got := make([]float64, len(u))
		NewCoupled(g, nil).Apply(got, u)

		field := func(block, l int, imag bool) []float64 {
			v := make([]float64, N)
			for i := range v {
				k := i*2*n + l
				if imag {
					k += n
				}
				v[i] = u[block*2*n*N+k]
			}
			return v
		}
		d1, d2 := stencil.New(1, c.order).Scaled(g.Grid.Dx), stencil.New(2, c.order).Scaled(g.Grid.Dx)
		apply := func(op *stencil.Operator, block int) [][]complex128 {
			out := make([][]complex128, n)
			for l := range out {
				re, im := make([]float64, N), make([]float64, N)
				op.Apply(re, field(block, l, false))
				op.Apply(im, field(block, l, true))
				out[l] = make([]complex128, N)
				for i := range re {
					out[l][i] = complex(re[i], im[i])
				}
			}
			return out
		}
		plain := func(block, l, i int) complex128 {
			return complex(u[block*2*n*N+i*2*n+l], u[block*2*n*N+i*2*n+n+l])
		}
		dPhi, ddPhi, dPi := apply(d1, 0), apply(d2, 0), apply(d1, 1)
		// cos with one more l, so that its square is sin^2 as the equation wants it
		q := g.Equation
		big := q.Couple(n + 1)
		cos := mat.NewDense(n+1, n+1, nil)
		for i := range n + 1 {
			cos.Set(i, i, big.Cos0[i])
			if i < n {
				cos.Set(i, i+1, big.Cos1[i])
				cos.Set(i+1, i, big.Cos1[i])
			}
		}
		var sq mat.Dense
		sq.Mul(cos, cos)
		for i := range N {
			co := q.At(g.Points[i])
			mass := mat.NewDense(n, n, nil)
			re, im := mat.NewVecDense(n, nil), mat.NewVecDense(n, nil)
			for l := range n {
				r := -complex(co.Axx, 0)*ddPhi[l][i] - co.Ax*dPhi[l][i] - complex(co.Axt, 0)*dPi[l][i] -
					co.At*plain(1, l, i) - (complex(q.Eigenvalue(big.LMin+l), 0)+co.V)*plain(0, l, i)
				for k := range n {
					r -= complex(0, 2*c.a*float64(c.s)*cos.At(l, k)) * plain(1, k, i)
					v := c.a * c.a * sq.At(l, k)
					if l == k {
						v += co.A0 - c.a*c.a
					}
					mass.Set(l, k, v)
				}
				re.SetVec(l, real(r))
				im.SetVec(l, imag(r))
			}
			var x, y mat.VecDense
			if err := x.SolveVec(mass, re); err != nil {
				t.Fatal(err)
			}
			if err := y.SolveVec(mass, im); err != nil {
				t.Fatal(err)
			}
			for l := range n {
				want := complex(x.AtVec(l), y.AtVec(l))
				k := 2*n*N + i*2*n + l
				z := complex(got[k], got[k+n])
				if d := cmplx.Abs(z - want); !(d < 1e-11*(1+cmplx.Abs(want))) {
					t.Fatalf("%+v: point %d, mode %d: %v, want %v", c, i, l, z, want)
				}
				if got[i*2*n+l] != real(plain(1, l, i)) {
					t.Fatalf("%+v: dPhi/dtau is not Pi", c)
				}
			}
		}
	}
}

func TestCoupledRefuses(t *testing.T) {
	g := coupledGeometry(t, 0.5, -2, 2, 3, 60, 12)
	if _, err := NewCoupledGeometry(g.Slicing, equations.Teukolsky{S: -2, M: 2, Spin: 0.4}, 3, g.Grid, 12); err == nil {
		t.Error("an equation of another spin was accepted")
	}
	if _, err := NewCoupledGeometry(g.Slicing, g.Equation, 3, grid.New(0, 5, 60), 12); err == nil {
		t.Error("a grid that does not span the slicing was accepted")
	}
	if _, err := NewCoupledGeometry(g.Slicing, g.Equation, 3, grid.New(-14, 24, 20), 12); err == nil {
		t.Error("too few points were accepted")
	}
}

func TestCoupledAllocatesNothing(t *testing.T) {
	g := coupledGeometry(t, 0.5, -2, 2, 3, 60, 12)
	c := NewCoupled(g, nil)
	u, v := make([]float64, g.Length()), make([]float64, g.Length())
	if n := testing.AllocsPerRun(5, func() { c.Apply(v, u) }); n != 0 {
		t.Errorf("%g allocations", n)
	}
}

// Nanoseconds per point and l: divide by 200 * 8.
func BenchmarkCoupled(b *testing.B) {
	g := coupledGeometry(b, 0.9, -2, 2, 8, 200, 12)
	c := NewCoupled(g, nil)
	u, v := make([]float64, g.Length()), make([]float64, g.Length())
	for i := range u {
		u[i] = math.Sin(float64(i))
	}
	for b.Loop() {
		c.Apply(v, u)
	}
}
