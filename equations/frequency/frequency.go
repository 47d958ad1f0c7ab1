// Package frequency solves the sourced Teukolsky equation at one frequency: a
// route to the amplitudes at both ends that shares the coefficient formulas and
// the source with the time domain, but neither slicing, grid, kernel, stepping,
// ramp nor demodulation.
//
// The angular matrices do not depend on radius, so spheroidal modes decouple.
// Each is solved by Chebyshev collocation in x = 1/r on the horizon's side of
// the particle with the time v = t + r* and on the other side with u = t - r*,
// where the wanted solutions are the smooth ones; the particle enters by jumps.
package frequency

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"nullmark/equations"
	"nullmark/hyperboloidal"
	"nullmark/source"
	"nullmark/source/worldline"
)

// Problem is one (s, m) at a real frequency on a given hole, with n angular
// modes.
type Problem struct {
	Hole     hyperboloidal.Kerr
	Equation equations.Teukolsky
	Omega    float64
	LMin, N  int

	eigen   []float64
	vectors *mat.Dense
}

// New sets up the problem for n angular modes. The frequency must not be 0.
func New(h hyperboloidal.Kerr, s, m, n int, omega float64) (*Problem, error) {
	if omega == 0 || math.IsNaN(omega) || math.IsInf(omega, 0) {
		return nil, fmt.Errorf("frequency: %g is not a frequency to solve at", omega)
	}
	q := equations.Teukolsky{S: s, M: m, Spin: h.Spin()}
	c := q.Couple(n)
	p := &Problem{Hole: h, Equation: q, Omega: omega, LMin: c.LMin, N: n, vectors: new(mat.Dense)}
	aw, sp := h.Spin()*omega, float64(s)
	a := mat.NewSymDense(n, nil)
	for i := range n {
		a.SetSym(i, i, q.Eigenvalue(c.LMin+i)+aw*aw*c.Sin0[i]+2*sp*aw*c.Cos0[i])
		if i+1 < n {
			a.SetSym(i, i+1, aw*aw*c.Sin1[i]+2*sp*aw*c.Cos1[i])
		}
		if i+2 < n {
			a.SetSym(i, i+2, aw*aw*c.Sin2[i])
		}
	}
	var e mat.EigenSym
	if !e.Factorize(a, true) {
		return nil, errors.New("frequency: the spheroidal eigenvalue problem did not converge")
	}
	p.eigen = e.Values(nil)
	e.VectorsTo(p.vectors)
	return p, nil
}

// Source is what a particle at radius R puts at this frequency on every
// spherical l: SUM_k C_k delta^(k)(x - 1/R) in the time v.
type Source struct {
	R float64
	C [][3]complex128
}

// Amplitudes are Phi_l at null infinity (of e^{-i omega u}) and at the horizon
// (of e^{-i omega v}), for l = LMin + i, as in the time domain.
type Amplitudes struct{ Infinity, Horizon []complex128 }

// Solve returns the amplitudes of a source, with nodes Chebyshev points in each
// of several domains.
func (p *Problem) Solve(src Source, nodes int) (Amplitudes, error) {
	out := Amplitudes{make([]complex128, p.N), make([]complex128, p.N)}
	for k := range p.N {
		var c [3]complex128
		for i := range p.N {
			b := complex(p.vectors.At(i, k), 0)
			for j := range c {
				c[j] += b * src.C[i][j]
			}
		}
		zi, zh, err := p.mode(p.eigen[k], 1/src.R, c, nodes)
		if err != nil {
			return out, err
		}
		for i := range p.N {
			b := complex(p.vectors.At(i, k), 0)
			out.Infinity[i] += b * zi
			out.Horizon[i] += b * zh
		}
	}
	return out, nil
}

// advanced and retarded return the coefficients of u”, u' and u (angular
// eigenvalue aside) at x in the two times.
func (p *Problem) advanced(x float64) (al, be, ga complex128) {
	h := p.Hole
	a2 := h.Spin() * h.Spin()
	return p.coefficients(hyperboloidal.KerrPoint{
		Where: hyperboloidal.InnerPart, X: x, X1: 1,
		D: 1 - 2*x + a2*x*x, C: 2/(x*x) + 2*a2, Cx: -4 / (x * x * x),
	})
}

