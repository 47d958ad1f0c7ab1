package semi

import (
	"fmt"
	"math"

	"nullmark/equations"
	"nullmark/grid"
	"nullmark/grid/stencil"
	"nullmark/hyperboloidal"
)

// Coupled is the semi-discretised Teukolsky equation at one azimuthal number:
// n complex fields Phi_l, coupled by cos theta and sin^2 theta,
//
//	Phi_tau = Pi
//	Pi_tau  = [A0 - a^2 S2]^-1 { source - Axx D2 Phi - Ax D Phi - Axt D Pi
//	           - (At + 2 i a s Cth) Pi - (lam_l + V) Phi }.
//
// The state is [Phi][Pi]; each half holds, point by point, the n real parts and
// then the n imaginary parts (Stride = 2n numbers a point), so that differences
// run over contiguous lanes. The pentadiagonal mass matrix is factorised once
// at every point (L D L^T). It implements march.Linear and is not safe for
// concurrent use; the tables (CoupledGeometry) may be shared.
type Coupled struct {
	geo     *CoupledGeometry
	forcing Forcing
	d, e    []float64 // D Phi, D Pi of one point
}

// CoupledGeometry holds what every evolution of one equation on one grid
// shares. It is never written after NewCoupledGeometry.
type CoupledGeometry struct {
	Grid     grid.Grid
	Slicing  hyperboloidal.KerrLayers
	Equation equations.Teukolsky
	Order    int
	Modes    int // n
	Points   []hyperboloidal.KerrPoint
	Coupling equations.Coupling

	first, second *stencil.Operator
	b1, b2        []float64 // centred weights at offsets 1..half (and 0 for b2)
	ends          []endRows // of the first and the last half rows
	at            []coupledPoint
	flat          []bool
	lam           []float64
	mass          []float64 // per point 3n: l1, l2, 1/d
}

// endRows are the biased weights of one row near an end.
type endRows struct {
	f1, f2 int
	w1, w2 []float64
}

// coupledPoint holds the coefficients of one point.
type coupledPoint struct {
	xx, xt float64
	xr, xi float64 // of D Phi
	tr, ti float64 // of Pi
	vr, vi float64 // of Phi
}

// NewCoupledGeometry samples the equation with n values of l on the grid, which
// must span the slicing.
func NewCoupledGeometry(s hyperboloidal.KerrLayers, q equations.Teukolsky, n int, g grid.Grid, order int) (*CoupledGeometry, error) {
	if err := s.Check(); err != nil {
		return nil, err
	}
	if g.Start != s.Si || g.End != s.So {
		return nil, fmt.Errorf("semi: grid [%g, %g] and slicing [%g, %g] differ", g.Start, g.End, s.Si, s.So)
	}
	if q.Spin != s.Hole.Spin() {
		return nil, fmt.Errorf("semi: equation of spin %g on a hole of spin %g", q.Spin, s.Hole.Spin())
	}
	geo := &CoupledGeometry{
		Grid: g, Slicing: s, Equation: q, Order: order, Modes: n,
		Coupling: q.Couple(n),
		first:    stencil.New(1, order).Scaled(g.Dx),
		second:   stencil.New(2, order).Scaled(g.Dx),
		at:       make([]coupledPoint, g.N),
		flat:     make([]bool, g.N),
		lam:      make([]float64, n),
		mass:     make([]float64, 3*n*g.N),
	}
	if g.N < geo.second.MinPoints() {
		return nil, fmt.Errorf("semi: %d points are too few for order %d (at least %d)", g.N, order, geo.second.MinPoints())
	}
	h := geo.first.Half
	geo.b1 = geo.first.Centre[h:]
	geo.b2 = geo.second.Centre[h:]
	for i := range g.N {
		if i < h || i >= g.N-h {
			f1, w1 := geo.first.Row(i, g.N)
			f2, w2 := geo.second.Row(i, g.N)
			geo.ends = append(geo.ends, endRows{f1, f2, w1, w2})
		}
	}
	for i := range geo.lam {
		geo.lam[i] = q.Eigenvalue(geo.Coupling.LMin + i)
	}
	a2 := q.Spin * q.Spin
	for i, rho := range g.Rho() {
		p := s.At(rho)
		geo.Points = append(geo.Points, p)
		c := q.At(p)
		geo.at[i] = coupledPoint{c.Axx, c.Axt, real(c.Ax), imag(c.Ax), real(c.At), imag(c.At), real(c.V), imag(c.V)}
		geo.flat[i] = c.Axt == 0
		m := geo.mass[3*n*i : 3*n*(i+1)]
		factorise(m[:n], m[n:2*n], m[2*n:], c.A0, a2, geo.Coupling)
	}
	return geo, nil
}

