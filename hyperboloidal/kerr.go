package hyperboloidal

import (
	"fmt"
	"math"
	"math/big"
)

// Kerr is a hole of spin a (in units of its mass M = 1), |a| < 1. With
// y = r - r+ and e = sqrt(1-a^2),
//
//	Delta = r^2 - 2r + a^2 = y (y + 2e),   K = r^2 + a^2,
//	r* = r + [2 r+ ln(y/2) - 2 r- ln((y+2e)/2)]/(2e),   dr*/dr = K/Delta;
//
// the additive constant makes a = 0 the usual r + 2 ln(r/2 - 1). Negative a
// means that the orbits with L > 0 are retrograde.
type Kerr struct {
	a, e, rp, rm float64
}

// SpinError reports a spin outside (-1, 1).
type SpinError struct{ Spin float64 }

func (e *SpinError) Error() string {
	return fmt.Sprintf("spin %g is not that of a black hole: write a number above -1 and below 1", e.Spin)
}

// NewKerr returns the hole of spin a, or a *SpinError unless |a| < 1.
func NewKerr(a float64) (Kerr, error) {
	if !(math.Abs(a) < 1) {
		return Kerr{}, &SpinError{Spin: a}
	}
	e := math.Sqrt((1 - a) * (1 + a))
	// r- = a^2/r+ keeps its digits for small a.
	return Kerr{a: a, e: e, rp: 1 + e, rm: a * a / (1 + e)}, nil
}

// Spin returns a.
func (k Kerr) Spin() float64 { return k.a }

// OuterHorizon returns r+ = 1 + sqrt(1-a^2).
func (k Kerr) OuterHorizon() float64 { return k.rp }

// InnerHorizon returns r- = 1 - sqrt(1-a^2).
func (k Kerr) InnerHorizon() float64 { return k.rm }

// Eccentre returns e = (r+ - r-)/2 = sqrt(1-a^2), which is also 2 r+ times the
// surface gravity.
func (k Kerr) Eccentre() float64 { return k.e }

// HorizonFrequency returns a/(2 r+), the angular velocity of the horizon.
func (k Kerr) HorizonFrequency() float64 { return k.a / (2 * k.rp) }

// LightRing returns the radius of the equatorial circular photon orbit with
// L > 0, r = 2 (1 + cos((2/3) arccos(-a))) (J. M. Bardeen, W. H. Press,
// S. A. Teukolsky, ApJ 178, 347 (1972), eq. 2.18).
func (k Kerr) LightRing() float64 { return 2 * (1 + math.Cos(2.0/3.0*math.Acos(-k.a))) }

// ISCO returns the radius of the innermost stable circular equatorial orbit
// with L > 0 (same paper, eq. 2.21).
func (k Kerr) ISCO() float64 {
	a := k.a
	z1 := 1 + math.Cbrt(1-a*a)*(math.Cbrt(1+a)+math.Cbrt(1-a))
	z2 := math.Sqrt(3*a*a + z1*z1)
	s := math.Sqrt((3 - z1) * (3 + z1 + 2*z2))
	if a < 0 {
		s = -s
	}
	return 3 + z2 - s
}

// Tortoise returns r*(y) for y = r - r+ > 0. It panics for y <= 0.
func (k Kerr) Tortoise(y float64) float64 {
	if !(y > 0) {
		panic("hyperboloidal: tortoise coordinate asked at or inside the horizon")
	}
	return k.tortoise(y)
}

func (k Kerr) tortoise(y float64) float64 {
	return k.rp + y + (k.rp*math.Log(y/2)-k.rm*math.Log(y/2+k.e))/k.e
}

// Azimuth returns phi~ - phi = a/(2e) ln(y/(y+2e)): what must be added to the
// Boyer–Lindquist azimuth to get the azimuth regular on the future horizon. It
// vanishes at infinity.
func (k Kerr) Azimuth(y float64) float64 {
	return -k.a / (2 * k.e) * math.Log1p(2*k.e/y)
}

