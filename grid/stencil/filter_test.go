package stencil

import (
	"math"
	"testing"
)

// TestFilterDamping: a wave e^{ikx} keeps the fraction 1 - strength sin^{2q}(k/2)
// in the interior (common practice, no source): 1-strength at k = pi, and all of
// a resolved wave; nothing changes within q points of the ends.
func TestFilterDamping(t *testing.T) {
	const lanes, n = 2, 60
	for order := 2; order <= 20; order += 2 {
		for _, strength := range []float64{0.5, 1} {
			f := NewFilter(order, strength)
			if f.Half != order/2 || len(f.Weights) != order+1 {
				t.Fatalf("order %d: half %d, %d weights", order, f.Half, len(f.Weights))
			}
			for _, k := range []float64{0, 0.1, 0.5, 1.3, 2.7, math.Pi} {
				u, scratch := make([]float64, n*lanes), make([]float64, n*lanes)
				for i := 0; i < n; i++ {
					u[i*lanes], u[i*lanes+1] = math.Cos(k*float64(i)), math.Sin(k*float64(i)+0.2)
				}
				before := append([]float64(nil), u...)
				f.Apply(u, scratch, lanes)
				keep := 1 - strength*math.Pow(math.Sin(k/2), float64(order))
				for i := range u {
					p := i / lanes
					if p < f.Half || p >= n-f.Half {
						if u[i] != before[i] {
							t.Errorf("order %d: the filter touches point %d", order, p)
						}
						continue
					}
					if math.Abs(u[i]-keep*before[i]) > 2e-14 {
						t.Errorf("order %d strength %g k %g: point %d keeps %g of %g, want the fraction %g", order, strength, k, p, u[i], before[i], keep)
					}
				}
			}
		}
	}
}

// TestFilterOnSmoothData: polynomials below degree 2q are kept, x^{2q} loses
// strength (2q)!/4^q (the 2q-th difference of x^{2q} is (2q)!).
func TestFilterOnSmoothData(t *testing.T) {
	const n = 41
	for order := 2; order <= 8; order += 2 {
		f := NewFilter(order, 0.5)
		for degree := 0; degree <= order; degree++ {
			u, scratch := make([]float64, n), make([]float64, n)
			for i := range u {
				u[i] = math.Pow(float64(i-n/2)/4, float64(degree))
			}
			before := append([]float64(nil), u...)
			f.Apply(u, scratch, 1)
			change := 0.0
			if degree == order {
				change = 0.5 * math.Gamma(float64(order+1)) / math.Pow(4, float64(order/2)) / math.Pow(4, float64(order))
				if order/2%2 == 1 { // -(-1)^q delta^{2q}
					change = -change
				}
				change = -change
			}
			for i := f.Half; i < n-f.Half; i++ {
				if d := u[i] - before[i]; math.Abs(d-change) > 4e-16*(1+math.Abs(before[0])) {
					t.Errorf("order %d degree %d: point %d changes by %g, want %g", order, degree, i, d, change)
				}
			}
		}
	}
}

func TestFilterLeavesShortGridsAlone(t *testing.T) {
	f := NewFilter(4, 1)
	u := []float64{1, -1, 1, -1}
	f.Apply(u, make([]float64, 4), 1)
	if u[0] != 1 || u[1] != -1 || u[2] != 1 || u[3] != -1 {
		t.Errorf("four points under a filter of five: %v", u)
	}
}

// TestFilterOfEightLanes: the unrolled path gives the bits of the plain one.
func TestFilterOfEightLanes(t *testing.T) {
	const n = 61
	f := NewFilter(16, 0.5)
	u := make([]float64, 8*n)
	for i := range u {
		u[i] = math.Sin(0.7*float64(i)) + 1e-3*float64(i%13)
	}
	for l := range 8 {
		one := make([]float64, n)
		for i := range one {
			one[i] = u[8*i+l]
		}
		f.Apply(one, make([]float64, n), 1)
		all := append([]float64(nil), u...)
		f.Apply(all, make([]float64, len(all)), 8)
		for i := range one {
			if one[i] != all[8*i+l] {
				t.Fatalf("lane %d, point %d: %g and %g", l, i, one[i], all[8*i+l])
			}
		}
	}
}
