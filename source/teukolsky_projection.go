package source

import (
	"math"
	"math/cmplx"

	"nullmark/hyperboloidal"
	"nullmark/source/worldline"
)

// The derivatives d_tau^j d_x^k of the projected source in the order in which
// Projection stores them.
var projectionOrder = [6][2]int{{0, 0}, {0, 1}, {0, 2}, {1, 0}, {1, 1}, {2, 0}}

// Projection is the source of a point particle in the Teukolsky equation as
// seen by every (l,m) at once: with {jk} in the order 00, 01, 02, 10, 11, 20,
//
//	S_lm = SUM_jk d_tau^j d_x^k [ c_jk delta(x - x_p) ],
//	c_jk = e^{-i m phi~_p} SUM_i Weight[jk][i] H_i,
//
// H_0 = sYlm, H_1 and H_2 the harmonics of the next spin weights towards 0 with
// their factors (see HarmonicLadder), all at the particle's polar angle. For
// s = +2 the weights depend on m.
type Projection struct {
	Weight [6][3]complex128
}

// graded is a sum of harmonics of neighbouring spin weights whose coefficients
// are jets in (x, z = cos theta) times powers of sin theta: a term of index i
// carries sin^(n-i), where n counts the angular operators applied so far. The
// operators of the source keep this form, and nothing is divided by sin theta.
type graded [3]jet

func (g graded) times(f jet) graded {
	return graded{g[0].times(f), g[1].times(f), g[2].times(f)}
}

func (g graded) plus(h graded) graded {
	return graded{g[0].plus(h[0]), g[1].plus(h[1]), g[2].plus(h[2])}
}

func (g graded) dx() graded { return graded{g[0].dx(), g[1].dx(), g[2].dx()} }

// turn applies the angular operator d_theta -+ m/sin + n cot that moves the
// spin weight one step towards 0: -sin d_z on the coefficient, and the harmonic
// of one term becomes that of the next.
func (g graded) turn() graded {
	return graded{
		g[0].dt().scaled(-1),
		g[1].dt().scaled(-1).plus(g[0]),
		g[2].dt().scaled(-1).plus(g[1]),
	}
}

// tableau is a differential operator in tau and x acting on the delta
// function, SUM_jk d_tau^j d_x^k [ t[j][k] ... ].
type tableau [3][3]graded

func (t tableau) times(f jet) tableau {
	for j := range t {
		for k := range t[j] {
			t[j][k] = t[j][k].times(f)
		}
	}
	return t
}

// angular moves the operator d_theta + .. -+ i a sin d_tau + n cot from the
// right factor to the weight on its left; shift is the coefficient of
// sin d_tau in the operator.
func (t tableau) angular(shift complex128) tableau {
	var out tableau
	for j := range t {
		for k := range t[j] {
			if j+k > 1 && t[j][k] == (graded{}) {
				continue
			}
			u := t[j][k].turn()
			out[j][k] = out[j][k].plus(u.times(constant(-1)))
			if j < 2 {
				out[j+1][k] = out[j+1][k].plus(t[j][k].times(constant(shift)))
			}
		}
	}
	return out
}

// radial does the same for f d_x + g d_tau + h.
func (t tableau) radial(f, g, h jet) tableau {
	var out tableau
	for j := range t {
		for k := range t[j] {
			w := t[j][k]
			if j+k > 1 && w == (graded{}) {
				continue
			}
			wf := w.times(f)
			out[j][k] = out[j][k].plus(wf.dx().times(constant(-1))).plus(w.times(h))
			if k < 2 {
				out[j][k+1] = out[j][k+1].plus(wf)
			}
			if j < 2 {
				out[j+1][k] = out[j+1][k].plus(w.times(g))
			}
		}
	}
	return out
}

// accumulate adds z times the tableau, evaluated at the particle, to p; grade
// is the number of angular operators in it.
func (p *Projection) accumulate(t tableau, z complex128, sin float64, grade int) {
	for n, jk := range projectionOrder {
		for i := 0; i <= grade; i++ {
			p.Weight[n][i] += z * complex(math.Pow(sin, float64(grade-i)), 0) * t[jk[0]][jk[1]][i].v
		}
	}
}

// geometryJets are the functions of (x, z) that the source is made of.
type geometryJets struct {
	x, q, qb, q4, p, weight, b jet
}

func newGeometryJets(a float64, k worldline.KerrState, at hyperboloidal.KerrPoint) geometryJets {
	x := jet{v: complex(at.X, 0), x: 1}
	r := x.inverse()
	q := r
	q.v -= complex(0, a*k.Cos)
	q.t = complex(0, -a)
	qb := r
	qb.v += complex(0, a*k.Cos)
	qb.t = complex(0, a)
	q2 := q.times(q)
	q4 := q2.times(q2)
	qbi := qb.inverse()
	return geometryJets{
		x: x, q: q, qb: qb, q4: q4,
		p:      q4.times(qbi).times(qbi),
		weight: r.times(q2.times(q).inverse()),
		b:      jet{v: complex(at.B, 0), x: complex(at.Bx, 0), xx: complex(at.Bxx, 0)},
	}
}

