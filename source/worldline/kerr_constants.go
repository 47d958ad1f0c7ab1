package worldline

import (
	"fmt"
	"math"

	"nullmark/hyperboloidal"
)

// KerrConstants are the conserved quantities of a geodesic per unit mass.
type KerrConstants struct{ E, L, Q float64 }

// KerrOrbitError says why a bound Kerr orbit does not exist.
type KerrOrbitError struct {
	Key    string  // "radius", "p", "e" or "inclination"
	Value  float64 // what was asked
	Limit  float64 // the bound that it violates
	Reason string
}

func (e *KerrOrbitError) Error() string {
	return fmt.Sprintf("%s %g: %s", e.Key, e.Value, e.Reason)
}

// BoundKerr returns the constants of the geodesic with turning points
// p/(1+e) and p/(1-e) (0 <= e < 1; e = 0 is a circular orbit, stable or not)
// and cosine c of the inclination, c = L/sqrt(L^2+Q), c < 0 retrograde. With
// G = sqrt(L^2+Q) the radial potential is the quadratic form
//
//	R(r) = f E^2 - 2 g E G - h G^2 - d,
//	f = r^4 + a^2 r (r+2),  g = 2 a c r,  h = r^2 - 2r + a^2 (1-c^2),  d = Delta r^2,
//
// and R = 0 at both turning points is solved in closed form (after W. Schmidt,
// CQG 19, 2743 (2002)); the second equation enters as the divided difference of
// the polynomials, so that e -> 0 loses no digits. A *KerrOrbitError is
// returned where no timelike orbit has these turning points.
func BoundKerr(h hyperboloidal.Kerr, p, e, c float64) (KerrConstants, error) {
	bad := func(key string, v, limit float64, why string) (KerrConstants, error) {
		return KerrConstants{}, &KerrOrbitError{Key: key, Value: v, Limit: limit, Reason: why}
	}
	switch {
	case !(e >= 0 && e < 1):
		return bad("e", e, 1, "the eccentricity of a bound orbit lies in [0, 1)")
	case !(c >= -1 && c <= 1):
		return bad("inclination", c, 1, "its cosine must lie in [-1, 1]")
	case !(p/(1+e) > h.OuterHorizon()):
		return bad("p", p, h.OuterHorizon()*(1+e), "the pericentre is not outside the horizon")
	}
	a := h.Spin()
	a2 := a * a
	r1, r2 := p/(1-e), p/(1+e)
	// Values at r2 and divided differences between r1 and r2.
	dd := func(n int) float64 { // of r^n: sum r1^i r2^(n-1-i)
		s := 0.0
		for i := range n {
			s += math.Pow(r1, float64(i)) * math.Pow(r2, float64(n-1-i))
		}
		return s
	}
	s2 := a2 * (1 - c) * (1 + c)
	f1, g1, h1, d1 := r2*(r2*r2*r2+a2*(r2+2)), 2*a*c*r2, r2*(r2-2)+s2, r2*r2*(r2*(r2-2)+a2)
	f2, g2, h2, d2 := dd(4)+a2*dd(2)+2*a2, 2*a*c, dd(2)-2, dd(4)-2*dd(3)+a2*dd(2)
	det := func(x1, y1, x2, y2 float64) float64 { return x1*y2 - x2*y1 }
	kap, eps := det(d1, h1, d2, h2), det(d1, g1, d2, g2)
	rho, eta, sig := det(f1, h1, f2, h2), det(f1, g1, f2, g2), det(g1, h1, g2, h2)
	root := sig * (sig*eps*eps + rho*eps*kap - eta*kap*kap)
	sign := 1.0
	if a*c < 0 {
		sign = -1
	}
	e2 := (kap*rho + 2*eps*sig - 2*sign*math.Sqrt(math.Max(root, 0))) / (rho*rho + 4*eta*sig)
	if !(root >= -1e-12*math.Abs(kap*rho*rho*kap)) || !(e2 > 0) || math.IsInf(e2, 0) {
		return bad("p", p, math.NaN(), "no timelike geodesic turns there")
	}
	en := math.Sqrt(e2)
	disc := g1*g1*e2 + h1*(f1*e2-d1)
	if !(disc >= 0) {
		return bad("p", p, math.NaN(), "no timelike geodesic turns there")
	}
	// h G^2 + 2 g E G - (f E^2 - d) = 0, G >= 0, without cancellation.
	num := f1*e2 - d1
	b := g1 * en
	var g float64
	if b >= 0 {
		g = num / (b + math.Sqrt(disc))
	} else {
		g = (-b + math.Sqrt(disc)) / h1
	}
	if !(g > 0) {
		return bad("p", p, math.NaN(), "no timelike geodesic turns there")
	}
	return KerrConstants{E: en, L: g * c, Q: g * g * (1 - c) * (1 + c)}, nil
}

