package evolve

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"

	"nullmark/grid/march"
)

// oscillators are independent u” = -k^2 u + cos(t), in the layout [u][u'].
type oscillators struct{ at float64 }

func (o *oscillators) Apply(dst, u []float64) {
	n := len(u) / 2
	for i := 0; i < n; i++ {
		k := float64(i + 1)
		dst[i], dst[n+i] = u[n+i], -k*k*u[i]
	}
}

func (o *oscillators) RHS(dst, u []float64, t float64) {
	o.Apply(dst, u)
	for i := len(dst) / 2; i < len(dst); i++ {
		dst[i] += math.Cos(t)
	}
}

func (o *oscillators) Prepare(t, _ float64) { o.at = t }

func (o *oscillators) AddForce(dst []float64, j int, scale float64) {
	for i := len(dst) / 2; i < len(dst); i++ {
		dst[i] += scale * math.Cos(o.at+float64(j)*math.Pi/2)
	}
}

// trace records what an observer sees.
type trace struct {
	steps []int
	times []float64
	first []float64
}

func (o *trace) Observe(step int, t float64, u []float64) {
	o.steps, o.times, o.first = append(o.steps, step), append(o.times, t), append(o.first, u[0])
}

const length = 6

func stepper(name string) march.Stepper {
	if name == "Taylor" {
		return march.NewTaylor(&oscillators{}, 7, length)
	}
	return march.NewRungeKutta(&oscillators{}, march.RK8(), length)
}

func start() []float64 { return []float64{1, -0.5, 0.3, 0, 0.2, -1} }

// TestContinuation: in one go, in pieces, with a new Run around a saved state,
// with other intervals of checking: the same bits, observers and filter
// included.
func TestContinuation(t *testing.T) {
	for _, name := range []string{"Taylor", "Runge-Kutta"} {
		fresh := func() (*Run, *trace) {
			o := &trace{}
			return &Run{
				Stepper: stepper(name), State: start(), Start: 2.5, Dt: 0.1, Observers: []Observer{o},
				AfterStep: func(t float64, u []float64) { u[0] *= 1 - 1e-3*math.Sin(t) },
			}, o
		}
		ctx := context.Background()
		whole, seen := fresh()
		if err := whole.Advance(ctx, 300); err != nil {
			t.Fatal(err)
		}
		pieces, seenToo := fresh()
		pieces.CheckEvery = 1
		for _, n := range []int{0, 1, 0, 63, 64, 100, 72} {
			if err := pieces.Advance(ctx, n); err != nil {
				t.Fatal(err)
			}
		}
		resumed, _ := fresh()
		if err := resumed.Advance(ctx, 123); err != nil {
			t.Fatal(err)
		}
		other, _ := fresh()
		other.Steps, other.State = resumed.Steps, append([]float64(nil), resumed.State...)
		if err := other.Advance(ctx, 177); err != nil {
			t.Fatal(err)
		}
		for i := range whole.State {
			if whole.State[i] != pieces.State[i] || whole.State[i] != other.State[i] {
				t.Errorf("%s: entry %d is %.17g in one go, %.17g in pieces, %.17g resumed", name, i, whole.State[i], pieces.State[i], other.State[i])
			}
		}
		if fmt.Sprint(*seen) != fmt.Sprint(*seenToo) {
			t.Errorf("%s: the observers saw different things", name)
		}
		if len(seen.steps) != 301 || seen.steps[0] != 0 || seen.first[0] != 1 || seen.steps[300] != 300 {
			t.Errorf("%s: %d observations, the first of step %d", name, len(seen.steps), seen.steps[0])
		}
		for k, at := range seen.times {
			if want := 2.5 + float64(k)*0.1; at != want {
				t.Errorf("%s: step %d at %.17g, want %.17g", name, k, at, want)
			}
		}
		if whole.Time() != seen.times[300] || whole.Steps != 300 {
			t.Errorf("%s: time %g after %d steps", name, whole.Time(), whole.Steps)
		}
	}
}

// breaking sets one entry to a value at a step.
type breaking struct {
	at, index int
	value     float64
	done      int
}

func (b *breaking) Step(u []float64, _, _ float64) {
	b.done++
	if b.done == b.at {
		u[b.index] = b.value
	}
}
func (b *breaking) Order() int              { return 1 }
func (b *breaking) ImaginaryLimit() float64 { return 1 }

