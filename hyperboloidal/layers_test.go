package hyperboloidal_test

import (
	"fmt"
	"math"
	"math/big"
	"testing"

	"nullmark/hyperboloidal"
)

// slicings are the layers that the tests run over: every profile, layers thin
// and thick, Alpha zero and not.
func slicings() []hyperboloidal.Layers {
	var all []hyperboloidal.Layers
	for _, p := range profiles() {
		all = append(all, hyperboloidal.Layers{Si: -20, Ri: 0, Ro: 26, So: 56, Profile: p})
	}
	return append(all,
		hyperboloidal.Layers{Si: -15, Ri: -2, Ro: 12, So: 31, Profile: hyperboloidal.Flat(2)},
		hyperboloidal.Layers{Si: -20, Ri: 0, Ro: 80, So: 240, Profile: hyperboloidal.Flat(2)},
		hyperboloidal.Layers{Si: -30, Ri: -3, Ro: 20, So: 50, Profile: hyperboloidal.Flat(2), Alpha: 0.1 * hyperboloidal.InverseTortoise(-30)},
		hyperboloidal.Layers{Si: -12, Ri: 1, Ro: 20, So: 50, Profile: hyperboloidal.Power(6), Alpha: greatest(-12)},
	)
}

// greatest is the largest Alpha allowed for an inner end: dr_t/d rho there.
func greatest(si float64) float64 {
	y := hyperboloidal.InverseTortoise(si)
	return y / (2 + y)
}

func named(s hyperboloidal.Layers) string {
	return fmt.Sprintf("[%g %g %g %g] %s alpha %g", s.Si, s.Ri, s.Ro, s.So, s.Profile, s.Alpha)
}

// exact is a slicing in 77 digits, from its definition: r(rho) and nothing else.
// Derivatives are central differences; x = 1/r in the outer and y = r-2 in the
// inner layer continue smoothly through the ends, so the ends need no limit.
type exact struct{ s hyperboloidal.Layers }

func (e exact) line(rho *big.Float) *big.Float { // r_t - 2
	return height(rho, hyperboloidal.InverseTortoise(float(rho)))
}

// inverse is 1/r in the outer layer.
func (e exact) inverse(rho *big.Float) *big.Float {
	x := quo(sub(rho, real256(e.s.Ro)), real256(e.s.So-e.s.Ro))
	return quo(omega(e.s.Profile, x), add(real256(2), e.line(rho)))
}

// height is r-2 in the inner layer.
func (e exact) height(rho *big.Float) *big.Float {
	x := quo(sub(real256(e.s.Ri), rho), real256(e.s.Ri-e.s.Si))
	o := omega(e.s.Profile, x)
	rest := mul(mul(sub(real256(1), o), real256(e.s.Alpha)), sub(rho, real256(e.s.Si)))
	return add(mul(o, e.line(rho)), rest)
}

func difference(f func(*big.Float) *big.Float, x, h *big.Float) *big.Float {
	return quo(sub(f(add(x, h)), f(sub(x, h))), mul(real256(2), h))
}

// fine and coarse are the steps of first and nested differences: errors of
// 1e-36 and 1e-24.
func fine() *big.Float   { return real256(0x1p-60) }
func coarse() *big.Float { return real256(0x1p-40) }

// boost is L = f/(dr/drho).
func (e exact) boost(rho *big.Float) *big.Float {
	two := real256(2)
	if float(rho) > (e.s.Ri+e.s.Ro)/2 { // -(1-2x) x^2/x'
		x := e.inverse(rho)
		l := quo(mul(sub(real256(1), mul(two, x)), mul(x, x)), difference(e.inverse, rho, fine()))
		return l.Neg(l)
	}
	y := e.height(rho)
	return quo(y, mul(add(two, y), difference(e.height, rho, fine())))
}

func (e exact) boostPrime(rho *big.Float) *big.Float { return difference(e.boost, rho, coarse()) }

