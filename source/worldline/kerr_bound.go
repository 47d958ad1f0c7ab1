package worldline

import (
	"fmt"
	"math"

	"nullmark/hyperboloidal"
)

// KerrBound is a bound geodesic of a Kerr hole: circular, eccentric, inclined or
// generic. In Mino time lambda, dlambda = d(proper time)/Sigma, the motion in r
// and theta separates; with r = p/(1+e cos psi) and cos theta = z cos chi,
//
//	dlambda/dpsi = (r/p) sqrt[(1-e^2)/((1-E^2)(r-r3)(r-r4))],
//	dlambda/dchi = [a^2(1-E^2)(z+^2 - z^2 cos^2 chi)]^{-1/2},
//	dt/dlambda   = K P/Delta + a L - a^2 E sin^2 theta,
//	dphi/dlambda = a P/Delta - a E + L/sin^2 theta
//
// (Y. Mino, PRD 67, 084027 (2003)). lambda, t and phi are therefore a constant
// rate plus a Fourier series in psi and one in chi, known to round-off: there is
// no integration and no drift.
type KerrBound struct {
	KerrConstants
	P, Ecc, CosInclination       float64
	OmegaR, OmegaTheta, OmegaPhi float64 // per coordinate time; OmegaR of the epicycle when e = 0

	hole     hyperboloidal.Kerr
	zmax     float64 // z
	bz       float64 // a^2 (1-E^2) z+^2
	r3, r4   float64
	rad, pol kerrSeries
	psi0     float64
	chi0     float64
	phi0     float64
	t0       float64 // t_r(psi0) + t_theta(chi0)
	l0       float64 // lambda_r(psi0) - lambda_theta(chi0)
	az0      float64
}

// kerrSeries holds lambda, t and phi against one angle x: rate x + sum_k
// coefficient[k] sin(k x).
type kerrSeries struct {
	lambda, t, phi fourierRamp
}

// fourierRamp is the integral of an even periodic function.
type fourierRamp struct {
	rate float64
	sin  []float64 // sin[k-1] multiplies sin(k x)
}

// at returns value and derivative.
func (f fourierRamp) at(x float64) (v, d float64) {
	v, d = f.rate*x, f.rate
	if len(f.sin) == 0 {
		return
	}
	s1, c1 := math.Sincos(x)
	// Clenshaw for sum b_k sin(kx) and sum k b_k cos(kx).
	var u1, u2, w1, w2 float64
	for k := len(f.sin); k >= 1; k-- {
		b := f.sin[k-1]
		u1, u2 = b+2*c1*u1-u2, u1
		w1, w2 = float64(k)*b+2*c1*w1-w2, w1
	}
	return v + u1*s1, d + w1*c1 - w2
}

// newFourierRamp samples the even function fn of period 2 pi until its Fourier
// coefficients have fallen to round-off.
func newFourierRamp(fn func(x float64) float64) fourierRamp {
	for n := 32; ; n *= 2 {
		v := make([]float64, n/2+1)
		for j := range v {
			v[j] = fn(2 * math.Pi * float64(j) / float64(n))
		}
		coef := func(k int) float64 {
			s := 0.0
			for j := range v {
				w := 2.0
				if j == 0 || j == n/2 {
					w = 1
				}
				s += w * v[j] * math.Cos(2*math.Pi*float64((j*k)%n)/float64(n))
			}
			return s / float64(n)
		}
		f := fourierRamp{rate: coef(0)}
		c := make([]float64, n/2-1)
		tail, size := 0.0, math.Abs(f.rate)
		for k := range c {
			c[k] = 2 * coef(k+1)
			size = math.Max(size, math.Abs(c[k]))
			if k > 3*n/8 {
				tail = math.Max(tail, math.Abs(c[k]))
			}
		}
		if tail < 4e-16*size || n >= 4096 {
			keep := len(c)
			for keep > 0 && math.Abs(c[keep-1]) < 1e-17*size*float64(keep) {
				keep--
			}
			for k := range keep {
				f.sin = append(f.sin, c[k]/float64(k+1))
			}
			return f
		}
	}
}

