package hyperboloidal_test

import (
	"fmt"
	"math"
	"math/big"
	"testing"

	"nullmark/hyperboloidal"
)

// Reference arithmetic in 256 bits (77 digits), from math/big alone.

const bits = 256

func real256(x float64) *big.Float { return new(big.Float).SetPrec(bits).SetFloat64(x) }

func add(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(bits).Add(a, b) }
func sub(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(bits).Sub(a, b) }
func mul(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(bits).Mul(a, b) }
func quo(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(bits).Quo(a, b) }

func float(a *big.Float) float64 { v, _ := a.Float64(); return v }

// lnOf is ln x: x = m 2^e, ln m by the series of 2 atanh((m-1)/(m+1)).
func lnOf(x *big.Float) *big.Float {
	one := real256(1)
	m := new(big.Float).SetPrec(bits)
	e := x.MantExp(m)
	atanh2 := func(m *big.Float) *big.Float {
		z := quo(sub(m, one), add(m, one))
		z2 := mul(z, z)
		s, p := new(big.Float).SetPrec(bits), new(big.Float).SetPrec(bits).Set(z)
		for k := 1; p.Sign() != 0 && p.MantExp(nil) > -bits-8; k += 2 {
			s.Add(s, quo(p, real256(float64(k))))
			p.Mul(p, z2)
		}
		return mul(s, real256(2))
	}
	return add(atanh2(m), mul(real256(float64(e)), ln2))
}

var ln2 = func() *big.Float {
	// ln 2 = 2 atanh(1/3).
	s, p := new(big.Float).SetPrec(bits), quo(real256(1), real256(3))
	for k := 1; p.MantExp(nil) > -bits-8; k += 2 {
		s.Add(s, quo(p, real256(float64(k))))
		p.Quo(p, real256(9))
	}
	return mul(s, real256(2))
}()

// expOf is e^x: Taylor series at x/2^k, squared k times.
func expOf(x *big.Float) *big.Float {
	k := max(0, x.MantExp(nil)+12)
	y := new(big.Float).SetPrec(bits+64).SetMantExp(x, -k)
	s, p := new(big.Float).SetPrec(bits+64).SetInt64(1), new(big.Float).SetPrec(bits+64).SetInt64(1)
	for n := int64(1); p.Sign() != 0 && p.MantExp(nil) > -bits-64; n++ {
		p.Mul(p, y)
		p.Quo(p, new(big.Float).SetInt64(n))
		s.Add(s, p)
	}
	for ; k > 0; k-- {
		s.Mul(s, s)
	}
	return s.SetPrec(bits)
}

// tortoise is 2 + y + 2 ln(y/2).
func tortoise(y *big.Float) *big.Float {
	return add(add(real256(2), y), mul(real256(2), lnOf(quo(y, real256(2)))))
}

// height solves tortoise(y) = rs by Newton, dy/dr_* = y/(2+y), from a start of
// double precision.
func height(rs *big.Float, start float64) *big.Float {
	y := real256(start)
	for i := 0; i < 4; i++ {
		d := mul(sub(tortoise(y), rs), quo(y, add(real256(2), y)))
		y = sub(y, d)
		if d.Sign() == 0 || d.MantExp(nil)-y.MantExp(nil) < -bits/2-20 {
			break // quadratic: the next correction is below the last bit
		}
	}
	return y
}

// TestReferenceArithmetic holds the test's own functions to the standard
// library's, to functional equations beyond it, and to 40 digits of e and ln 10
// (from memory).
func TestReferenceArithmetic(t *testing.T) {
	for _, x := range []float64{1e-300, 0.37, 1, 1.5, 1e9} {
		if got, want := float(lnOf(real256(x))), math.Log(x); math.Abs(got-want) > 3e-16*math.Abs(want) {
			t.Errorf("ln %g = %g, want %g", x, got, want)
		}
		if x < 700 {
			if d := float(sub(lnOf(expOf(real256(x))), real256(x))); math.Abs(d) > 1e-70 {
				t.Errorf("ln e^%g is off by %g", x, d)
			}
		}
	}
	for _, c := range []struct {
		got  *big.Float
		want string
	}{
		{expOf(real256(1)), "2.718281828459045235360287471352662497757"},
		{lnOf(real256(10)), "2.302585092994045684017991454684364207601"},
	} {
		if got := c.got.Text('f', 39); got != c.want {
			t.Errorf("%s, want %s", got, c.want)
		}
	}
}

