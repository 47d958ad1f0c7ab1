package equations

import (
	"math"
	"math/big"
	"math/rand"
	"testing"
)

func rat(a, b int64) *big.Rat { return big.NewRat(a, b) }

func sum(terms ...*big.Rat) *big.Rat {
	s := new(big.Rat)
	for _, t := range terms {
		s.Add(s, t)
	}
	return s
}

func product(factors ...*big.Rat) *big.Rat {
	p := rat(1, 1)
	for _, f := range factors {
		p.Mul(p, f)
	}
	return p
}

func inverse(r *big.Rat) *big.Rat { return new(big.Rat).Inv(r) }

// radii are rational radii outside the horizon, near and far.
func radii() []*big.Rat {
	rng := rand.New(rand.NewSource(1))
	out := []*big.Rat{rat(2000001, 1000000), rat(3, 1), rat(6, 1), rat(1000000, 1)}
	for i := 0; i < 40; i++ {
		out = append(out, sum(rat(2, 1), rat(1+rng.Int63n(1<<20), 1+rng.Int63n(1<<18))))
	}
	return out
}

// compare holds V = Reduced f/r^2 against an exact V at r.
func compare(t *testing.T, name string, p Potential, r, want *big.Rat) {
	t.Helper()
	x, _ := inverse(r).Float64()
	f := sum(rat(1, 1), product(rat(-2, 1), inverse(r)))
	w, _ := product(want, r, r, inverse(f)).Float64()
	// Reduced is evaluated at the rounded x; its slope in x is at most 20 of it.
	if got := p.Reduced(x); math.Abs(got-w) > 2e-15*math.Abs(w) {
		t.Errorf("%s at r = %s: V r^2/f = %.17g, want %.17g", name, r.RatString(), got, w)
	}
}

// TestReggeWheeler: V = f [l(l+1)/r^2 - 6/r^3] for gravity (T. Regge and J. A.
// Wheeler, Phys. Rev. 108, 1063 (1957)), f [l(l+1)/r^2 + 2/r^3] for a scalar,
// f l(l+1)/r^2 for a vector field (all three from memory).
func TestReggeWheeler(t *testing.T) {
	for _, r := range radii() {
		x := inverse(r)
		f := sum(rat(1, 1), product(rat(-2, 1), x))
		for spin, c := range map[int]int64{0: 2, 1: 0, 2: -6} {
			for l := int64(spin); l < 10; l++ {
				want := product(f, sum(product(rat(l*(l+1), 1), x, x), product(rat(c, 1), x, x, x)))
				if want.Sign() == 0 {
					continue
				}
				compare(t, "Regge-Wheeler", ReggeWheeler{L: int(l), Spin: spin}, r, want)
			}
		}
	}
}

// TestZerilli against the form in n = (l-1)(l+2)/2,
//
//	V = f [2 n^2 (n+1) r^3 + 6 n^2 r^2 + 18 n r + 18] / (r^3 (n r + 3)^2)
//
// (F. J. Zerilli, Phys. Rev. Lett. 24, 737 (1970), from memory), which is not
// the form in the code.
func TestZerilli(t *testing.T) {
	for _, r := range radii() {
		f := sum(rat(1, 1), product(rat(-2, 1), inverse(r)))
		for l := int64(2); l < 12; l++ {
			n := rat((l-1)*(l+2), 2)
			top := product(rat(2, 1), sum(
				product(n, n, sum(n, rat(1, 1)), r, r, r), product(rat(3, 1), n, n, r, r),
				product(rat(9, 1), n, r), rat(9, 1)))
			d := sum(product(n, r), rat(3, 1))
			want := product(f, top, inverse(product(r, r, r, d, d)))
			compare(t, "Zerilli", Zerilli{L: int(l)}, r, want)
		}
	}
}

// TestIsospectrality: with w = Delta/(r^3 (mu r + 6)), Delta = r^2-2r,
// mu = (l-1)(l+2), both potentials come from one superpotential,
//
//	V = ±6 dw/dr_* + (6 w)^2 + mu (mu+2) w,
//
// + for Zerilli and - for Regge–Wheeler (S. Chandrasekhar, The Mathematical
// Theory of Black Holes, chapter 4, from memory): W^2 ± dW/dr_* + beta with
// W = 6 w + mu (mu+2)/12 and beta = -(mu (mu+2)/12)^2. It ties the two codes to
// each other: they share reflection and quasinormal spectra.
func TestIsospectrality(t *testing.T) {
	for _, r := range radii() {
		f := sum(rat(1, 1), product(rat(-2, 1), inverse(r)))
		for l := int64(2); l < 12; l++ {
			mu := (l - 1) * (l + 2)
			// w = (r-2)/(r^2 (mu r + 6)).
			den := product(r, r, sum(product(rat(mu, 1), r), rat(6, 1)))
			num := sum(r, rat(-2, 1))
			w := product(num, inverse(den))
			dden := sum(product(rat(3*mu, 1), r, r), product(rat(12, 1), r))
			slope := product(sum(den, product(rat(-1, 1), num, dden)), inverse(product(den, den)))
			constant := rat(mu*(mu+2), 12)
			super := sum(product(rat(6, 1), w), constant)
			beta := product(rat(-1, 1), constant, constant)
			for _, c := range []struct {
				sign int64
				p    Parity
			}{{1, Even}, {-1, Odd}} {
				want := sum(product(super, super), product(rat(6*c.sign, 1), f, slope), beta)
				compare(t, "superpotential, "+c.p.String(), Master(c.p, int(l)), r, want)
			}
		}
	}
}

// TestPeak: dV/dr = 0 of Regge–Wheeler is L2 r^2 - 3 (L2+3) r + 24 = 0, with
// L2 = l(l+1): r = 3.2808 for l = 2, and 3 for large l (the light ring).
func TestPeak(t *testing.T) {
	for _, l := range []int{2, 3, 8, 100} {
		l2 := float64(l * (l + 1))
		want := (3*(l2+3) + math.Sqrt(9*(l2+3)*(l2+3)-96*l2)) / (2 * l2)
		v := func(r float64) float64 { return (1 - 2/r) / (r * r) * Master(Odd, l).Reduced(1/r) }
		lo, hi := 2.5, 4.0
		for i := 0; i < 200; i++ {
			if a, b := lo+(hi-lo)/3, hi-(hi-lo)/3; v(a) < v(b) {
				lo = a
			} else {
				hi = b
			}
		}
		// A maximum of a double-precision function is known to the root of epsilon.
		if math.Abs(lo-want) > 1e-7 {
			t.Errorf("l = %d: peak at %.8f, want %.8f", l, lo, want)
		}
	}
	if l2 := 6.0; math.Abs((3*(l2+3)+math.Sqrt(9*(l2+3)*(l2+3)-96*l2))/(2*l2)-3.2808) > 5e-5 {
		t.Error("the peak for l = 2 is not at 3.2808")
	}
}

func TestParities(t *testing.T) {
	for l := 2; l < 6; l++ {
		for m := -l; m <= l; m++ {
			want := Even
			if (l+m)%2 != 0 {
				want = Odd
			}
			if got := EquatorialParity(l, m); got != want {
				t.Errorf("(%d,%d): %s", l, m, got)
			}
		}
	}
	if Even.String() != "even" || Odd.String() != "odd" {
		t.Errorf("parities are named %s and %s", Even, Odd)
	}
	defer func() {
		if recover() == nil {
			t.Error("l = 1 does not panic")
		}
	}()
	Master(Even, 1)
}
