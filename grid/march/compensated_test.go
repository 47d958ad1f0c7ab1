package march

import (
	"math"
	"testing"
)

// rotation is x' = w y, y' = -w x, with a constant drive c on x.
type rotation struct{ w, c float64 }

func (r rotation) Apply(dst, u []float64)          { dst[0], dst[1] = r.w*u[1], -r.w*u[0] }
func (r rotation) RHS(dst, u []float64, _ float64) { r.Apply(dst, u); dst[0] += r.c }
func (r rotation) Prepare(_, _ float64)            {}
func (r rotation) AddForce(dst []float64, j int, s float64) {
	if j == 0 {
		dst[0] += s * r.c
	}
}

// A slow rotation over many small steps: the exact solution to a few units of
// round-off, where the plain sum of Taylor loses digits with every step.
func TestCompensatedKeepsDigits(t *testing.T) {
	const w, dt, n = 1e-3, 0.05, 400000
	end := func(s Stepper) float64 {
		u := []float64{1, 0.3}
		for k := range n {
			s.Step(u, float64(k)*dt, dt)
		}
		si, co := math.Sincos(w * dt * n)
		return math.Hypot(u[0]-(co+0.3*si), u[1]-(0.3*co-si))
	}
	good := end(NewCompensated(rotation{w: w}, 8, 2))
	plain := end(NewTaylor(rotation{w: w}, 8, 2))
	if good > 2e-15 {
		t.Errorf("error %.1e after %d steps", good, n)
	}
	if plain < 3*good {
		t.Errorf("the plain sum errs by %.1e, no more than %.1e: the test shows nothing", plain, good)
	}
}

// Order 8 in dt, the drive included, and the increment's turn after each step.
func TestCompensatedOrder(t *testing.T) {
	end := func(n int) float64 {
		r := rotation{w: 1, c: 0.4}
		s := NewCompensated(r, 8, 2)
		u := []float64{1, 0}
		dt := 6.0 / float64(n)
		for k := range n {
			s.Step(u, float64(k)*dt, dt)
		}
		// y'' = -y - c w: about y = -c
		si, co := math.Sincos(6)
		return math.Hypot(u[0]-(co+0.4*si), u[1]-(-si+0.4*(co-1)))
	}
	p := math.Log2(end(8) / end(16))
	if math.Abs(p-8) > 0.5 {
		t.Errorf("observed order %.2f", p)
	}
	s := NewCompensated(rotation{}, 8, 2)
	calls := 0
	s.Increment = func(inc, u []float64) {
		calls++
		inc[0] -= 0.25 * u[0]
	}
	u := []float64{1, 0}
	s.Step(u, 0, 1)
	if calls != 1 || u[0] != 0.75 {
		t.Errorf("increment called %d times, u = %g", calls, u[0])
	}
	if n := testing.AllocsPerRun(10, func() { s.Step(u, 0, 1) }); n != 0 {
		t.Errorf("%g allocations a step", n)
	}
}
