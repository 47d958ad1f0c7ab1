// Package coupled runs the evolution of one azimuthal number of the Teukolsky
// equation with a particle: it puts slicing, grid, coupled equation, forcing and
// stepper together and returns the fields of all l at null infinity and at the
// horizon, every time step.
package coupled

import (
	"context"
	"fmt"
	"math"
	"slices"

	"nullmark/equations"
	"nullmark/equations/evolve"
	"nullmark/equations/semi"
	"nullmark/grid"
	"nullmark/grid/march"
	"nullmark/grid/stencil"
	"nullmark/hyperboloidal"
	"nullmark/source"
	"nullmark/source/worldline"
)

// Rung is one resolution: everything that can err.
type Rung struct {
	Layers  hyperboloidal.KerrLayers
	Points  int     // grid points, ends included
	Dt      float64 // time step
	Kernel  float64 // width of the smoothed delta
	Moments int
	Order   int // of the differences
	Taylor  int // order in time; a moving source carries it to 8
	Angular int // l's carried at this m
	Filter  int // 2q of the filter applied once a step, 0 = none
	Ramp    source.Ramp
}

// Dx returns the grid spacing.
func (r Rung) Dx() float64 { return (r.Layers.So - r.Layers.Si) / float64(r.Points-1) }

// Equation names the field that is evolved.
type Equation struct{ S, M int }

// The two ends of the grid, as indices of Fields: null infinity and the horizon.
const (
	Infinity = 0
	Horizon  = 1
)

// Fields are the samples of one evolution: sample k belongs to slicing time
// k Dt; Phi[end][i] and Pi[end][i] are the field of l = LMin + i and its time
// derivative at one end of the grid.
type Fields struct {
	LMin    int
	Dt      float64
	Si, So  float64 // u = tau - So at null infinity, v = tau + Si at the horizon
	Phi, Pi [2][][]complex128
}

// Until is the time of the last sample.
func (f *Fields) Until() float64 { return float64(len(f.Phi[0][0])-1) * f.Dt }

func newFields(lmin, n int, r Rung) Fields {
	f := Fields{LMin: lmin, Dt: r.Dt, Si: r.Layers.Si, So: r.Layers.So}
	for e := range f.Phi {
		f.Phi[e] = make([][]complex128, n)
		f.Pi[e] = make([][]complex128, n)
	}
	return f
}

// grow makes room for steps more samples.
func (f *Fields) grow(steps int) {
	for e := range f.Phi {
		for l := range f.Phi[e] {
			f.Phi[e][l] = slices.Grow(f.Phi[e][l], steps)
			f.Pi[e][l] = slices.Grow(f.Pi[e][l], steps)
		}
	}
}

// observe appends the two ends of the state [Phi][Pi], 2n numbers a point.
func (f *Fields) observe(u []float64) {
	n, half := len(f.Phi[0]), len(u)/2
	for e, at := range [2]int{half - 2*n, 0} {
		for l := range n {
			f.Phi[e][l] = append(f.Phi[e][l], complex(u[at+l], u[at+n+l]))
			f.Pi[e][l] = append(f.Pi[e][l], complex(u[half+at+l], u[half+at+n+l]))
		}
	}
}

// Run is an evolution that can be continued.
type Run struct {
	Fields Fields
	geo    *semi.CoupledGeometry
	inner  evolve.Run
}

// Carrier returns what a forcing needs to know of the grid.
func carrier(geo *semi.CoupledGeometry) source.KerrCarrier {
	return source.KerrCarrier{
		Slicing: geo.Slicing, Points: geo.Points,
		S: geo.Equation.S, M: geo.Equation.M,
		LMin: geo.Coupling.LMin, N: geo.Modes, Finish: geo.Solve,
	}
}

// geometry samples the equation of a rung.
func geometry(q Equation, r Rung) (*semi.CoupledGeometry, error) {
	eq := equations.Teukolsky{S: q.S, M: q.M, Spin: r.Layers.Hole.Spin()}
	return semi.NewCoupledGeometry(r.Layers, eq, r.Angular, grid.New(r.Layers.Si, r.Layers.So, r.Points), r.Order)
}

// Circular starts the evolution of a particle on a circular equatorial orbit,
// k its state at t = 0 and omega its angular velocity.
func Circular(q Equation, r Rung, k worldline.KerrState, omega float64) (*Run, error) {
	geo, err := geometry(q, r)
	if err != nil {
		return nil, err
	}
	kern := source.NewKernel(r.Kernel, r.Moments)
	return start(geo, r, source.NewTeukolskyCircular(carrier(geo), k, omega, kern, r.Ramp)), nil
}

// Moving starts the evolution of a sampled worldline, whose step must be a
// quarter of r.Dt.
func Moving(q Equation, r Rung, track source.KerrTrack) (*Run, error) {
	geo, err := geometry(q, r)
	if err != nil {
		return nil, err
	}
	kern := source.NewKernel(r.Kernel, r.Moments)
	return start(geo, r, source.NewTeukolskyMoving(carrier(geo), track, kern, r.Ramp)), nil
}

// filterStrength is how much of a grid-scale wave the filter takes a step.
const filterStrength = 0.5

func start(geo *semi.CoupledGeometry, r Rung, forcing semi.Forcing) *Run {
	run := &Run{geo: geo}
	run.Fields = newFields(geo.Coupling.LMin, geo.Modes, r)
	sys := semi.NewCoupled(geo, forcing)
	length := geo.Length()
	stepper := march.NewCompensated(sys, r.Taylor, length)
	run.inner = evolve.Run{
		Stepper: stepper,
		State:   make([]float64, length),
		Dt:      r.Dt,
		Limit:   1e30,
		Locate:  run.locate,
	}
	run.inner.Observers = []evolve.Observer{run}
	if r.Filter > 0 {
		f := stencil.NewHighPass(r.Filter, filterStrength, length/2)
		stepper.Increment = func(inc, u []float64) {
			f.Add(inc[:length/2], u[:length/2], geo.Stride())
			f.Add(inc[length/2:], u[length/2:], geo.Stride())
		}
	}
	return run
}

// Observe implements evolve.Observer.
func (r *Run) Observe(_ int, _ float64, u []float64) { r.Fields.observe(u) }

// locate names the place of a state index.
func (r *Run) locate(index int) (place, mode string) {
	st := r.geo.Stride()
	i := index % (st * r.geo.Grid.N)
	p := r.geo.Points[i/st]
	place = "null infinity"
	if p.X > 0 {
		place = fmt.Sprintf("r = %.6g", 1/p.X)
	}
	return place, fmt.Sprintf("l = %d, m = %d", r.Fields.LMin+i%st%r.geo.Modes, r.geo.Equation.M)
}

// Until continues the evolution to the first step at or after time t.
func (r *Run) Until(ctx context.Context, t float64) error {
	n := int(math.Ceil(t/r.inner.Dt-1e-9)) - r.inner.Steps
	if n <= 0 {
		return nil
	}
	r.Fields.grow(n + 1)
	return r.inner.Advance(ctx, n)
}