func (p *Problem) retarded(x float64) (al, be, ga complex128) {
	h := p.Hole
	a2 := h.Spin() * h.Spin()
	d := 1 - 2*x + a2*x*x
	return p.coefficients(hyperboloidal.KerrPoint{
		Where: hyperboloidal.OuterPart, X: x, X1: 1, D: d, B: 2 * (1 + a2*x*x) / d,
	})
}

func (p *Problem) coefficients(at hyperboloidal.KerrPoint) (al, be, ga complex128) {
	c := p.Equation.At(at)
	iw := complex(0, -p.Omega)
	return complex(c.Axx, 0), c.Ax + iw*complex(c.Axt, 0), iw*iw*complex(c.A0, 0) + iw*c.At + c.V
}

// mode solves one spheroidal mode.
func (p *Problem) mode(ev, xp float64, c [3]complex128, nodes int) (inf, hor complex128, err error) {
	h := p.Hole
	a2 := h.Spin() * h.Spin()
	top := 1 / h.OuterHorizon()
	gap := math.Inf(1) // to the singular point at the inner horizon
	if h.InnerHorizon() > 0 {
		gap = 1/h.InnerHorizon() - top
	}
	// Domains in x, the particle at a joint. Power laws r^k make domains of
	// bounded ratio converge fast; so does a bounded ratio of distances to the
	// inner horizon, which a fast-spinning hole has close by.
	var edges []float64
	for x := xp; ; {
		edges = append([]float64{x}, edges...)
		if x <= math.Min(2*math.Abs(p.Omega), 1.5*(top-x)) || len(edges) > 12 {
			break
		}
		x = math.Max(x/2.5, x-1.2*(top-x))
	}
	edges = append([]float64{0}, edges...)
	joint := len(edges) - 1
	for x := xp; top-x > math.Min(0.6*top, 1.5*gap) && len(edges) < 40; {
		x = math.Min(2.5*x, top-(top-x)/2.5)
		edges = append(edges, x)
	}
	edges = append(edges, top)
	doms := len(edges) - 1
	n := nodes
	size := doms * n
	a := mat.NewDense(2*size, 2*size, nil)
	rhs := mat.NewVecDense(2*size, nil)
	add := func(i, j int, v complex128) {
		a.Set(i, j, a.At(i, j)+real(v))
		a.Set(size+i, size+j, a.At(size+i, size+j)+real(v))
		a.Set(i, size+j, a.At(i, size+j)-imag(v))
		a.Set(size+i, j, a.At(size+i, j)+imag(v))
	}
	set := func(i int, v complex128) {
		rhs.SetVec(i, real(v))
		rhs.SetVec(size+i, imag(v))
	}
	t, d1 := chebyshev(n)
	for k := range doms {
		lo, hi := edges[k], edges[k+1]
		half := (hi - lo) / 2
		for i := range n {
			if i == 0 && k > 0 || i == n-1 && k < doms-1 {
				continue // joints
			}
			x := lo + half*(1+t[i])
			var al, be, ga complex128
			if k < joint {
				al, be, ga = p.retarded(x)
			} else {
				al, be, ga = p.advanced(x)
			}
			row := k*n + i
			for j := range n {
				second := 0.0
				for q := range n {
					second += d1[i][q] * d1[q][j]
				}
				add(row, k*n+j, al*complex(second/(half*half), 0)+be*complex(d1[i][j]/half, 0))
			}
			add(row, row, ga+complex(ev, 0))
		}
	}
	// Joints: the last node of domain k and the first of k+1 carry value and
	// slope conditions, right minus left = jump.
	for k := range doms - 1 {
		left, right := k*n+n-1, (k+1)*n
		hl, hr := (edges[k+1]-edges[k])/2, (edges[k+2]-edges[k+1])/2
		f, df := complex128(1), complex128(0)
		var j0, j1 complex128
		if k+1 == joint {
			// retarded to advanced: u_v = u_u e^{2 i omega r*}
			rs := h.Tortoise(1/xp - h.OuterHorizon())
			f = cmplx.Exp(complex(0, 2*p.Omega*rs))
			df = f * complex(0, 2*p.Omega) * complex(-(1+a2*xp*xp)/(xp*xp*(1-2*xp+a2*xp*xp)), 0)
			j0, j1 = p.jumps(ev, xp, c)
		}
		add(left, right, 1)
		add(left, left, -f)
		set(left, j0)
		for j := range n {
			add(right, (k+1)*n+j, complex(d1[0][j]/hr, 0))
			add(right, k*n+j, -f*complex(d1[n-1][j]/hl, 0))
		}
		add(right, left, -df)
		set(right, j1)
	}
	// Row scaling keeps the elimination's pivots honest.
	for i := range 2 * size {
		big := 0.0
		for j := range 2 * size {
			big = math.Max(big, math.Abs(a.At(i, j)))
		}
		for j := range 2 * size {
			a.Set(i, j, a.At(i, j)/big)
		}
		rhs.SetVec(i, rhs.AtVec(i)/big)
	}
	var lu mat.LU
	lu.Factorize(a)
	var z mat.VecDense
	if err := lu.SolveVecTo(&z, false, rhs); err != nil {
		var c mat.Condition
		if !errors.As(err, &c) || math.IsInf(float64(c), 1) {
			return 0, 0, fmt.Errorf("frequency: %w", err)
		}
	}
	// one step of refinement
	var res, dz mat.VecDense
	res.MulVec(a, &z)
	res.SubVec(rhs, &res)
	if err := lu.SolveVecTo(&dz, false, &res); err == nil || dz.Len() == z.Len() {
		z.AddVec(&z, &dz)
	}
	at := func(i int) complex128 { return complex(z.AtVec(i), z.AtVec(size+i)) }
	return at(0), at(size - 1), nil
}

