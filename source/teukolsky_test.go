package source

import (
	"math"
	"math/cmplx"
	"testing"

	"nullmark/hyperboloidal"
	"nullmark/source/worldline"
)

// Closed forms (J. N. Goldberg et al. (1967); B. F. Schutz et al. use the same
// signs for -2Y) and orthonormality by Gauss-like quadrature in theta.
func TestSpinHarmonics(t *testing.T) {
	at := func(s, l, m int, th float64) float64 {
		v := make([]float64, 1)
		SpinHarmonics(v, s, m, l, th)
		return v[0]
	}
	th := 0.7
	c, s := math.Cos(th), math.Sin(th)
	for _, x := range []struct {
		s, l, m int
		want    float64
	}{
		{-2, 2, 2, math.Sqrt(5/(64*math.Pi)) * (1 + c) * (1 + c)},
		{-2, 2, 1, math.Sqrt(5/(16*math.Pi)) * s * (1 + c)},
		{-2, 2, 0, math.Sqrt(15/(32*math.Pi)) * s * s},
		{-2, 2, -1, math.Sqrt(5/(16*math.Pi)) * s * (1 - c)},
		{-2, 2, -2, math.Sqrt(5/(64*math.Pi)) * (1 - c) * (1 - c)},
		{0, 1, 1, -math.Sqrt(3/(8*math.Pi)) * s},
		{0, 2, 0, math.Sqrt(5/(16*math.Pi)) * (3*c*c - 1)},
	} {
		if got := at(x.s, x.l, x.m, th); math.Abs(got-x.want) > 1e-15 {
			t.Errorf("s=%d l=%d m=%d: %g, want %g", x.s, x.l, x.m, got, x.want)
		}
	}
	// The ladder that the projection relies on: d_theta -+ m/sin + n cot of one
	// spin weight is the next one, for every sign of s and m.
	const h = 1e-3
	for _, sp := range []int{-2, 2} {
		for m := -4; m <= 4; m++ {
			for l := max(2, m, -m); l < 9; l++ {
				lad := func(x float64) [3]float64 {
					v := newLadder(1)
					HarmonicLadder(v, sp, m, l, x)
					return [3]float64{v[0][0], v[1][0], v[2][0]}
				}
				sg := -1.0
				if sp > 0 {
					sg = 1
				}
				y, p1, m1, p2, m2 := lad(th), lad(th+h), lad(th-h), lad(th+2*h), lad(th-2*h)
				for i := range 2 {
					d := (8*(p1[i]-m1[i]) - (p2[i] - m2[i])) / (12 * h)
					got := d + (sg*float64(m)/s+float64(2-i)*c/s)*y[i]
					if math.Abs(got-y[i+1]) > 1e-8*float64(l*l*l*l) {
						t.Errorf("s=%d l=%d m=%d rung %d: %g, want %g", sp, l, m, i, y[i+1], got)
					}
				}
			}
		}
	}
	// orthonormality: trapezoid in theta with sin(theta) is spectral for the even products
	const n = 4000
	var g [2][2]float64
	for i := range n {
		x := math.Pi * (float64(i) + 0.5) / n
		v := make([]float64, 2)
		SpinHarmonics(v, -1, 2, 5, x)
		for a := range 2 {
			for b := range 2 {
				g[a][b] += 2 * math.Pi * v[a] * v[b] * math.Sin(x) * math.Pi / n
			}
		}
	}
	if math.Abs(g[0][0]-1) > 1e-6 || math.Abs(g[1][1]-1) > 1e-6 || math.Abs(g[0][1]) > 1e-6 {
		t.Errorf("Gram matrix %v", g)
	}
}