// factorise writes L D L^T of A0 - a2 S2: l1[i], l2[i] couple row i to i+1 and
// i+2, di[i] = 1/D_i.
func factorise(l1, l2, di []float64, a0, a2 float64, c equations.Coupling) {
	n := len(di)
	d := make([]float64, n)
	for i := range n {
		d[i] = a0 - a2*c.Sin0[i]
		if i >= 1 {
			d[i] -= l1[i-1] * l1[i-1] * d[i-1]
		}
		if i >= 2 {
			d[i] -= l2[i-2] * l2[i-2] * d[i-2]
		}
		if i+1 < n {
			u := -a2 * c.Sin1[i]
			if i >= 1 {
				u -= l1[i-1] * l2[i-1] * d[i-1]
			}
			l1[i] = u / d[i]
		}
		if i+2 < n {
			l2[i] = -a2 * c.Sin2[i] / d[i]
		}
		di[i] = 1 / d[i]
	}
}

// Solve overwrites v, the 2n numbers of point i, by [A0 - a^2 S2]^-1 v.
func (g *CoupledGeometry) Solve(i int, v []float64) {
	n := g.Modes
	m := g.mass[3*n*i : 3*n*(i+1)]
	solve(m[:n], m[n:2*n], m[2*n:], v[:n], v[n:2*n])
}

func solve(l1, l2, di, re, im []float64) {
	n := len(di)
	l1, l2, re, im = l1[:n], l2[:n], re[:n], im[:n]
	if n == 1 {
		re[0] *= di[0]
		im[0] *= di[0]
		return
	}
	r1, r2, i1, i2 := re[0], 0.0, im[0], 0.0
	c1, c2 := l1[0], 0.0
	for k := 1; k < n; k++ {
		r := re[k] - c1*r1 - c2*r2
		q := im[k] - c1*i1 - c2*i2
		re[k], im[k] = r, q
		r2, i2, r1, i1 = r1, i1, r, q
		c1, c2 = l1[k], l2[k-1]
	}
	r1, r2, i1, i2 = 0, 0, 0, 0
	for k := n - 1; k >= 0; k-- {
		r := re[k]*di[k] - l1[k]*r1 - l2[k]*r2
		q := im[k]*di[k] - l1[k]*i1 - l2[k]*i2
		re[k], im[k] = r, q
		r2, i2, r1, i1 = r1, i1, r, q
	}
}

// Stride is the count of real numbers a point carries in each half of a state.
func (g *CoupledGeometry) Stride() int { return 2 * g.Modes }

// Length is the length of a state vector.
func (g *CoupledGeometry) Length() int { return 4 * g.Modes * g.Grid.N }

// SpectralRadius bounds the frequencies of the system away from the stiff end
// (speeds are at most 1): the largest symbol of the second difference.
func (g *CoupledGeometry) SpectralRadius() float64 {
	s, sign := g.b2[0], -1.0
	for k := 1; k < len(g.b2); k++ {
		s += 2 * sign * g.b2[k]
		sign = -sign
	}
	return math.Sqrt(-s)
}

// NewCoupled returns the system; forcing (already multiplied by the inverse mass
// matrix, 2n numbers a point) may be nil.
func NewCoupled(geo *CoupledGeometry, forcing Forcing) *Coupled {
	return &Coupled{geo: geo, forcing: forcing, d: make([]float64, geo.Stride()), e: make([]float64, geo.Stride())}
}

// Geometry returns the shared tables.
func (c *Coupled) Geometry() *CoupledGeometry { return c.geo }

