// Package evolve is the driver of an evolution: the loop over time steps, the
// observers that read the state, the detection of failure. It does not know
// what is observed.
package evolve

import (
	"context"
	"fmt"
	"math"

	"nullmark/grid/march"
)

// Observer reads the state after each step; it must not modify u. Step 0 is
// the initial state.
type Observer interface {
	Observe(step int, t float64, u []float64)
}

// Failure is a numerical failure: a value that is not finite or has outgrown
// any solution of the equations.
type Failure struct {
	Step  int
	Time  float64
	Index int     // index into the state vector
	Value float64 // the value found there
	// Place and Mode say in words where Index lies; the maker of the run
	// fills them in through Locate.
	Place string
	Mode  string
}

// Error is one sentence.
func (f *Failure) Error() string {
	s := fmt.Sprintf("the evolution broke down at step %d, time %.6g: value %g", f.Step, f.Time, f.Value)
	if f.Place != "" {
		s += " at " + f.Place
	}
	if f.Mode != "" {
		s += " in mode " + f.Mode
	}
	return s
}

// Run is one evolution that can be continued: state, time, stepper. Times are
// Start + Steps*Dt, never accumulated.
type Run struct {
	Stepper   march.Stepper
	State     []float64
	Start, Dt float64
	Steps     int // steps done
	Observers []Observer
	// AfterStep, if set, modifies the state after each step (a filter).
	AfterStep func(t float64, u []float64)
	// Limit is the magnitude beyond which a value is a failure.
	Limit float64
	// Locate, if set, names the place and mode of a state index.
	Locate func(index int) (place, mode string)
	// CheckEvery is how many steps lie between two looks at the whole state
	// and at the context (default 64).
	CheckEvery int
}

// Time is the time of the current state.
func (r *Run) Time() float64 { return r.Start + float64(r.Steps)*r.Dt }

// Advance does n more steps. It returns the context's error when that is
// cancelled, and a *Failure when the state breaks down; the state is then the
// one found.
func (r *Run) Advance(ctx context.Context, n int) error {
	every := r.CheckEvery
	if every <= 0 {
		every = 64
	}
	if r.Steps == 0 && n > 0 {
		for _, o := range r.Observers {
			o.Observe(0, r.Start, r.State)
		}
	}
	for k := 0; k < n; k++ {
		r.Stepper.Step(r.State, r.Time(), r.Dt)
		r.Steps++
		if r.AfterStep != nil {
			r.AfterStep(r.Time(), r.State)
		}
		for _, o := range r.Observers {
			o.Observe(r.Steps, r.Time(), r.State)
		}
		if r.Steps%every == 0 || k == n-1 {
			if err := ctx.Err(); err != nil {
				return err
			}
			if err := r.check(); err != nil {
				return err
			}
		}
	}
	return nil
}

func (r *Run) check() error {
	limit := r.Limit
	if limit <= 0 {
		limit = math.MaxFloat64
	}
	for i, v := range r.State {
		if !(math.Abs(v) <= limit) {
			f := &Failure{Step: r.Steps, Time: r.Time(), Index: i, Value: v}
			if r.Locate != nil {
				f.Place, f.Mode = r.Locate(i)
			}
			return f
		}
	}
	return nil
}