func TestTortoise(t *testing.T) {
	// r = 4: r_* = 4 + 2 ln 1; r = 3 the light ring: 3 - 2 ln 2; r = 2+2e: 4 + 2e.
	for _, c := range []struct{ r, want float64 }{
		{4, 4}, {hyperboloidal.LightRing, 3 - 2*math.Ln2}, {2 + 2*math.E, 4 + 2*math.E},
		{hyperboloidal.ISCORadius, 6 + 2*math.Ln2},
	} {
		if got := hyperboloidal.TortoiseAt(c.r); math.Abs(got-c.want) > 2e-15*c.want {
			t.Errorf("r_*(%g) = %.17g, want %.17g", c.r, got, c.want)
		}
	}
	for e := -300.0; e <= 8; e += 3.7 {
		y := math.Pow(10, e)
		want := float(tortoise(real256(y)))
		if got := hyperboloidal.Tortoise(y); math.Abs(got-want) > 2.3e-16*(2+y+2*math.Abs(math.Log(y/2))) {
			t.Errorf("r_* at y = %g: %.17g, want %.17g", y, got, want)
		}
	}
}

// TestInverseTortoise: y = r-2 to a few units in its last place from deep below
// r_* = -1300 (y = 1e-282) to 1e6, against 77 digits.
func TestInverseTortoise(t *testing.T) {
	var at []float64
	for rs := -1300.0; rs < -40; rs += 37.123456789 {
		at = append(at, rs)
	}
	for rs := -40.0; rs < 40; rs += 0.637 {
		at = append(at, rs)
	}
	for rs := 40.0; rs < 1.1e6; rs *= 1.73 {
		at = append(at, rs)
	}
	// Both sides of the change of method at r_* = 4, and where y = 2.
	at = append(at, 4, math.Nextafter(4, 0), math.Nextafter(4, 5), 2, 0, 1e6)
	worst, where := 0.0, 0.0
	for _, rs := range at {
		got := hyperboloidal.InverseTortoise(rs)
		want := height(real256(rs), got)
		if e := math.Abs(float(quo(sub(real256(got), want), want))); !(e <= worst) {
			worst, where = e, rs
		}
	}
	// Measured: 2.3e-16 at worst, one unit in the last place.
	if !(worst < 4.5e-16) {
		t.Errorf("y is off by %.3g relative at r_* = %g", worst, where)
	}
}

// profiles lists every profile that a layer may have.
func profiles() []hyperboloidal.Profile {
	return []hyperboloidal.Profile{
		hyperboloidal.Power(4), hyperboloidal.Power(5), hyperboloidal.Power(6), hyperboloidal.Power(8),
		hyperboloidal.Flat(1), hyperboloidal.Flat(2), hyperboloidal.Flat(3),
	}
}

// omega is the profile in 77 digits, also beyond x = 1.
func omega(p hyperboloidal.Profile, x *big.Float) *big.Float {
	one := real256(1)
	if x.Sign() <= 0 {
		return one
	}
	switch p := p.(type) {
	case hyperboloidal.Power:
		v := real256(1)
		for i := 0; i < int(p); i++ {
			v = mul(v, x)
		}
		return sub(one, v)
	case hyperboloidal.Flat:
		return sub(one, expOf(mul(real256(float64(p)), sub(one, quo(one, x)))))
	}
	panic(fmt.Sprintf("profile %T has no reference", p))
}

// TestProfiles: value and two derivatives against differences in 77 digits.
func TestProfiles(t *testing.T) {
	for _, p := range profiles() {
		if o, o1, o2 := p.At(0); o != 1 || o1 != 0 || o2 != 0 {
			t.Errorf("%s at 0: %g %g %g, want 1 0 0", p, o, o1, o2)
		}
		if o, _, _ := p.At(1); o != 0 {
			t.Errorf("%s at 1: %g, want 0", p, o)
		}
		for _, x := range []float64{1e-9, 0.01, 0.1, 0.37, 0.5, 0.81, 0.999, 1} {
			h := real256(0x1p-60)
			c := omega(p, real256(x))
			a, b := omega(p, sub(real256(x), h)), omega(p, add(real256(x), h))
			first := quo(sub(b, a), mul(real256(2), h))
			second := quo(add(sub(a, mul(real256(2), c)), b), mul(h, h))
			o, o1, o2 := p.At(x)
			for i, v := range []struct {
				got  float64
				want *big.Float
			}{{o, c}, {o1, first}, {o2, second}} {
				// Measured: 3.3e-16 where 1-1/x cancels, next to x = 1.
				if w := float(v.want); math.Abs(v.got-w) > 4e-15*math.Abs(w)+5e-16 {
					t.Errorf("%s: derivative %d at %g is %.17g, want %.17g", p, i, x, v.got, w)
				}
			}
		}
	}
}