// The moving forcing of a circular orbit sampled as a track equals the exact
// stationary one: differences in time, ring buffers and phases.
func TestMovingEqualsCircular(t *testing.T) {
	h, err := hyperboloidal.NewKerr(0.7)
	if err != nil {
		t.Fatal(err)
	}
	const r, m = 8.0, 2
	k, om, err := worldline.CircularKerr(h, r)
	if err != nil {
		t.Fatal(err)
	}
	y := r - h.OuterHorizon()
	state := worldline.KerrState{Rho: h.Tortoise(y), R: r, Sin: 1, Phi: h.Azimuth(y), E: k.E, L: k.L}
	sl := hyperboloidal.KerrLayers{Hole: h, Si: state.Rho - 20, Ri: state.Rho - 8, Ro: state.Rho + 8, So: state.Rho + 22, Steepness: 3}
	const points, dt = 100, 0.4
	for _, spin := range []int{-2, 2} {
		c := KerrCarrier{Slicing: sl, S: spin, M: m, LMin: 2, N: 4, Finish: func(i int, v []float64) {}}
		for i := range points {
			c.Points = append(c.Points, sl.At(sl.Si+float64(i)*(sl.So-sl.Si)/(points-1)*(1-1e-16)))
		}
		kern := NewKernel(0.7, 12)
		ramp := Ramp{Centre: 3, Width: 4}
		tr := KerrTrack{Start: -TrackLead * dt / 4, Step: dt / 4}
		for i := range 200 {
			s := state
			s.Phi += om * (tr.Start + float64(i)*tr.Step)
			tr.States = append(tr.States, s)
		}
		f, g := NewTeukolskyCircular(c, state, om, kern, ramp), NewTeukolskyMoving(c, tr, kern, ramp)
		for step := range 6 {
			tm := float64(step) * dt
			f.Prepare(tm, dt)
			g.Prepare(tm, dt)
			scale, whole := 1.0, 0.0
			for j := range 8 {
				a, b := make([]float64, 8*points), make([]float64, 8*points)
				f.AddDerivative(a, j, scale)
				g.AddDerivative(b, j, scale)
				var worst, size float64
				for i := range a {
					worst = math.Max(worst, math.Abs(a[i]-b[i]))
					size = math.Max(size, math.Abs(a[i]))
				}
				// the j-th Taylor term of a step against the zeroth
				if j == 0 && worst > 3e-12*size {
					t.Errorf("s=%d step %d: value off by %.1e of %.1e", spin, step, worst, size)
				}
				if j == 0 {
					whole = size
				}
				// the interpolant of degree 8 meets a ramp of ten steps: 1.5e-10 measured
				if worst > 3e-10*whole {
					t.Errorf("s=%d step %d derivative %d: off by %.1e of %.1e", spin, step, j, worst, whole)
				}
				scale *= dt / float64(j+1)
			}
		}
	}
}

// At2's derivatives are those of its value.
func TestKernelSecondDerivative(t *testing.T) {
	k := NewKernel(0.6, 12)
	const h = 1e-3
	for _, x := range []float64{-1.3, 0, 0.4, 2.2} {
		d, d1, d2 := k.At2(x)
		p, p1, _ := k.At2(x + h)
		m, m1, _ := k.At2(x - h)
		e, e1 := k.At(x)
		if d != e || math.Abs(d1-e1) > 1e-14 {
			t.Errorf("At2(%g) = %g, %g; At gives %g, %g", x, d, d1, e, e1)
		}
		if math.Abs((p-m)/(2*h)-d1) > 2e-4 || math.Abs((p1-m1)/(2*h)-d2) > 2e-3 {
			t.Errorf("derivatives at %g", x)
		}
	}
}

// The graded operators equal brute differentiation: the projected first term of
// the source against its definition with the weight differentiated numerically.
func TestProjectionAgainstDefinition(t *testing.T) {
	h, _ := hyperboloidal.NewKerr(0.8)
	sl := hyperboloidal.KerrLayers{Hole: h, Si: -10, Ri: -2, Ro: 12, So: 25, Steepness: 3}
	const a, l, m = 0.8, 3, 2
	k := worldline.KerrState{Rho: 6, Cos: 0.4, Sin: math.Sqrt(1 - 0.16), Wr: 1.1, Wtheta: -0.7, E: 0.95, L: 2.1, Q: 3}
	p := sl.At(k.Rho)
	k.R = 1 / p.X
	proj := ProjectMinus2(a, k, p)
	lad := newLadder(1)
	HarmonicLadder(lad, -2, m, l, math.Atan2(k.Sin, k.Cos))
	got := proj.Mode(lad[0][0], lad[1][0], lad[2][0], 1)
	// c_02 = x^4 q^4 w Z4 and c_20 = sum of three terms have no derivatives.
	q := complex(k.R, -a*k.Cos)
	qb := cmplx.Conj(q)
	w := complex(math.Pi*k.R*lad[0][0], 0) / (q * q * q)
	n := complex(k.Ingoing(a), 0)
	th := complex(k.Wtheta, k.Twist(a))
	pre := complex(p.X*p.X/k.SigmaTau(a, p.B), 0)
	z1, z2, z4 := pre*n*n/qb, pre*n*th*qb, pre*th*th/qb
	q4 := q * q * q * q
	pp := q4 / (qb * qb)
	sg := complex(0, a*k.Sin)
	b := complex(p.B, 0)
	x2 := complex(p.X*p.X, 0)
	check := func(name string, g, want complex128) {
		if cmplx.Abs(g-want) > 1e-13*cmplx.Abs(want) {
			t.Errorf("%s = %v, want %v", name, g, want)
		}
	}
	check("c02", got[2], x2*x2*q4*w*z4)
	check("c20", got[5], sg*sg*q4*w*z1-2*sg*b*pp*w*z2+b*b*q4*w*z4)
	check("c11", got[4], -2*sg*x2*pp*w*z2+2*b*x2*q4*w*z4)
}