// stretch is (dr/drho)/r^2.
func (e exact) stretch(rho *big.Float) *big.Float {
	if float(rho) > (e.s.Ri+e.s.Ro)/2 {
		d := difference(e.inverse, rho, fine())
		return d.Neg(d)
	}
	r := add(real256(2), e.height(rho))
	return quo(difference(e.height, rho, fine()), mul(r, r))
}

// places are points of both layers, their ends included.
func places(s hyperboloidal.Layers) []float64 {
	var out []float64
	for _, x := range []float64{0.02, 0.2, 0.45, 0.7, 0.9, 0.99, 1} {
		out = append(out, s.Ri-x*(s.Ri-s.Si), s.Ro+x*(s.So-s.Ro))
	}
	// The ends to the bit.
	out[len(out)-2], out[len(out)-1] = s.Si, s.So
	return out
}

// TestCoefficients compares L, L', H, H', (dr/drho)/r^2, 1/r and r-2 with 77
// digits, both end points included.
func TestCoefficients(t *testing.T) {
	for _, s := range slicings() {
		e := exact{s}
		for _, rho := range places(s) {
			p := s.At(rho)
			x := real256(rho)
			check := func(name string, got float64, want *big.Float, scale float64) {
				t.Helper()
				w := float(want)
				// Measured: 5e-15 of the scale at worst (L', far out).
				if !(math.Abs(got-w) <= 1e-14*(math.Abs(w)+scale)) {
					t.Errorf("%s: %s at %g is %.17g, want %.17g", named(s), name, rho, got, w)
				}
			}
			boost, prime := e.boost(x), e.boostPrime(x)
			check("L", p.Boost, boost, 1e-2)
			check("L'", p.BoostPrime, prime, 1e-1)
			check("(dr/drho)/r^2", p.Stretch, e.stretch(x), 1e-4)
			one := real256(1)
			if rho > s.Ro {
				check("H", p.Height, sub(one, boost), 1)
				check("H'", p.HeightPrime, sub(real256(0), prime), 1e-1)
				check("1/r", p.X, e.inverse(x), 1e-2)
			} else {
				check("H", p.Height, sub(boost, one), 1)
				check("H'", p.HeightPrime, prime, 1e-1)
				check("r-2", p.Y, e.height(x), 0.2)
			}
		}
	}
}

// TestEnds: the ends are the horizon and null infinity, and every coefficient
// of the equations is finite there.
func TestEnds(t *testing.T) {
	for _, s := range slicings() {
		si, so := s.At(s.Si), s.At(s.So)
		if si.Y != 0 || si.R != 2 || si.X != 0.5 || si.Boost != 0 || si.Height != -1 {
			t.Errorf("%s: Si is no horizon: %+v", named(s), si)
		}
		if so.X != 0 || !math.IsInf(so.R, 1) || !math.IsInf(so.Y, 1) || so.Boost != 0 || so.Height != 1 {
			t.Errorf("%s: So is not null infinity: %+v", named(s), so)
		}
		if !math.IsInf(si.H0, 1) || !math.IsInf(so.H0, 1) {
			t.Errorf("%s: h is %g and %g at the ends", named(s), si.H0, so.H0)
		}
		if !(si.Stretch > 0 && so.Stretch > 0) || math.IsInf(si.Stretch+so.Stretch, 1) {
			t.Errorf("%s: (dr/drho)/r^2 is %g and %g at the ends", named(s), si.Stretch, so.Stretch)
		}
		// Surface gravity 1/4 read backwards: y falls like e^{r_*/2} and, at the
		// horizon, L = y/(r y') gives L' = 1/2 whatever the layer.
		if math.Abs(si.BoostPrime-0.5) > 1e-14 {
			t.Errorf("%s: L' at the horizon is %.17g, want 1/2", named(s), si.BoostPrime)
		}
		// At null infinity L = f x^2/(-x') with a simple zero of x: L' = 0.
		if so.BoostPrime != 0 || so.HeightPrime != 0 {
			t.Errorf("%s: L' at null infinity is %g, want 0", named(s), so.BoostPrime)
		}
		h := 1e-4
		if l := s.At(s.So-h).Boost / (h * h); math.Abs(l*so.Stretch-s.At(s.So-h).X*s.At(s.So-h).X/(h*h)) > 1e-3*l*so.Stretch {
			t.Errorf("%s: L does not fall like x^2/(dr/drho/r^2) at null infinity", named(s))
		}
	}
}