// radialRoots returns the two inner roots r3 >= r4 of the radial potential of
// a bound orbit with turning points r1 >= r2: their sum and product follow from
// the coefficients of r^3 and r^0. ok is false when they are complex.
func (k KerrConstants) radialRoots(a, r1, r2 float64) (r3, r4 float64, ok bool) {
	be := (1 - k.E) * (1 + k.E)
	sum := 2/be - r1 - r2
	prod := a * a * k.Q / (be * r1 * r2)
	disc := sum*sum/4 - prod
	if disc < 0 {
		return sum / 2, sum / 2, false
	}
	r3 = sum/2 + math.Copysign(math.Sqrt(disc), sum)
	if r3 == 0 {
		return 0, 0, true
	}
	r4 = prod / r3
	return math.Max(r3, r4), math.Min(r3, r4), true
}

// KerrSeparatrix returns the smallest p of a stable bound orbit with the given
// e and cosine of the inclination: below it the pericentre merges with the next
// root of the radial potential. At e = 0 it is the radius of the innermost
// stable circular orbit.
func KerrSeparatrix(h hyperboloidal.Kerr, e, c float64) float64 {
	gap := func(p float64) float64 {
		k, err := BoundKerr(h, p, e, c)
		if err != nil || k.E >= 1 {
			return -1
		}
		r3, _, ok := k.radialRoots(h.Spin(), p/(1-e), p/(1+e))
		if !ok {
			return 1 // no further root in the way
		}
		return p/(1+e) - r3
	}
	hi := 20.0
	for gap(hi) <= 0 {
		hi *= 2
	}
	lo := hi
	for lo > 0.5 && gap(lo) > 0 {
		hi = lo
		lo *= 0.98
	}
	for range 100 {
		mid := lo + (hi-lo)/2
		if mid == lo || mid == hi {
			break
		}
		if gap(mid) > 0 {
			hi = mid
		} else {
			lo = mid
		}
	}
	return hi
}

// KerrPhotonOrbit returns the radius of the circular photon orbit at cosine c of
// the inclination, below which no timelike circular orbit exists: the limit
// E -> infinity of R = R' = 0.
func KerrPhotonOrbit(h hyperboloidal.Kerr, c float64) float64 {
	a := h.Spin()
	slope := func(r float64) float64 {
		f, f1 := r*(r*r*r+a*a*(r+2)), 4*r*r*r+2*a*a*(r+1)
		g, g1 := 2*a*c*r, 2*a*c
		hh, h1 := r*(r-2)+a*a*(1-c)*(1+c), 2*r-2
		s := math.Sqrt(g*g + hh*f)
		b := f / (g + s) // G/E of the photon that turns at r
		return f1 - 2*g1*b - h1*b*b
	}
	lo, hi := h.OuterHorizon()*(1+1e-12), 4.0+1e-9
	for range 200 {
		mid := lo + (hi-lo)/2
		if mid == lo || mid == hi {
			break
		}
		if slope(mid) > 0 {
			hi = mid
		} else {
			lo = mid
		}
	}
	return hi
}

// CircularKerr returns the constants and the angular velocity
// Omega = 1/(r^{3/2} + a) of the circular equatorial orbit with L > 0 (J. M.
// Bardeen, W. H. Press, S. A. Teukolsky, ApJ 178, 347 (1972), eqs 2.12–2.16), or
// a *KerrOrbitError at or inside the light ring.
func CircularKerr(h hyperboloidal.Kerr, r float64) (KerrConstants, float64, error) {
	if lr := h.LightRing(); !(r > lr) {
		return KerrConstants{}, 0, &KerrOrbitError{Key: "radius", Value: r, Limit: lr,
			Reason: fmt.Sprintf("no timelike circular orbit at or inside the light ring, r = %.6g at spin %g", lr, h.Spin())}
	}
	a := h.Spin()
	s := math.Sqrt(r)
	n := s * math.Sqrt(s*s*s*s-3*s*s+2*a*s)
	return KerrConstants{
		E: (s*s*s - 2*s + a) / n,
		L: (s*s*s*s - 2*a*s + a*a) / n,
	}, 1 / (s*s*s + a), nil
}