// ProjectMinus2 returns the projection of the s = -2 source of a particle on a
// hole of spin a, at is the slicing at the particle. The source is
// (Kinnersley tetrad; S. A. Teukolsky, ApJ 185, 635 (1973), eq. 2.15, sign such
// that psi4 = +(1/2) d^2(h+ - i hx)/dt^2)
//
//	S = pi r q^-3 { L_-1[q^4 L_0(N^2 D/qb)] - L_-1[p J(qb N Th D)]
//	              - J[p L_-1(qb N Th D)] + J[q^4 J(Th^2 D/qb)] },
//	J = -x^2 d_x - B d_tau,  L_n = d_theta + m/sin - i a sin d_tau + n cot,
//	q = r - i a cos,  p = q^4/qb^2,  D = delta^3/(Sigma sin u^tau),
//	Th = Sigma theta' + i sin (a E - L/sin^2).
func ProjectMinus2(a float64, k worldline.KerrState, at hyperboloidal.KerrPoint) Projection {
	g := newGeometryJets(a, k, at)
	shift := complex(0, -a)
	jf := g.x.times(g.x).scaled(-1)
	jg := g.b.scaled(-1)

	var start tableau
	start[0][0][0] = g.weight.scaled(complex(math.Pi, 0))

	n := complex(k.Ingoing(a), 0)
	th := complex(k.Wtheta, k.Twist(a))
	qb := g.qb.v
	pre := complex(at.X*at.X/k.SigmaTau(a, at.B), 0)
	z1 := pre * n * n / qb
	z2 := pre * n * th * qb
	z4 := pre * th * th / qb

	var out Projection
	one := start.angular(shift)
	out.accumulate(one.times(g.q4).angular(shift), z1, k.Sin, 2)
	out.accumulate(one.times(g.p).radial(jf, jg, jet{}), -z2, k.Sin, 1)
	two := start.radial(jf, jg, jet{})
	out.accumulate(two.times(g.p).angular(shift), -z2, k.Sin, 1)
	out.accumulate(two.times(g.q4).radial(jf, jg, jet{}), z4, k.Sin, 0)
	return out
}

// ProjectPlus2 is ProjectMinus2 for s = +2 (psi0), at azimuthal number m:
//
//	S = -4 pi r q^-3 { Ld_-1[q^4 Ld_0(W^2 D/qb)] + Ld_-1[p (cD-Delta')(qb W Thb D)]
//	     + (cD-Delta')[p Ld_-1(qb W Thb D)] + (cD-Delta')[q^4 cD(Thb^2 D/qb)] },
//	W = P - Sigma r',  Thb = conj(Th),  Ld_n = d_theta - m/sin + i a sin d_tau + n cot,
//	cD = -d d_x + C d_tau + 2 i m a,  Delta' = 2 r - 2.
func ProjectPlus2(a float64, m int, k worldline.KerrState, at hyperboloidal.KerrPoint) Projection {
	g := newGeometryJets(a, k, at)
	shift := complex(0, a)
	r := g.x.inverse()
	x2 := g.x.times(g.x)
	d := constant(1).minus(g.x.scaled(2)).plus(x2.scaled(complex(a*a, 0)))
	kay := r.times(r).plus(constant(complex(a*a, 0)))
	c := kay.scaled(2).minus(g.b.times(d.times(r).times(r)))
	ima := constant(complex(0, 2*float64(m)*a))
	prime := r.scaled(2).minus(constant(2))
	df := d.scaled(-1)

	var start tableau
	start[0][0][0] = g.weight.scaled(complex(-4*math.Pi, 0))

	w := complex(k.Outgoing(a), 0)
	th := complex(k.Wtheta, -k.Twist(a))
	qb := g.qb.v
	pre := complex(at.X*at.X/k.SigmaTau(a, at.B), 0)
	z1 := pre * w * w / qb
	z2 := pre * w * th * qb
	z4 := pre * th * th / qb

	var out Projection
	one := start.angular(shift)
	out.accumulate(one.times(g.q4).angular(shift), z1, k.Sin, 2)
	out.accumulate(one.times(g.p).radial(df, c, ima.minus(prime)), z2, k.Sin, 1)
	two := start.radial(df, c, ima.minus(prime))
	out.accumulate(two.times(g.p).angular(shift), z2, k.Sin, 1)
	out.accumulate(two.times(g.q4).radial(df, c, ima), z4, k.Sin, 0)
	return out
}

// HarmonicLadder fills h[i], i = 0, 1, 2, with the harmonics that the weights
// of a Projection multiply, for l = lmin .. lmin+len(h[0])-1:
//
//	s = -2:  -2Y,  -sqrt((l+2)(l-1)) -1Y,  sqrt((l+2)(l+1)l(l-1)) 0Y
//	s = +2:   2Y,   sqrt((l+2)(l-1))  1Y,  sqrt((l+2)(l+1)l(l-1)) 0Y
//
// (the images of the first under d_theta -+ m/sin + 2 cot and then
// d_theta -+ m/sin + cot). It panics for any other s.
func HarmonicLadder(h [3][]float64, s, m, lmin int, theta float64) {
	if s != 2 && s != -2 {
		panic("source: harmonic ladder of a spin weight other than +-2")
	}
	sign := 1.0
	if s < 0 {
		sign = -1
	}
	SpinHarmonics(h[0], s, m, lmin, theta)
	SpinHarmonics(h[1], s/2, m, lmin, theta)
	SpinHarmonics(h[2], 0, m, lmin, theta)
	for i := range h[0] {
		l := float64(lmin + i)
		f := (l + 2) * (l - 1)
		h[1][i] *= sign * math.Sqrt(f)
		h[2][i] *= math.Sqrt(f * l * (l + 1))
	}
}

// Mode returns c_jk (order as in Projection) of one (l,m), given its entries of
// the harmonic ladder and the particle's phase e^{-i m phi~_p}.
func (p *Projection) Mode(h0, h1, h2 float64, phase complex128) [6]complex128 {
	var c [6]complex128
	for n := range c {
		w := &p.Weight[n]
		c[n] = phase * (w[0]*complex(h0, 0) + w[1]*complex(h1, 0) + w[2]*complex(h2, 0))
	}
	return c
}

// AzimuthPhase returns e^{-i m phi}.
func AzimuthPhase(m int, phi float64) complex128 { return cmplx.Exp(complex(0, -float64(m)*phi)) }
