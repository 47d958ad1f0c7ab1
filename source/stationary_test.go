package source

import (
	"math"
	"math/cmplx"
	"testing"

	"nullmark/equations/semi"
	"nullmark/grid"
)

var _ semi.Forcing = (*Stationary)(nil)

// block is four modes on a grid that reaches far beyond the kernel.
func block() (s *Stationary, rho []float64, k Kernel, ramp Ramp, f, g, omega []float64) {
	rho = grid.New(-30, 50, 161).Rho()
	k = NewKernel(0.95, 16)
	ramp = Ramp{Centre: 80, Width: 17}
	f, g = []float64{1.3, -1.2, 0.4, 0.9}, []float64{-0.4, 0.1, 2, -3}
	omega = []float64{0.03, 0.06, 0.2, 0.5}
	return NewStationary(rho, 12.7, k, ramp, f, g, omega), rho, k, ramp, f, g, omega
}

// TestStationaryIsItsFormula, lane by lane, and added to what is there.
func TestStationaryIsItsFormula(t *testing.T) {
	s, rho, k, ramp, f, g, omega := block()
	for _, at := range []float64{40, 83.5, 300} {
		dst := make([]float64, len(rho)*grid.Lanes)
		for i := range dst {
			dst[i] = 1
		}
		s.Add(dst, at)
		on := (1 + math.Erf((at-ramp.Centre)/ramp.Width)) / 2
		for i, x := range rho {
			d, d1 := k.At(x - 12.7)
			for q := range f {
				want := complex(-on*(g[q]*d+f[q]*d1), 0) * cmplx.Exp(complex(0, -omega[q]*at))
				got := complex(dst[i*grid.Lanes+2*q]-1, dst[i*grid.Lanes+2*q+1]-1)
				if cmplx.Abs(got-want) > 4e-15 {
					t.Errorf("mode %d at rho = %g, t = %g: %v, want %v", q, x, at, got, want)
				}
			}
			if math.Abs(x-12.7) > k.Reach() {
				for l := 0; l < grid.Lanes; l++ {
					if dst[i*grid.Lanes+l] != 1 {
						t.Errorf("the forcing reaches rho = %g", x)
					}
				}
			}
		}
	}
}

// TestStationaryDerivatives: each against differences of the one before, up to
// the last, during the ramp and after it.
func TestStationaryDerivatives(t *testing.T) {
	s, rho, _, _, _, _, omega := block()
	mid := 0
	for i, x := range rho {
		if math.Abs(x-13.2) < 0.26 {
			mid = i
		}
	}
	value := func(j, lane int) func(float64) float64 {
		return func(at float64) float64 {
			dst := make([]float64, len(rho)*grid.Lanes)
			s.Prepare(at, 0.1)
			s.AddDerivative(dst, j, 1)
			return dst[mid*grid.Lanes+lane]
		}
	}
	for _, at := range []float64{71, 90, 400} {
		for lane := 0; lane < 8; lane++ {
			for j := 1; j <= MaxDerivative; j++ {
				want := slope(value(j-1, lane), at, 0.1)
				// Derivatives are at most (omega + 12/17)^j times the forcing.
				size := 3 * math.Pow(omega[lane/2]+1.5*math.Sqrt(float64(j))/17, float64(j))
				if got := value(j, lane)(at); math.Abs(got-want) > 1e-7*size {
					t.Errorf("derivative %d in lane %d at t = %g: %.10g, want %.10g (size %.3g)", j, lane, at, got, want, size)
				}
			}
		}
	}
	// After the ramp the j-th derivative is (-i omega)^j times the forcing.
	for q, w := range omega {
		f := complex(value(0, 2*q)(900), value(0, 2*q+1)(900))
		for j := 0; j <= MaxDerivative; j++ {
			want := f * cmplx.Pow(complex(0, -w), complex(float64(j), 0))
			got := complex(value(j, 2*q)(900), value(j, 2*q+1)(900))
			if cmplx.Abs(got-want) > 1e-13*cmplx.Abs(want) {
				t.Errorf("mode %d: derivative %d of a steady forcing is %v, want %v", q, j, got, want)
			}
		}
	}
}

func TestStationaryScalesAndLeavesEmptyLanes(t *testing.T) {
	rho := grid.New(-10, 10, 41).Rho()
	s := NewStationary(rho, 0, NewKernel(1, 4), On(), []float64{1}, []float64{2}, []float64{0.1})
	one, three := make([]float64, 41*grid.Lanes), make([]float64, 41*grid.Lanes)
	s.Prepare(5, 0)
	s.AddDerivative(one, 2, 1)
	s.AddDerivative(three, 2, 3)
	for i := range one {
		if math.Abs(three[i]-3*one[i]) > 1e-15*math.Abs(three[i]) {
			t.Errorf("entry %d: %g is not three times %g", i, three[i], one[i])
		}
		if i%grid.Lanes > 1 && one[i] != 0 {
			t.Errorf("lane %d of one mode is touched", i%grid.Lanes)
		}
	}
	// A kernel that hangs over the end of the grid is cut, not an error.
	cut := NewStationary(rho, 9.5, NewKernel(1, 4), On(), []float64{1}, []float64{2}, []float64{0.1})
	cut.Add(one, 0)
	if n := testing.AllocsPerRun(20, func() { s.Prepare(1, 0.1); s.AddDerivative(one, 3, 0.1) }); n != 0 {
		t.Errorf("%g allocations a step", n)
	}
}

func TestStationaryPanics(t *testing.T) {
	rho := grid.New(-10, 10, 41).Rho()
	five := make([]float64, 5)
	for name, f := range map[string]func(){
		"five modes": func() { NewStationary(rho, 0, NewKernel(1, 4), On(), five, five, five) },
		"unequal":    func() { NewStationary(rho, 0, NewKernel(1, 4), On(), five[:2], five[:2], five[:1]) },
		"unequal g":  func() { NewStationary(rho, 0, NewKernel(1, 4), On(), five[:2], five[:1], five[:2]) },
	} {
		if !panics(f) {
			t.Errorf("%s: no panic", name)
		}
	}
}