// jumps returns the jumps of u and du/dx across the particle (larger x minus
// smaller) in the time v: with al u” + be u' + ga u = C0 d + C1 d' + C2 d” the
// solution carries D d, D = C2/al, and
//
//	J0 = (C1 + 2 al' D - be D)/al,
//	J1 = (C0 + al' J0 - al” D - be J0 + be' D - ga D)/al.
func (p *Problem) jumps(ev, x float64, c [3]complex128) (j0, j1 complex128) {
	a, s, m := p.Equation.Spin, float64(p.Equation.S), float64(p.Equation.M)
	a2 := a * a
	al, be, ga := p.advanced(x)
	ga += complex(ev, 0)
	al1 := complex(-2*x+6*x*x-4*a2*x*x*x, 0)
	al2 := complex(-2+12*x-12*a2*x*x, 0)
	be1 := complex(-2*(1+s)+2*(6+2*s)*x-12*a2*x*x, 4*m*a*x) + complex(0, -p.Omega)*complex(4*a2*x, 0)
	d := c[2] / al
	j0 = (c[1] + 2*al1*d - be*d) / al
	j1 = (c[0] + al1*j0 - al2*d - be*j0 + be1*d - ga*d) / al
	return j0, j1
}

// chebyshev returns n Gauss–Lobatto points from -1 to 1 and the derivative
// matrix, its diagonal from the row sums.
func chebyshev(n int) (t []float64, d [][]float64) {
	t = make([]float64, n)
	for i := range t {
		t[i] = -math.Cos(math.Pi * float64(i) / float64(n-1))
	}
	d = make([][]float64, n)
	for i := range d {
		d[i] = make([]float64, n)
		sum := 0.0
		for j := range d[i] {
			if i == j {
				continue
			}
			w := 1.0
			if i == 0 || i == n-1 {
				w *= 2
			}
			if j == 0 || j == n-1 {
				w /= 2
			}
			if (i+j)%2 != 0 {
				w = -w
			}
			// t_i - t_j as a product of sines, without cancellation
			diff := 2 * math.Sin(math.Pi*float64(i+j)/float64(2*(n-1))) * math.Sin(math.Pi*float64(i-j)/float64(2*(n-1)))
			d[i][j] = w / diff
			sum += d[i][j]
		}
		d[i][i] = -sum
	}
	return t, d
}