// TestRaysKeepTheirLabels is the identity of the slicing: with t = tau + h,
// tau - rho = t - r_* in the outer and tau + rho = t + r_* in the inner layer,
// so that an outgoing (ingoing) ray has unit speed there and u (v) is read off
// the slice's label at the end.
func TestRaysKeepTheirLabels(t *testing.T) {
	const tau = 137.25
	for _, s := range slicings() {
		for k := 0; k < 400; k++ {
			rho := s.Si + (s.So-s.Si)*(float64(k)+0.5)/400
			p := s.At(rho)
			t0 := tau + p.H0
			rs := float(tortoise(real256(p.Y)))
			bound := 1e-15 * (math.Abs(tau) + math.Abs(rs) + math.Abs(t0))
			switch {
			case rho > s.Ro:
				if d := (t0 - rs) - (tau - rho); math.Abs(d) > bound {
					t.Errorf("%s: t - r_* differs from tau - rho by %g at %g", named(s), d, rho)
				}
			case rho < s.Ri:
				if d := (t0 + rs) - (tau + rho); math.Abs(d) > bound {
					t.Errorf("%s: t + r_* differs from tau + rho by %g at %g", named(s), d, rho)
				}
			default:
				if d := rs - rho; p.H0 != 0 || math.Abs(d) > 1e-14*(1+math.Abs(rho)) {
					t.Errorf("%s: between the layers h = %g, r_* - rho = %g at %g", named(s), p.H0, d, rho)
				}
			}
		}
		if u := s.Retarded(tau); u != tau-s.So {
			t.Errorf("u = %g", u)
		}
		if v := s.Advanced(tau); v != tau+s.Si {
			t.Errorf("v = %g", v)
		}
	}
}

// derivative is a central difference of order 6.
func derivative(f func(float64) float64, x, h float64) float64 {
	return (45*(f(x+h)-f(x-h)) - 9*(f(x+2*h)-f(x-2*h)) + f(x+3*h) - f(x-3*h)) / (60 * h)
}

// TestHeightIsTheSlopeOfH ties the fields of a Point to each other by
// differences alone: dh/drho L = H, dr_*/drho L = 1, and the speeds of light
// that follow, drho/dtau along dt = ±dr_*.
func TestHeightIsTheSlopeOfH(t *testing.T) {
	for _, s := range slicings() {
		for k := 0; k < 60; k++ {
			rho := s.Si + (s.So-s.Si)*(float64(k)+0.5)/60
			const h = 1e-2
			if end := math.Min(rho-s.Si, s.So-rho); end < 1.5 || math.Abs(rho-s.Ri) < 1.5 || math.Abs(rho-s.Ro) < 1.5 {
				continue // the difference would cross a joint or see the pole
			}
			p := s.At(rho)
			slopeH := derivative(func(x float64) float64 { return s.At(x).H0 }, rho, h)
			slopeR := derivative(func(x float64) float64 { return hyperboloidal.Tortoise(s.At(x).Y) }, rho, h)
			if math.Abs(slopeH*p.Boost-p.Height) > 3e-10 || math.Abs(slopeR*p.Boost-1) > 3e-10 {
				t.Errorf("%s at %g: dh/dr_* = %.12g, H = %.12g; L dr_*/drho = %.12g", named(s), rho, slopeH*p.Boost, p.Height, slopeR*p.Boost)
			}
			// dtau = dt - dh, dt = ±dr_*.
			out := 1 / (slopeR - slopeH)
			in := 1 / (slopeR + slopeH)
			wantOut, wantIn := 1.0, 1.0
			switch {
			case rho > s.Ro:
				wantIn = p.Boost / (2 - p.Boost)
			case rho < s.Ri:
				wantOut = p.Boost / (2 - p.Boost)
			}
			if math.Abs(out-wantOut) > 1e-9 || math.Abs(in-wantIn) > 1e-9 {
				t.Errorf("%s at %g: speeds %.10g out, %.10g in; want %.10g, %.10g", named(s), rho, out, in, wantOut, wantIn)
			}
			if !(p.Boost > 0 && p.Boost <= 1) {
				t.Errorf("%s at %g: L = %g", named(s), rho, p.Boost)
			}
		}
	}
}