// TestFailure: NaN, infinities and values beyond the limit are found at the next
// look, with step, time, place and mode.
func TestFailure(t *testing.T) {
	for _, c := range []struct {
		value, limit float64
		bad          bool
	}{
		{math.NaN(), 0, true}, {math.Inf(1), 0, true}, {math.Inf(-1), 1e8, true},
		{1.001e8, 1e8, true}, {-1.001e8, 1e8, true},
		{1e8, 1e8, false}, {-1e8, 1e8, false}, {1e300, 0, false},
	} {
		o := &trace{}
		run := &Run{
			Stepper: &breaking{at: 10, index: 4, value: c.value}, State: make([]float64, length), Start: 1, Dt: 0.5,
			Limit: c.limit, CheckEvery: 8, Observers: []Observer{o},
			Locate: func(i int) (string, string) { return fmt.Sprintf("point %d", i), "(2,1)" },
		}
		err := run.Advance(context.Background(), 100)
		if !c.bad {
			if err != nil || run.Steps != 100 {
				t.Errorf("value %g under the limit %g: %v after %d steps", c.value, c.limit, err, run.Steps)
			}
			continue
		}
		var f *Failure
		if !errors.As(err, &f) {
			t.Fatalf("value %g: error %v", c.value, err)
		}
		// Broken in step 10, found at the look after step 16.
		if f.Step != 16 || f.Time != 9 || f.Index != 4 || f.Place != "point 4" || f.Mode != "(2,1)" || run.Steps != 16 {
			t.Errorf("value %g: %+v after %d steps", c.value, *f, run.Steps)
		}
		if !(f.Value == c.value || math.IsNaN(f.Value) && math.IsNaN(c.value)) {
			t.Errorf("value %g is reported as %g", c.value, f.Value)
		}
		for _, want := range []string{"step 16", "time 9", "point 4", "(2,1)"} {
			if !strings.Contains(err.Error(), want) {
				t.Errorf("%q does not say %q", err, want)
			}
		}
	}
	// Found at the end of the piece when no look falls inside it.
	run := &Run{Stepper: &breaking{at: 2, value: math.NaN()}, State: make([]float64, length), Dt: 1}
	var f *Failure
	if err := run.Advance(context.Background(), 3); !errors.As(err, &f) || f.Step != 3 || f.Place != "" || strings.Contains(err.Error(), "mode") {
		t.Errorf("error %v", err)
	}
}

// TestInstability: a step beyond the stepper's limit ends in a failure, one
// within it does not.
func TestInstability(t *testing.T) {
	for _, c := range []struct {
		factor float64
		bad    bool
	}{{0.99, false}, {1.5, true}} {
		s := stepper("Taylor")
		run := &Run{Stepper: s, State: start(), Dt: c.factor * s.ImaginaryLimit() / 3, Limit: 1e8} // fastest: k = 3
		err := run.Advance(context.Background(), 3000)
		var f *Failure
		if errors.As(err, &f) != c.bad {
			t.Fatalf("dt at %g of the limit: error %v", c.factor, err)
		}
		if c.bad && f.Index != 2 && f.Index != 5 {
			t.Errorf("the failure is found at %d, the fastest oscillator is at 2 and 5", f.Index)
		}
	}
}

// canceller cancels a context at a step.
type canceller struct {
	at     int
	cancel func()
}

func (c *canceller) Observe(step int, _ float64, _ []float64) {
	if step == c.at {
		c.cancel()
	}
}

// TestCancel: the loop stops at the next look, with the context's error; the
// state is a whole step's and can be continued to the same bits.
func TestCancel(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	run := &Run{Stepper: stepper("Taylor"), State: start(), Dt: 0.1, CheckEvery: 16, Observers: []Observer{&canceller{20, cancel}}}
	if err := run.Advance(ctx, 1000); !errors.Is(err, context.Canceled) || run.Steps != 32 {
		t.Fatalf("error %v after %d steps", err, run.Steps)
	}
	if err := run.Advance(context.Background(), 68); err != nil {
		t.Fatal(err)
	}
	whole := &Run{Stepper: stepper("Taylor"), State: start(), Dt: 0.1}
	if err := whole.Advance(context.Background(), 100); err != nil {
		t.Fatal(err)
	}
	for i := range whole.State {
		if whole.State[i] != run.State[i] {
			t.Errorf("entry %d: %.17g after an interruption, %.17g without", i, run.State[i], whole.State[i])
		}
	}
}

func TestNoAllocation(t *testing.T) {
	run := &Run{Stepper: stepper("Taylor"), State: start(), Dt: 0.01, CheckEvery: 4}
	ctx := context.Background()
	if n := testing.AllocsPerRun(10, func() {
		if err := run.Advance(ctx, 20); err != nil {
			t.Fatal(err)
		}
	}); n != 0 {
		t.Errorf("%g allocations in 20 steps", n)
	}
}
