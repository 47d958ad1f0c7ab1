package source

import (
	"math"
	"testing"

	"nullmark/equations/semi"
	"nullmark/grid"
	"nullmark/source/worldline"
)

var _ semi.Forcing = (*Moving)(nil)

// circlePath is a circular orbit and swingPath one that moves in r_* by a given amplitude
// with the slope of r_* as its velocity (a path, not a geodesic: the forcing
// only asks for states).
type circlePath struct{ motion Motion }

func (r circlePath) At(t float64, s *worldline.State) {
	w := r.motion
	omega := w.Y / w.R * w.L / (w.R * w.R * w.E)
	*s = worldline.State{
		T: t, R: w.R, Y: w.Y, Rstar: w.R + 2*math.Log(w.Y/2), P: w.P, E: w.E, L: w.L,
		Phi: omega * t, Phase: math.Remainder(omega*t, 2*math.Pi),
	}
}

type swingPath struct{ amplitude float64 }

func (w swingPath) At(t float64, s *worldline.State) {
	y := 8 + w.amplitude*math.Sin(t/15)
	r := y + 2
	p := w.amplitude / 15 * math.Cos(t/15)
	bigL := 3.9
	e := math.Sqrt(p*p + y/r*(1+bigL*bigL/(r*r)))
	*s = worldline.State{T: t, R: r, Y: y, Rstar: r + 2*math.Log(y/2), P: p, E: e, L: bigL, Phi: 0.03 * t, Phase: math.Remainder(0.03*t, 2*math.Pi)}
}

func modes() []MasterSource {
	return []MasterSource{NewMasterSource(2, 2), NewMasterSource(2, 1), NewMasterSource(3, 3), NewMasterSource(4, 0)}
}

const movingPoints = 201

func everywhere() (Range, []float64) {
	g := grid.New(-30, 70, movingPoints)
	return Range{From: -1e3, To: 1e6, Inner: -20, Outer: 60, GridStart: g.Start, Dx: g.Dx, GridPoints: g.N}, g.Rho()
}

func largest(a []float64) float64 {
	m := 0.0
	for _, v := range a {
		m = max(m, math.Abs(v))
	}
	return m
}

func difference(a, b []float64) float64 {
	m := 0.0
	for i := range a {
		m = max(m, math.Abs(a[i]-b[i]))
	}
	return m
}

// TestMovingOnACircle: the forcing of a circular orbit is Stationary's, value
// and, up to the interpolation in time, derivatives, during the ramp and after.
func TestMovingOnACircle(t *testing.T) {
	where, rho := everywhere()
	w := circular(10)
	omega := math.Pow(10, -1.5)
	k, ramp := NewKernel(0.95, 16), Ramp{Centre: 80, Width: 17}
	var f, g, om []float64
	for _, m := range modes() {
		a, b := m.At(w)
		f, g, om = append(f, real(a)), append(g, real(b)), append(om, float64(m.M)*omega)
	}
	still := NewStationary(rho, 10+2*math.Log(4), k, ramp, f, g, om)
	const dt = 0.5
	move := NewMoving(circlePath{*w}, k, ramp, modes(), where, dt)
	for _, step := range []int{100, 170, 1000} {
		at := float64(step) * dt
		a, b := make([]float64, movingPoints*grid.Lanes), make([]float64, movingPoints*grid.Lanes)
		still.Add(a, at)
		move.Add(b, at)
		size := largest(a)
		if d := difference(a, b); d > 1e-13*(size+1e-3) {
			t.Errorf("t = %g: the forcings differ by %.3g of %.3g", at, d, size)
		}
		still.Prepare(at, dt)
		move.Prepare(at, dt)
		// What a Taylor step adds is dt^j/j! of the j-th derivative. Measured at
		// worst: 1.5e-12, the round-off of differences of samples dt/4 apart.
		factor := 1.0
		for j := 0; j <= 8; j++ {
			if j > 0 {
				factor *= dt / float64(j)
			}
			clear(a)
			clear(b)
			still.AddDerivative(a, j, factor)
			move.AddDerivative(b, j, factor)
			if d := difference(a, b); d > 3e-12 {
				t.Errorf("t = %g: dt^%d/%d! times the derivative differs by %.3g", at, j, j, d)
			}
		}
		clear(b)
		move.AddDerivative(b, 9, 1)
		if largest(b) != 0 {
			t.Errorf("the ninth derivative of a polynomial of degree 8 is not zero")
		}
	}
}