// InverseTortoise returns y = r - r+ at tortoise coordinate rs with full
// relative precision, however close to the horizon: Newton in ln y, the last
// step with the residual in 192-bit arithmetic.
func (k Kerr) InverseTortoise(rs float64) float64 {
	y := k.newtonTortoise(rs)
	if y < 1e-290 {
		return y // below this the residual's last digits are lost to subnormals
	}
	for range 2 {
		slope := k.kay(y) / k.delta(y)
		y -= k.residual(y, rs) / slope
	}
	return y
}

// newtonTortoise is InverseTortoise in plain double precision.
func (k Kerr) newtonTortoise(rs float64) float64 {
	var w float64
	if rs > k.rp+2 {
		w = math.Log(rs - k.rp)
	} else {
		w = math.Ln2 + k.e/k.rp*(rs-k.rp)
		if w > math.Ln2 {
			w = math.Ln2
		}
	}
	for range 60 {
		y := math.Exp(w)
		slope := y * k.kay(y) / k.delta(y)
		// tortoise in terms of w keeps its meaning when y underflows.
		f := k.rp + y + (k.rp*(w-math.Ln2)-k.rm*math.Log(y/2+k.e))/k.e - rs
		step := f / slope
		w -= step
		if math.Abs(step) < 1e-14*(1+math.Abs(w)) {
			break
		}
	}
	return math.Exp(w)
}

func (k Kerr) delta(y float64) float64 { return y * (y + 2*k.e) }
func (k Kerr) kay(y float64) float64   { r := k.rp + y; return r*r + k.a*k.a }

const residualBits = 192

// residual returns r*(y) - rs evaluated in extended precision from the exact
// values of a, y and rs.
func (k Kerr) residual(y, rs float64) float64 {
	f := func(v float64) *big.Float { return new(big.Float).SetPrec(residualBits).SetFloat64(v) }
	op := func() *big.Float { return new(big.Float).SetPrec(residualBits) }
	a := f(k.a)
	e := op().Sqrt(op().Sub(f(1), op().Mul(a, a)))
	rp := op().Add(f(1), e)
	rm := op().Sub(f(1), e)
	half := op().Quo(f(y), f(2))
	t := op().Mul(rp, bigLog(half))
	t.Sub(t, op().Mul(rm, bigLog(op().Add(half, e))))
	t.Quo(t, e)
	t.Add(t, rp)
	t.Add(t, f(y))
	t.Sub(t, f(rs))
	v, _ := t.Float64()
	return v
}

// bigLog returns ln x for x > 0 to about residualBits bits: x = m 2^n with m
// near 1 and ln m = 2 artanh((m-1)/(m+1)).
func bigLog(x *big.Float) *big.Float {
	op := func() *big.Float { return new(big.Float).SetPrec(residualBits) }
	m := op()
	n := x.MantExp(m)
	if m.Cmp(big.NewFloat(math.Sqrt2/2)) < 0 {
		m.Mul(m, big.NewFloat(2))
		n--
	}
	artanh := func(z *big.Float) *big.Float {
		sum, pow, sq := op().Set(z), op().Set(z), op().Mul(z, z)
		for j := 3; ; j += 2 {
			pow.Mul(pow, sq)
			t := op().Quo(pow, op().SetInt64(int64(j)))
			if t.Sign() == 0 || sum.MantExp(nil)-t.MantExp(nil) > residualBits {
				return sum
			}
			sum.Add(sum, t)
		}
	}
	one := op().SetInt64(1)
	ln := artanh(op().Quo(op().Sub(m, one), op().Add(m, one)))
	ln2 := artanh(op().Quo(one, op().SetInt64(3)))
	ln.Add(ln, ln2.Mul(ln2, op().SetInt64(int64(n))))
	return ln.Mul(ln, op().SetInt64(2))
}