// Apply implements march.Linear.
func (c *Coupled) Apply(dst, u []float64) {
	g := c.geo
	n := g.Modes
	st := 2 * n
	half := st * g.Grid.N
	if len(dst) != 2*half || len(u) != 2*half {
		panic(fmt.Sprintf("semi: states of length %d and %d, want %d", len(dst), len(u), 2*half))
	}
	copy(dst[:half], u[half:])
	phi, pi, out := u[:half], u[half:], dst[half:]
	d, e := c.d, c.e
	h := g.first.Half
	a, s := g.Equation.Spin, float64(g.Equation.S)
	ks := 2 * a * s
	for i := range g.Grid.N {
		o := out[i*st : (i+1)*st]
		if i < h || i >= g.Grid.N-h {
			c.endRow(i, d, o, e, phi, pi)
		} else if h == 6 {
			centred12(d, o, phi[(i-6)*st:(i+7)*st], g.b1, g.b2)
			if !g.flat[i] {
				first12(e, pi[(i-6)*st:(i+7)*st], g.b1)
			}
		} else {
			centred(d, o, phi[(i-h)*st:(i+h+1)*st], g.b1, g.b2)
			if !g.flat[i] {
				firstAny(e, pi[(i-h)*st:(i+h+1)*st], g.b1)
			}
		}
		if g.flat[i] {
			clear(e)
		}
		p := &g.at[i]
		m := g.mass[3*n*i : 3*n*(i+1)]
		point(p, g.lam, g.Coupling.Cos0, g.Coupling.Cos1, ks, o, d, e, phi[i*st:(i+1)*st], pi[i*st:(i+1)*st])
		solve(m[:n], m[n:2*n], m[2*n:], o[:n], o[n:])
	}
}

// point turns the differences of one point into the right-hand side before the
// mass matrix: on entry o holds D2 Phi, d D Phi and e D Pi.
func point(p *coupledPoint, lam, cos0, cos1 []float64, ks float64, o, d, e, f, pi []float64) {
	n := len(lam)
	or, oi := o[:n], o[n:2*n]
	dr, di := d[:n], d[n:2*n]
	er, ei := e[:n], e[n:2*n]
	fr, fi := f[:n], f[n:2*n]
	pr, pj := pi[:n], pi[n:2*n]
	cos0, cos1 = cos0[:n], cos1[:n]
	xx, xt, xr, xi, tr, ti, vr, vi := p.xx, p.xt, p.xr, p.xi, p.tr, p.ti, p.vr, p.vi
	below, lowR, lowI := 0.0, 0.0, 0.0
	for k := 0; k < n; k++ {
		a, b := pr[k], pj[k]
		cr, ci := cos0[k]*a+below*lowR, cos0[k]*b+below*lowI
		up := cos1[k]
		if k+1 < n {
			cr += up * pr[k+1]
			ci += up * pj[k+1]
		}
		below, lowR, lowI = up, a, b
		v := vr + lam[k]
		or[k] = -(xx*or[k] + xr*dr[k] - xi*di[k] + xt*er[k] + tr*a - ti*b - ks*ci + v*fr[k] - vi*fi[k])
		oi[k] = -(xx*oi[k] + xr*di[k] + xi*dr[k] + xt*ei[k] + tr*b + ti*a + ks*cr + v*fi[k] + vi*fr[k])
	}
}

// endRow is a row near an end of the grid: d = D Phi, o = D2 Phi, e = D Pi.
func (c *Coupled) endRow(i int, d, o, e, phi, pi []float64) {
	g := c.geo
	st := len(d)
	clear(d)
	clear(o)
	clear(e)
	k := i
	if i >= len(g.ends)/2 {
		k = i - g.Grid.N + len(g.ends)
	}
	f1, w1, f2, w2 := g.ends[k].f1, g.ends[k].w1, g.ends[k].f2, g.ends[k].w2
	for j, w := range w1 {
		at := (f1 + j) * st
		for l := range d {
			d[l] += w * phi[at+l]
			e[l] += w * pi[at+l]
		}
	}
	for j, w := range w2 {
		at := (f2 + j) * st
		for l := range o {
			o[l] += w * phi[at+l]
		}
	}
}