// TestMovingIsItsFormula on a path that moves in and out, lane by lane.
func TestMovingIsItsFormula(t *testing.T) {
	where, rho := everywhere()
	k, ramp := NewKernel(1.1, 12), Ramp{Centre: 20, Width: 17}
	move := NewMoving(swingPath{3}, k, ramp, modes(), where, 0.5)
	for _, at := range []float64{13.2, 40.7, 61} {
		var s worldline.State
		swingPath{3}.At(at, &s)
		on := (1 + math.Erf((at-20)/17)) / 2
		dst := make([]float64, movingPoints*grid.Lanes)
		move.Add(dst, at)
		for q, m := range modes() {
			f, g := m.At(&Motion{R: s.R, Y: s.Y, P: s.P, Phi: 0.03 * at, E: s.E, L: s.L})
			for i, x := range rho {
				d, d1 := k.At(x - s.Rstar)
				want := complex(-on*d, 0)*g + complex(-on*d1, 0)*f
				got := complex(dst[i*grid.Lanes+2*q], dst[i*grid.Lanes+2*q+1])
				if e := got - want; math.Hypot(real(e), imag(e)) > 1e-14 {
					t.Errorf("(%d,%d) at t = %g, r_* = %g: %v, want %v", m.L, m.M, at, x, got, want)
				}
			}
		}
	}
}

// TestMovingConverges: on a path that moves, the Taylor sum of a step, sum
// (theta dt)^j/j! s^(j), reproduces the forcing inside the step with the order
// of a degree-8 interpolation.
func TestMovingConverges(t *testing.T) {
	where, _ := everywhere()
	k := NewKernel(2, 16)
	miss := func(dt float64) float64 {
		move := NewMoving(swingPath{3}, k, On(), modes(), where, dt)
		worst := 0.0
		a, b := make([]float64, movingPoints*grid.Lanes), make([]float64, movingPoints*grid.Lanes)
		for step := 0; step < int(48/dt); step++ {
			at := float64(step) * dt
			move.Prepare(at, dt)
			for _, theta := range []float64{0.13, 0.6, 0.95} {
				clear(a)
				clear(b)
				factor := 1.0
				for j := 0; j <= 8; j++ {
					if j > 0 {
						factor *= theta * dt / float64(j)
					}
					move.AddDerivative(a, j, factor)
				}
				move.Add(b, at+theta*dt)
				worst = max(worst, difference(a, b))
			}
		}
		return worst
	}
	a, b := miss(8), miss(4)
	if got := math.Log2(a / b); math.Abs(got-9) > 1 {
		t.Errorf("errors %.3g and %.3g, order %.2f instead of 9", a, b, got)
	}
}

// TestMovingKeepsNoMemory: what a step gives depends on its time alone, bit for
// bit, not on the steps before it.
func TestMovingKeepsNoMemory(t *testing.T) {
	where, _ := everywhere()
	k, ramp := NewKernel(1, 12), Ramp{Centre: 20, Width: 5}
	const dt = 0.5
	whole := NewMoving(swingPath{3}, k, ramp, modes(), where, dt)
	for step := 0; step < 80; step++ {
		at := float64(step) * dt
		whole.Prepare(at, dt)
		fresh := NewMoving(swingPath{3}, k, ramp, modes(), where, dt)
		fresh.Prepare(at, dt)
		for j := 0; j <= 8; j += 4 {
			a, b := make([]float64, movingPoints*grid.Lanes), make([]float64, movingPoints*grid.Lanes)
			whole.AddDerivative(a, j, 1)
			fresh.AddDerivative(b, j, 1)
			if d := difference(a, b); d != 0 {
				t.Fatalf("step %d, derivative %d: %.3g apart from a fresh start", step, j, d)
			}
		}
	}
	dst := make([]float64, movingPoints*grid.Lanes)
	step := 80
	if n := testing.AllocsPerRun(20, func() {
		whole.Prepare(float64(step)*dt, dt)
		whole.AddDerivative(dst, 3, 0.1)
		step++
	}); n != 0 {
		t.Errorf("%g allocations a step", n)
	}
	if n := testing.AllocsPerRun(20, func() { whole.Add(dst, 33.3) }); n != 0 {
		t.Errorf("%g allocations where a stepper asks for the forcing itself", n)
	}
}

// TestMovingIsCut outside its span of time and its range of r_*, and at the ends
// of the grid.
func TestMovingIsCut(t *testing.T) {
	where, _ := everywhere()
	k := NewKernel(1, 12)
	sum := func(where Range, at float64) float64 {
		dst := make([]float64, movingPoints*grid.Lanes)
		NewMoving(swingPath{3}, k, On(), modes(), where, 0.5).Add(dst, at)
		return largest(dst)
	}
	if sum(where, 10) == 0 {
		t.Error("no forcing at all")
	}
	late, early, inner, outer, short := where, where, where, where, where
	late.From, early.To = 11, 9
	inner.Inner, outer.Outer = 30, 0
	short.GridPoints = 40 // ends at r_* = -10
	for name, r := range map[string]Range{"before": late, "after": early, "too far in": inner, "too far out": outer, "beyond the grid": short} {
		if v := sum(r, 10); v != 0 {
			t.Errorf("%s: %g", name, v)
		}
	}
	five := append(modes(), NewMasterSource(5, 5))
	if !panics(func() { NewMoving(swingPath{3}, k, On(), five, where, 0.5) }) {
		t.Error("five modes in a block of four: no panic")
	}
}