// TestJoints: at both joints the layers meet the flat part, as smoothly as the
// profile does: L' starts like x^{n-2} for 1-x^n, flat for the exponential.
func TestJoints(t *testing.T) {
	for _, s := range slicings() {
		for _, c := range []struct{ joint, into, width float64 }{{s.Ro, 1, s.So - s.Ro}, {s.Ri, -1, s.Ri - s.Si}} {
			at := s.At(c.joint)
			if at.Boost != 1 || at.BoostPrime != 0 || at.Height != 0 || at.HeightPrime != 0 || at.H0 != 0 {
				t.Errorf("%s: the joint %g is not flat: %+v", named(s), c.joint, at)
			}
			const x = 1e-4
			in := s.At(c.joint + c.into*x*c.width)
			bound := 1e-12
			if n, ok := s.Profile.(hyperboloidal.Power); ok {
				// 1-L is about n x^{n-1} r_t/width, L' its derivative over the width.
				bound += 4 * float64(n) * float64(n) * math.Pow(x, float64(n)-2) * (1 + at.R) / math.Min(c.width, 1)
			}
			if math.Abs(in.Boost-1) > bound || math.Abs(in.BoostPrime) > bound || math.Abs(in.H0) > bound+1e-13 {
				t.Errorf("%s: just inside the joint %g: L-1 = %g, L' = %g, h = %g, bound %g", named(s), c.joint, in.Boost-1, in.BoostPrime, in.H0, bound)
			}
			if math.Abs(in.R-at.R) > 2*x*c.width || math.Abs(in.Stretch-at.Stretch) > 2*x*c.width {
				t.Errorf("%s: r jumps from %g to %g at the joint %g", named(s), at.R, in.R, c.joint)
			}
		}
		// r grows all the way.
		last := -1.0
		for _, p := range s.Sample(samples(s, 500)) {
			if !(p.R > last) {
				t.Errorf("%s: r falls from %g to %g at %g", named(s), last, p.R, p.Rho)
			}
			last = p.R
		}
	}
}

func samples(s hyperboloidal.Layers, n int) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = s.Si + (s.So-s.Si)*float64(i)/float64(n-1)
	}
	out[n-1] = s.So
	return out
}

func TestCheck(t *testing.T) {
	good := hyperboloidal.Layers{Si: -20, Ri: 0, Ro: 26, So: 56, Profile: hyperboloidal.Flat(2)}
	if err := good.Check(); err != nil {
		t.Error(err)
	}
	// A kept slope makes r fall somewhere in the layer when it is too steep.
	steep := good
	steep.Alpha = greatest(steep.Si)
	if err := steep.Check(); err != nil {
		t.Error(err)
	}
	for _, change := range []func(*hyperboloidal.Layers){
		func(s *hyperboloidal.Layers) { s.Alpha = -1e-9 },
		func(s *hyperboloidal.Layers) { s.Alpha = 1.001 * greatest(s.Si) },
		func(s *hyperboloidal.Layers) { s.Alpha = math.NaN() },
		func(s *hyperboloidal.Layers) { s.Si = 0 },
		func(s *hyperboloidal.Layers) { s.Ri = 26 },
		func(s *hyperboloidal.Layers) { s.So = 20 },
		func(s *hyperboloidal.Layers) { s.Ro = math.NaN() },
		func(s *hyperboloidal.Layers) { s.Profile = nil },
	} {
		bad := good
		change(&bad)
		if bad.Check() == nil {
			t.Errorf("%+v passes", bad)
		}
	}
}