// CircularSources returns the sources of a circular orbit, equatorial or
// inclined: for each harmonic k of the polar motion, -kmax..kmax (k = 0 alone
// when the orbit is equatorial), the frequency m Omega_phi + k Omega_theta and
// the source in the spherical modes l = LMin..LMin+n-1. It panics for an
// eccentric orbit.
func CircularSources(h hyperboloidal.Kerr, o *worldline.KerrBound, s, m, n, kmax int) (omega []float64, src []Source) {
	if o.Ecc != 0 {
		panic("frequency: sources of an eccentric orbit asked of the circular solver")
	}
	lmin := equations.Teukolsky{S: s, M: m}.LMin()
	samples := 1
	if o.Q > 0 {
		samples = 16 * (kmax + n + 4)
	} else {
		kmax = 0
	}
	a := h.Spin()
	rs := h.Tortoise(o.P - h.OuterHorizon())
	at := hyperboloidal.KerrPoint{X: 1 / o.P, X1: 1} // the time v: B = 0
	period := 2 * math.Pi / o.OmegaTheta
	for k := -kmax; k <= kmax; k++ {
		omega = append(omega, float64(m)*o.OmegaPhi+float64(k)*o.OmegaTheta)
		src = append(src, Source{R: o.P, C: make([][3]complex128, n)})
	}
	lad := [3][]float64{make([]float64, n), make([]float64, n), make([]float64, n)}
	for i := range samples {
		t := period * float64(i) / float64(samples)
		st, _ := o.At(t)
		var p source.Projection
		if s > 0 {
			p = source.ProjectPlus2(a, m, st, at)
		} else {
			p = source.ProjectMinus2(a, st, at)
		}
		source.HarmonicLadder(lad, s, m, lmin, math.Atan2(st.Sin, st.Cos))
		phase := source.AzimuthPhase(m, st.Phi)
		for q, w := range omega {
			// the field goes as e^{-i w v}, v = t + r*
			f := phase * cmplx.Exp(complex(0, w*(t+rs))) / complex(float64(samples), 0)
			iw := complex(0, -w)
			for l := range n {
				c := p.Mode(lad[0][l], lad[1][l], lad[2][l], f)
				src[q].C[l][0] += c[0] + iw*c[3] + iw*iw*c[5]
				src[q].C[l][1] += c[1] + iw*c[4]
				src[q].C[l][2] += c[2]
			}
		}
	}
	return omega, src
}

// Opinion is the answer at one frequency of a circular orbit, with how much more
// nodes change it: Change bounds the relative error of the largest amplitude at
// each end (infinity, horizon).
type Opinion struct {
	Omega float64
	LMin  int
	Amplitudes
	Change [2]float64
}

// Circular solves all tones of a circular orbit at one m with n values of l and
// polar harmonics up to kmax (ignored when the orbit is equatorial), twice, with
// 36 and 46 nodes a domain. Tones of zero frequency are left out.
func Circular(h hyperboloidal.Kerr, o *worldline.KerrBound, s, m, n, kmax int) ([]Opinion, error) {
	const few, many = 36, 46
	omega, src := CircularSources(h, o, s, m, n, kmax)
	var out []Opinion
	for k, w := range omega {
		if math.Abs(w) < 1e-9*math.Abs(o.OmegaPhi) {
			continue
		}
		p, err := New(h, s, m, n, w)
		if err != nil {
			return nil, err
		}
		a, err := p.Solve(src[k], few)
		if err != nil {
			return nil, err
		}
		b, err := p.Solve(src[k], many)
		if err != nil {
			return nil, err
		}
		out = append(out, Opinion{Omega: w, LMin: p.LMin, Amplitudes: b,
			Change: [2]float64{change(a.Infinity, b.Infinity), change(a.Horizon, b.Horizon)}})
	}
	return out, nil
}

func change(a, b []complex128) float64 {
	d, size := 0.0, 0.0
	for i := range a {
		d = math.Max(d, cmplx.Abs(a[i]-b[i]))
		size = math.Max(size, cmplx.Abs(b[i]))
	}
	return d / size
}
