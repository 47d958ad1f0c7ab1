package wire

import (
	"context"
	"fmt"
	"math"
	"time"

	"nullmark/equations"
	"nullmark/equations/evolve"
	"nullmark/equations/semi"
	"nullmark/extract/pulse"
	"nullmark/extract/result"
	"nullmark/grid"
	"nullmark/grid/march"
	"nullmark/grid/stencil"
	"nullmark/hyperboloidal"
	"nullmark/source"
)

// The places where a pulse's field is recorded.
const (
	atInfinity = iota
	atHorizon
	atRadius
	pulsePlaces
)

// pulseField is one field to evolve: the modes that obey the same equation from
// the same initial data share it.
type pulseField struct {
	name      string
	potential equations.Potential
	modes     [][2]int
}

// pulseScheme is every choice of a pulse's run.
type pulseScheme struct {
	pulse   source.Pulse
	domain  hyperboloidal.Layers
	order   int
	taylor  int
	courant float64 // dt/dx at most
	filter  int     // order of the filter, 0 = none
	radius  float64 // where the field is recorded besides the two ends
	until   float64 // last retarded time at null infinity
	sample  float64 // between two samples kept
	stored  int     // every how many of these are stored
	dx      float64 // of the finest rung asked for at first
	coupled *coupledPulse
}

// pulseRun is what one rung leaves of one block of fields: Signals[q][place].
type pulseRun struct {
	Signals [][pulsePlaces]pulse.Signal
	Rung    result.Rung
}

// grid returns the grid whose spacing is dx or a little less.
func (s *pulseScheme) grid(dx float64) grid.Grid {
	n := int(math.Ceil((s.domain.So-s.domain.Si)/dx)) + 1
	return grid.New(s.domain.Si, s.domain.So, n)
}

// steps is how many time steps lie between two samples on a grid.
func (s *pulseScheme) steps(g grid.Grid) int {
	return int(math.Ceil(s.sample / (s.courant * g.Dx)))
}

// samples is how many samples a run keeps after the first.
func (s *pulseScheme) samples() int {
	return int(math.Ceil((s.until + s.domain.So) / s.sample))
}

// evolve runs up to grid.Lanes fields on the grid of spacing dx.
func (s *pulseScheme) evolve(ctx context.Context, fields []pulseField, dx float64, did func(float64)) (*pulseRun, error) {
	start := time.Now()
	g := s.grid(dx)
	if err := s.pulse.Check(s.domain.Ri, s.domain.Ro, g.Dx); err != nil {
		return nil, err
	}
	geo, err := semi.NewGeometry(s.domain, g, s.order)
	if err != nil {
		return nil, err
	}
	var pots []equations.Potential
	for _, f := range fields {
		pots = append(pots, f.potential)
	}
	sys := semi.NewMaster(geo, pots, nil)
	per := s.steps(g)
	run := &evolve.Run{
		Stepper: march.NewTaylor(sys, s.taylor, sys.Length()), State: make([]float64, sys.Length()),
		Dt: s.sample / float64(per), Limit: 1e8,
		Locate: func(i int) (string, string) {
			p := geo.Points[i%(sys.Length()/2)/grid.Lanes]
			mode := "an empty lane"
			if q := i % grid.Lanes; q < len(fields) {
				mode = fields[q].name
			}
			return fmt.Sprintf("rho = %.6g (r = %.6g)", p.Rho, p.R), mode
		},
	}
	for q := range fields {
		s.pulse.Fill(run.State, g.Rho(), grid.Lanes, q)
	}
	if s.filter > 0 {
		f := stencil.NewFilter(s.filter, 0.5)
		scratch := make([]float64, sys.Length()/2)
		run.AfterStep = func(_ float64, u []float64) {
			f.Apply(u[:len(u)/2], scratch, grid.Lanes)
			f.Apply(u[len(u)/2:], scratch, grid.Lanes)
		}
	}
	rec := s.recorder(g, len(fields), per)
	run.Observers = []evolve.Observer{rec}
	for left := s.samples() * per; left > 0; {
		c := min(left, 256)
		if err := run.Advance(ctx, c); err != nil {
			return nil, err
		}
		left -= c
		did(float64(c * g.N))
	}
	return &pulseRun{
		Signals: rec.signals,
		Rung: result.Rung{Points: g.N, Dx: g.Dx, Dt: run.Dt, Order: s.order, Until: run.Time(),
			CoreSeconds: time.Since(start).Seconds()},
	}, nil
}

// pulseRecorder keeps the real fields of a block at the three places.
type pulseRecorder struct {
	signals [][pulsePlaces]pulse.Signal
	per     int
	first   int // point of the first weight
	weights []float64
}

// recorder places the recorder; the field at the radius is interpolated.
func (s *pulseScheme) recorder(g grid.Grid, fields, per int) *pulseRecorder {
	rho := hyperboloidal.TortoiseAt(s.radius)
	r := &pulseRecorder{signals: make([][pulsePlaces]pulse.Signal, fields), per: per}
	r.first, r.weights = lagrange((rho-g.Start)/g.Dx, g.N, s.order)
	for q := range r.signals {
		r.signals[q] = s.emptySignals()
	}
	return r
}

// emptySignals has room for a whole run.
func (s *pulseScheme) emptySignals() (out [pulsePlaces]pulse.Signal) {
	starts := [pulsePlaces]float64{s.domain.Retarded(0), s.domain.Advanced(0), 0}
	n := s.samples() + 1
	for p := range out {
		out[p] = pulse.Signal{Start: starts[p], Step: s.sample,
			Psi: make([]complex128, 0, n), Pi: make([]complex128, 0, n)}
	}
	return out
}

// lagrange returns the weights of the polynomial through order+2 points around
// the place x (in cells) of a grid of n points.
func lagrange(x float64, n, order int) (first int, w []float64) {
	m := order + 2
	first = max(0, min(int(math.Floor(x))-m/2+1, n-m))
	w = make([]float64, m)
	for i := range w {
		w[i] = 1
		for j := range w {
			if j != i {
				w[i] *= (x - float64(first+j)) / float64(i-j)
			}
		}
	}
	return first, w
}

// Observe implements the evolution's observer.
func (r *pulseRecorder) Observe(step int, _ float64, u []float64) {
	if step%r.per != 0 {
		return
	}
	half := len(u) / 2
	for q := range r.signals {
		keep := func(place int, psi, pi float64) {
			s := &r.signals[q][place]
			s.Psi = append(s.Psi, complex(psi, 0))
			s.Pi = append(s.Pi, complex(pi, 0))
		}
		inf := half - grid.Lanes + q
		keep(atInfinity, u[inf], u[half+inf])
		keep(atHorizon, u[q], u[half+q])
		psi, pi := 0.0, 0.0
		for j, w := range r.weights {
			at := (r.first+j)*grid.Lanes + q
			psi += w * u[at]
			pi += w * u[half+at]
		}
		keep(atRadius, psi, pi)
	}
}
