package junk_test

import (
	"errors"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"nullmark/extract/junk"
	"nullmark/extract/signal"
)

// run is a clean tone plus what a ramp at the given time leaves: a burst of
// ringing and a tail of power 4.
func run(dt, ramp, tail float64) (s signal.Series, left []float64) {
	n := int(1200 / dt)
	s = signal.Series{Start: 0, Dt: dt, Values: make([]complex128, n)}
	left = make([]float64, n)
	for k := range s.Values {
		u := s.Time(k)
		var j complex128
		if x := u - ramp; x > 0 {
			j = cmplx.Rect(math.Exp(-0.089*x), -0.37*x) + complex(tail*math.Pow(1+x/10, -4), 0)
			j *= complex(1-math.Exp(-x*x/100), 0)
		}
		s.Values[k] = cmplx.Rect(1, -0.06*u) + j
		left[k] = cmplx.Abs(j)
	}
	return s, left
}

func TestResidueBoundsWhatIsLeft(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 3))
	inside, all, idle := 0, 0, 0
	for range 40 {
		ramp := 80 + 20*r.Float64()
		shift := 20 + 30*r.Float64()
		tail := math.Pow(10, -4+3*r.Float64())
		dt := 0.3 + 0.4*r.Float64()
		a, left := run(dt, ramp, tail)
		b, _ := run(dt*1.1, ramp-shift, tail)
		got, err := junk.Find(a, b, 1e-6, junk.Ramps{Centre: ramp, Other: ramp - shift, Power: 4})
		if err != nil {
			t.Fatal(err)
		}
		if got.Left[got.First] > 1e-6 || got.First == 0 || got.Left[got.First-1] <= 1e-6 || got.Until != a.Time(got.First) {
			t.Fatalf("until %g, index %d", got.Until, got.First)
		}
		for k := got.First; k < len(left); k++ {
			all++
			// The tail's origin is 10 before the ramp: that is what the
			// factor does not know.
			if left[k] <= 1.1*got.Left[k]+1e-12 {
				inside++
			}
			if got.Left[k] > 5*left[k]+1e-12 {
				idle++
			}
			if k > 0 && got.Left[k] > got.Left[k-1] {
				t.Fatal("the residue rises")
			}
		}
	}
	if inside < all*99/100 || idle > all/10 {
		t.Errorf("%d of %d samples inside, %d idle", inside, all, idle)
	}
}

func TestLasting(t *testing.T) {
	a, _ := run(0.5, 80, 1)
	b, _ := run(0.5, 60, 1)
	var lasting *junk.Lasting
	got, err := junk.Find(a, b, 1e-12, junk.Ramps{})
	if !errors.As(err, &lasting) || got == nil || got.Until != a.End() {
		t.Errorf("%v, %v", got, err)
	}
	// Without the ramps' factor the difference stands for itself.
	k := len(a.Values) - 1
	if d := cmplx.Abs(a.Values[k] - b.Values[k]); got.Left[k] != d {
		t.Errorf("left %g, difference %g", got.Left[k], d)
	}
}
