package wire

import (
	"context"
	"fmt"
	"math"
	"time"

	"nullmark/configs"
	"nullmark/equations"
	"nullmark/equations/evolve"
	"nullmark/equations/semi"
	"nullmark/extract/pulse"
	"nullmark/extract/result"
	"nullmark/extract/ringing"
	"nullmark/grid/march"
	"nullmark/grid/stencil"
	"nullmark/hyperboloidal"
)

// Pulses of the Teukolsky equation whose l are coupled, or whose spin weight is
// not zero: one evolution a mode, with the pulse in its own l alone.
const (
	coupledTaylor    = 8
	coupledSteepness = 2.0
	// The field of spin weight +2 grows from round-off at a deep inner end.
	absorbingInner = 6.5
	absorbingStart = 3.0
	fastestPulse   = 0.95 // largest |a|
	// Nanoseconds per point, l and stage of the coupled evolution.
	nsPerCoupledPoint = 25.0
	slowestDecay      = 0.08 // damping rate at which ringingSpan suffices
)

// coupledPulse is what the coupled evolutions of a case share.
type coupledPulse struct {
	layers hyperboloidal.KerrLayers
	weight int // spin weight
	digits float64
}

// isCoupled tells whether a pulse needs the coupled evolution: every case of the
// Teukolsky equation but a scalar field on a hole without spin.
func isCoupled(c *configs.Case) bool {
	return c.Waves.Equation == configs.Teukolsky && (c.Waves.SpinWeight != 0 || c.Hole.Spin != 0)
}

// couple turns the scheme into that of the coupled evolution.
func (s *pulseScheme) couple(c *configs.Case) error {
	h, err := hyperboloidal.NewKerr(c.Hole.Spin)
	if err != nil {
		return err
	}
	if c.Waves.SpinWeight > 0 {
		s.domain.Ri = math.Min(s.pulse.Centre-s.pulse.Reach(), absorbingStart)
		s.domain.Si = s.domain.Ri - absorbingInner
	}
	s.taylor = coupledTaylor
	s.coupled = &coupledPulse{
		layers: hyperboloidal.KerrLayers{Hole: h, Si: s.domain.Si, Ri: s.domain.Ri, Ro: s.domain.Ro, So: s.domain.So, Steepness: coupledSteepness},
		weight: c.Waves.SpinWeight,
		digits: -math.Log10(math.Max(c.Accuracy.Relative, 1e-12)),
	}
	return nil
}

// damping is the smallest damping rate among the case's fundamentals.
func damping(c *configs.Case) float64 {
	least := slowestDecay
	for _, lm := range c.ModeList() {
		if w, err := ringing.Frequency(c.Hole.Spin, c.Waves.SpinWeight, lm[0], lm[1], 0); err == nil {
			least = math.Min(least, -imag(w))
		}
	}
	return least
}

// angular is how many l are carried for a mode, the coarser rung one less.
func (p *coupledPulse) angular(l, m, back int) int {
	n := l - (equations.Teukolsky{S: p.weight, M: m}).LMin() + 1
	if p.layers.Hole.Spin() == 0 {
		return n
	}
	return n + 2 + int(math.Ceil(p.digits*math.Abs(p.layers.Hole.Spin()))) - back
}

// evolveCoupled runs one field.
func (s *pulseScheme) evolveCoupled(ctx context.Context, f pulseField, dx float64, back int, did func(float64)) (*pulseRun, error) {
	start := time.Now()
	g := s.grid(dx)
	if err := s.pulse.Check(s.domain.Ri, s.domain.Ro, g.Dx); err != nil {
		return nil, err
	}
	l, m := f.modes[0][0], f.modes[0][1]
	eq := equations.Teukolsky{S: s.coupled.weight, M: m, Spin: s.coupled.layers.Hole.Spin()}
	geo, err := semi.NewCoupledGeometry(s.coupled.layers, eq, s.coupled.angular(l, m, back), g, s.order)
	if err != nil {
		return nil, err
	}
	own := l - geo.Coupling.LMin
	per := s.steps(g)
	length := geo.Length()
	stepper := march.NewCompensated(semi.NewCoupled(geo, nil), s.taylor, length)
	run := &evolve.Run{
		Stepper: stepper, State: make([]float64, length), Dt: s.sample / float64(per), Limit: 1e30,
		Locate: func(i int) (string, string) {
			p := geo.Points[i%(length/2)/geo.Stride()]
			return fmt.Sprintf("rho = %.6g", p.Rho), fmt.Sprintf("l = %d, m = %d", geo.Coupling.LMin+i%geo.Stride()%geo.Modes, m)
		},
	}
	s.pulse.Fill(run.State, g.Rho(), geo.Stride(), own)
	if s.filter > 0 {
		filter := stencil.NewHighPass(s.filter, 0.5, length/2)
		stepper.Increment = func(inc, u []float64) {
			filter.Add(inc[:length/2], u[:length/2], geo.Stride())
			filter.Add(inc[length/2:], u[length/2:], geo.Stride())
		}
	}
	rec := &coupledRecorder{per: per, stride: geo.Stride(), re: own, im: geo.Modes + own}
	h := s.coupled.layers.Hole
	rec.first, rec.weights = lagrange((h.Tortoise(s.radius-h.OuterHorizon())-g.Start)/g.Dx, g.N, s.order)
	rec.signals = s.emptySignals()
	run.Observers = []evolve.Observer{rec}
	for left := s.samples() * per; left > 0; {
		c := min(left, 128)
		if err := run.Advance(ctx, c); err != nil {
			return nil, err
		}
		left -= c
		did(float64(c * g.N))
	}
	return &pulseRun{
		Signals: [][pulsePlaces]pulse.Signal{rec.signals},
		Rung: result.Rung{Points: g.N, Dx: g.Dx, Dt: run.Dt, Order: s.order, Angular: geo.Modes, Until: run.Time(),
			CoreSeconds: time.Since(start).Seconds()},
	}, nil
}

// coupledRecorder keeps one complex field of a state at the three places; re and
// im are its numbers within a point.
type coupledRecorder struct {
	signals        [pulsePlaces]pulse.Signal
	per            int
	stride, re, im int
	first          int
	weights        []float64
}

// Observe implements the evolution's observer.
func (r *coupledRecorder) Observe(step int, _ float64, u []float64) {
	if step%r.per != 0 {
		return
	}
	half := len(u) / 2
	at := func(point int) (psi, pi complex128) {
		k := point * r.stride
		return complex(u[k+r.re], u[k+r.im]), complex(u[half+k+r.re], u[half+k+r.im])
	}
	keep := func(place int, psi, pi complex128) {
		s := &r.signals[place]
		s.Psi, s.Pi = append(s.Psi, psi), append(s.Pi, pi)
	}
	psi, pi := at(half/r.stride - 1)
	keep(atInfinity, psi, pi)
	psi, pi = at(0)
	keep(atHorizon, psi, pi)
	psi, pi = 0, 0
	for j, w := range r.weights {
		a, b := at(r.first + j)
		psi += complex(w, 0) * a
		pi += complex(w, 0) * b
	}
	keep(atRadius, psi, pi)
}