// centred writes first and second difference of the middle of the window u.
func centred(d, o, u, b1, b2 []float64) {
	st, h := len(d), len(b1)-1
	mid := h * st
	for l := range d {
		x, y := 0.0, b2[0]*u[mid+l]
		for k := 1; k <= h; k++ {
			p, m := u[mid+k*st+l], u[mid-k*st+l]
			x += b1[k] * (p - m)
			y += b2[k] * (p + m)
		}
		d[l], o[l] = x, y
	}
}

// firstAny writes the first difference alone.
func firstAny(d, u, b1 []float64) {
	st, h := len(d), len(b1)-1
	mid := h * st
	for l := range d {
		x := 0.0
		for k := 1; k <= h; k++ {
			x += b1[k] * (u[mid+k*st+l] - u[mid-k*st+l])
		}
		d[l] = x
	}
}

// centred12 is centred for order 12, on differences from the middle value: they
// are all but exact, so that a smooth field loses far fewer digits in d2u.
func centred12(d, o, u, b1, b2 []float64) {
	st := len(d)
	o = o[:st]
	a1, a2, a3, a4, a5, a6 := b1[1], b1[2], b1[3], b1[4], b1[5], b1[6]
	c1, c2, c3, c4, c5, c6 := b2[1], b2[2], b2[3], b2[4], b2[5], b2[6]
	m6, m5, m4, m3, m2, m1 := u[:st], u[st:][:st], u[2*st:][:st], u[3*st:][:st], u[4*st:][:st], u[5*st:][:st]
	z := u[6*st:][:st]
	p1, p2, p3, p4, p5, p6 := u[7*st:][:st], u[8*st:][:st], u[9*st:][:st], u[10*st:][:st], u[11*st:][:st], u[12*st:][:st]
	for l := range d {
		c := z[l]
		q1, r1 := p1[l]-c, c-m1[l]
		q2, r2 := p2[l]-c, c-m2[l]
		q3, r3 := p3[l]-c, c-m3[l]
		q4, r4 := p4[l]-c, c-m4[l]
		q5, r5 := p5[l]-c, c-m5[l]
		q6, r6 := p6[l]-c, c-m6[l]
		d[l] = a1*(q1+r1) + a2*(q2+r2) + a3*(q3+r3) + a4*(q4+r4) + a5*(q5+r5) + a6*(q6+r6)
		o[l] = c1*(q1-r1) + c2*(q2-r2) + c3*(q3-r3) + c4*(q4-r4) + c5*(q5-r5) + c6*(q6-r6)
	}
}

// first12 is firstAny for order 12.
func first12(d, u, b1 []float64) {
	st := len(d)
	a1, a2, a3, a4, a5, a6 := b1[1], b1[2], b1[3], b1[4], b1[5], b1[6]
	m6, m5, m4, m3, m2, m1 := u[:st], u[st:][:st], u[2*st:][:st], u[3*st:][:st], u[4*st:][:st], u[5*st:][:st]
	p1, p2, p3, p4, p5, p6 := u[7*st:][:st], u[8*st:][:st], u[9*st:][:st], u[10*st:][:st], u[11*st:][:st], u[12*st:][:st]
	for l := range d {
		d[l] = a1*(p1[l]-m1[l]) + a2*(p2[l]-m2[l]) + a3*(p3[l]-m3[l]) + a4*(p4[l]-m4[l]) + a5*(p5[l]-m5[l]) + a6*(p6[l]-m6[l])
	}
}

// RHS implements march.System.
func (c *Coupled) RHS(dst, u []float64, t float64) {
	c.Apply(dst, u)
	if c.forcing != nil {
		c.forcing.Add(dst[len(dst)/2:], t)
	}
}

// Prepare implements march.Linear.
func (c *Coupled) Prepare(t, dt float64) {
	if c.forcing != nil {
		c.forcing.Prepare(t, dt)
	}
}

// AddForce implements march.Linear.
func (c *Coupled) AddForce(dst []float64, j int, scale float64) {
	if c.forcing != nil {
		c.forcing.AddDerivative(dst[len(dst)/2:], j, scale)
	}
}
