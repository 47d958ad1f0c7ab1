package wire

import (
	"context"
	"math"
	"math/cmplx"
	"testing"

	"nullmark/configs"
)

// shippedPulse reads a case that comes with the tool, shortened by the changes.
func shippedPulse(t *testing.T, name string, changes ...string) *configs.Case {
	t.Helper()
	text, err := configs.ShippedFile(name)
	if err != nil {
		t.Fatal(err)
	}
	c, err := configs.Reader{Sets: changes, Checks: Checks()}.Parse(name, text)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := MakePlan(c); err != nil {
		t.Fatal(err)
	}
	return c
}

// TestShippedPulses runs the shipped cases of pulses in a short form, through the
// same doors as the commands.
func TestShippedPulses(t *testing.T) {
	shippedPulse(t, "kerr-ringing.yaml")
	b, err := Run(context.Background(), shippedPulse(t, "ringing.yaml", "waves.modes=[[2,2]]", "accuracy.relative=1e-8", "pulse.width=2", "pulse.shape=compact"), Options{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	for _, r := range b.Result.Ringing {
		if _, ratio := offBy(r, publishedTones()[pulseTone{2, 2, r.N}]); ratio < 1 {
			t.Errorf("%+v", r)
		}
	}
	if len(b.Result.Ringing) != 4 || !b.Result.Accuracy.Met {
		t.Errorf("%d frequencies, %+v", len(b.Result.Ringing), b.Result.Accuracy)
	}
	// The stored tones are the wave itself, but for the tail, from the fit on.
	m := b.Series.Modes[0]
	compared, apart, size := 0, 0.0, 0.0
	for k := range b.Series.U {
		if !cmplx.IsNaN(m.Tones[k]) && compared < 40 {
			compared++
			apart, size = math.Max(apart, cmplx.Abs(m.Tones[k]-m.Wave[k])), math.Max(size, cmplx.Abs(m.Wave[k]))
		}
	}
	if compared < 40 || !(apart < 0.05*size) {
		t.Errorf("%d samples compared, apart by %g of %g", compared, apart, size)
	}

	b, err = Run(context.Background(), shippedPulse(t, "tail.yaml", "span.until=1200", "accuracy.relative=1e-6"), Options{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	want := map[string]float64{"infinity": 4, "horizon": 7, "radius 10": 7} // R. H. Price, Phys. Rev. D 5, 2419 (1972)
	for _, g := range b.Result.Tail {
		if d := math.Abs(g.Exponent.Value - want[g.Where]); d > g.Exponent.Error || d > 0.1 {
			t.Errorf("%+v", g)
		}
	}
	if len(b.Result.Tail) != 3 || len(b.Series.Decay) != 3 {
		t.Errorf("%d tails, %d local indices: %v", len(b.Result.Tail), len(b.Series.Decay), b.Result.Warnings)
	}
}