// NewKerrBound returns the bound geodesic with turning points p/(1+-e) and
// cosine c of the inclination, at t = 0 at radial phase psi0, polar phase chi0
// and Boyer–Lindquist azimuth phi0. It returns a *KerrOrbitError where there is
// none or where the eccentric one is not stable (p at or below the separatrix);
// circular orbits between the photon orbit and the ISCO are allowed.
func NewKerrBound(h hyperboloidal.Kerr, p, e, c, psi0, chi0, phi0 float64) (*KerrBound, error) {
	k, err := BoundKerr(h, p, e, c)
	if err != nil {
		return nil, err
	}
	a := h.Spin()
	be := (1 - k.E) * (1 + k.E)
	o := &KerrBound{KerrConstants: k, P: p, Ecc: e, CosInclination: c, hole: h, psi0: psi0, chi0: chi0, phi0: phi0}
	if e > 0 {
		var ok bool
		o.r3, o.r4, ok = k.radialRoots(a, p/(1-e), p/(1+e))
		if k.E >= 1 || ok && o.r3 >= p/(1+e) {
			s := KerrSeparatrix(h, e, c)
			return nil, &KerrOrbitError{Key: "p", Value: p, Limit: s,
				Reason: fmt.Sprintf("no stable bound orbit at or below the separatrix p = %.6g of eccentricity %g; a plunge starts there", s, e)}
		}
	}
	s := k.Q + k.L*k.L + a*a*be
	root := math.Sqrt(math.Max(s*s-4*a*a*be*k.Q, 0))
	o.bz = (s + root) / 2
	o.zmax = math.Sqrt(k.Q / o.bz)
	dl := func(psi float64) float64 {
		if e == 0 {
			return 1 // circular: psi is Mino time
		}
		r := p / (1 + e*math.Cos(psi))
		// (r-r3)(r-r4) from sum and product, real also when the roots are not
		sum, prod := 2/be-p/(1-e)-p/(1+e), a*a*k.Q*(1-e)*(1+e)/(be*p*p)
		return r / p * math.Sqrt((1-e)*(1+e)/(be*(r*r-sum*r+prod)))
	}
	radius := func(psi float64) float64 { return p / (1 + e*math.Cos(psi)) }
	dc := func(chi float64) float64 {
		z := o.zmax * math.Cos(chi)
		return 1 / math.Sqrt(o.bz-a*a*be*z*z)
	}
	o.rad = kerrSeries{
		lambda: newFourierRamp(dl),
		t: newFourierRamp(func(x float64) float64 {
			r := radius(x)
			kay := r*r + a*a
			return dl(x) * (kay*(k.E*kay-a*k.L)/(r*r-2*r+a*a) + a*k.L - a*a*k.E)
		}),
		phi: newFourierRamp(func(x float64) float64 {
			r := radius(x)
			return dl(x) * (a*(k.E*(r*r+a*a)-a*k.L)/(r*r-2*r+a*a) - a*k.E)
		}),
	}
	o.pol = kerrSeries{
		lambda: newFourierRamp(dc),
		t: newFourierRamp(func(x float64) float64 {
			z := o.zmax * math.Cos(x)
			return dc(x) * a * a * k.E * z * z
		}),
		phi: newFourierRamp(func(x float64) float64 {
			z := o.zmax * math.Cos(x)
			if k.L == 0 {
				return 0
			}
			return dc(x) * k.L / ((1 - z) * (1 + z))
		}),
	}
	upR, upTh := 1/o.rad.lambda.rate, 1/o.pol.lambda.rate
	gamma := o.rad.t.rate*upR + o.pol.t.rate*upTh
	o.OmegaTheta = upTh / gamma
	o.OmegaPhi = (o.rad.phi.rate*upR + o.pol.phi.rate*upTh) / gamma
	if e > 0 {
		o.OmegaR = upR / gamma
	}
	tr, _ := o.rad.t.at(psi0)
	tt, _ := o.pol.t.at(chi0)
	lr, _ := o.rad.lambda.at(psi0)
	lt, _ := o.pol.lambda.at(chi0)
	fr, _ := o.rad.phi.at(psi0)
	ft, _ := o.pol.phi.at(chi0)
	o.t0, o.l0, o.az0 = tr+tt, lr-lt, fr+ft
	return o, nil
}

// Range returns the smallest and the largest radius.
func (o *KerrBound) Range() (rmin, rmax float64) { return o.P / (1 + o.Ecc), o.P / (1 - o.Ecc) }

// At returns the state at Boyer–Lindquist time t. Rho is set to the tortoise
// coordinate: the state is meant for the flat part of a slicing. Azimuth is the
// Boyer–Lindquist one.
func (o *KerrBound) At(t float64) (s KerrState, azimuth float64) {
	// Newton in (psi, chi) for lambda_r(psi) - lambda_theta(chi) = l0 and
	// t_r(psi) + t_theta(chi) = t + t0, from the mean motion.
	lr, lt := &o.rad.lambda, &o.pol.lambda
	upR, upTh := 1/lr.rate, 1/lt.rate
	gamma := o.rad.t.rate*upR + o.pol.t.rate*upTh
	lam := t / gamma
	psi, chi := o.psi0+lam*upR, o.chi0+lam*upTh
	for it := range 50 {
		l1, d1 := lr.at(psi)
		l2, d2 := lt.at(chi)
		t1, e1 := o.rad.t.at(psi)
		t2, e2 := o.pol.t.at(chi)
		fl := l1 - l2 - o.l0
		ft := t1 + t2 - o.t0 - t
		// d1 dpsi - d2 dchi = -fl, e1 dpsi + e2 dchi = -ft
		det := d1*e2 + d2*e1
		dpsi := (-fl*e2 - ft*d2) / det
		dchi := (-ft*d1 + fl*e1) / det
		const most = 0.5
		if m := math.Max(math.Abs(dpsi), math.Abs(dchi)); m > most && it < 40 {
			dpsi, dchi = dpsi*most/m, dchi*most/m
		}
		psi += dpsi
		chi += dchi
		if math.Abs(dpsi) < 1e-15*(1+math.Abs(psi)) && math.Abs(dchi) < 1e-15*(1+math.Abs(chi)) {
			break
		}
	}
	sp, cp := math.Sincos(psi)
	sc, cc := math.Sincos(chi)
	r := o.P / (1 + o.Ecc*cp)
	f1, _ := o.rad.phi.at(psi)
	f2, _ := o.pol.phi.at(chi)
	azimuth = o.phi0 + f1 + f2 - o.az0
	y := r - o.hole.OuterHorizon()
	_, d1 := lr.at(psi)
	_, d2 := lt.at(chi)
	s = KerrState{R: r, Cos: o.zmax * cc, E: o.E, L: o.L, Q: o.Q}
	s.Sin = math.Sqrt((1 - s.Cos) * (1 + s.Cos))
	s.Wr = r * r / o.P * o.Ecc * sp / d1
	// dz/dlambda = -z sin(chi) dchi/dlambda = -sin(theta) dtheta/dlambda
	s.Wtheta = o.zmax * sc / d2 / s.Sin
	s.Rho = o.hole.Tortoise(y)
	s.Phi = azimuth + o.hole.Azimuth(y)
	return s, azimuth
}
