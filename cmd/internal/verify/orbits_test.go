package verify

import (
	"context"
	"strings"
	"testing"

	"nullmark/extract/result"
)

// TestOrbitChecksReadTheirNumbers: a result that holds the published numbers passes
// each check of other orbits, one that is off by twice the tolerance and bar fails,
// and one without the number says so.
func TestOrbitChecksReadTheirNumbers(t *testing.T) {
	checks := orbitChecks()
	for i, c := range checks {
		for _, off := range []float64{0, 2} {
			v := result.Q{Value: c.Published + off*2*c.Tolerance, Error: c.Tolerance}
			flux := func() *result.Flux { return &result.Flux{Energy: v, AngularMomentum: v} }
			r := &result.Result{Total: &result.Total{Infinity: flux(), Horizon: flux(), Recoil: &result.Recoil{Speed: v}}}
			for _, lm := range [][2]int{{2, 2}, {2, 1}, {3, 3}} {
				if strings.Contains(c.Name, "l = 2") && lm != [2]int{2, 2} {
					continue // a sum over the modes of l = 2
				}
				r.Modes = append(r.Modes, result.Mode{L: lm[0], M: lm[1], Infinity: flux(), Horizon: flux(), Peak: &result.Peak{Amplitude: v, Frequency: v}})
			}
			out, err := Run(context.Background(), checks[i:i+1], func(context.Context, Case, int, int) (*result.Bundle, error) {
				return &result.Bundle{Result: r}, nil
			}, true)
			if err != nil || out.Passed != (off == 0) {
				t.Errorf("%s, off by %g: passed %v, %v", c.Name, off, out.Passed, err)
			}
		}
		out, err := Run(context.Background(), checks[i:i+1], func(context.Context, Case, int, int) (*result.Bundle, error) {
			return &result.Bundle{Result: &result.Result{}}, nil
		}, true)
		if err != nil || out.Passed {
			t.Errorf("%s: an empty result passes (%v)", c.Name, err)
		}
	}
}
