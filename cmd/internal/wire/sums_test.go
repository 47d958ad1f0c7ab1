package wire

import (
	"fmt"
	"math"
	"path/filepath"
	"strings"
	"testing"

	"nullmark/configs"
	"nullmark/extract/result"
)

// TestSumsOverLSayWhetherTheyHaveEnded: at r0 = 10 with l <= 5 the modes (4,m)
// and (5,m) are 1e-6 of the sum over l at m = 1, 1e-5 at m = 2, but 1.4e-3 at
// m = 3 (values of the independent table), and 1e-4 is asked.
func TestSumsOverLSayWhetherTheyHaveEnded(t *testing.T) {
	res := run(t, read(t, "accuracy.relative=1e-4", "waves.l_max=5")).Result
	for _, p := range res.PerM {
		if want := p.M <= 2; p.LConverged != want {
			t.Errorf("m = %d: converged %v, want %v", p.M, p.LConverged, want)
		}
	}
	res = run(t, read(t, "accuracy.relative=1e-4", "waves.modes=[[2,2],[3,2],[4,2]]")).Result
	if len(res.PerM) != 1 || res.PerM[0].LConverged {
		t.Errorf("a sum over listed modes is said to be whole: %+v", res.PerM)
	}
	at := func(e float64) *result.Flux { return &result.Flux{Energy: result.Q{Value: e}} }
	for _, c := range []struct {
		parts []*result.Flux
		want  bool
	}{
		{[]*result.Flux{at(1), at(4e-3), at(5e-3)}, true},
		{[]*result.Flux{at(1), at(6e-3), at(5e-3)}, false},
		{[]*result.Flux{at(-1), at(4e-3), at(-5e-3)}, true},
		{[]*result.Flux{at(1)}, false},
		{[]*result.Flux{nil, nil}, true},
	} {
		if got := settled(c.parts, 1e-2); got != c.want {
			t.Errorf("%d parts: %v, want %v", len(c.parts), got, c.want)
		}
	}
}

// TestSpanIsInRetardedTime: the series end at the asked retarded time.
func TestSpanIsInRetardedTime(t *testing.T) {
	for _, c := range []struct {
		file  string
		until float64
	}{{"circular.yaml", 700}, {"eccentric.yaml", 1700}} {
		sets := []string{fmt.Sprintf("span.until=%g", c.until), "accuracy.relative=1e-4", "waves.modes=[[2,2]]", "numerics.rungs=2"}
		kase, err := configs.Reader{Sets: sets, Checks: Checks()}.Read(filepath.Join("..", "..", "..", "configs", c.file))
		if err != nil {
			t.Fatal(err)
		}
		u := run(t, kase).Series.U
		if end := u[len(u)-1]; math.Abs(end-c.until) > 0.5 {
			t.Errorf("%s: the series end at u = %g, want %g", c.file, end, c.until)
		}
	}
}

// TestTailOfARadialFall: modes without angular momentum, each l a seventh of the
// one before, have a tail of a sixth of the last.
func TestTailOfARadialFall(t *testing.T) {
	c := read(t, "waves.l_max=5")
	res := &result.Result{}
	for l, e := 2, 7.0*7*7; l <= 5; l, e = l+1, e/7 {
		res.Modes = append(res.Modes, result.Mode{L: l, Infinity: &result.Flux{Energy: result.Q{Value: e}}})
	}
	sumModes(c, res, "total")
	tail := res.Total.Truncation.Infinity
	if tail == nil {
		t.Fatalf("no tail: %s", res.Total.Truncation.Note)
	}
	if d := math.Abs(tail.Energy.Value - 1.0/6); d > 1e-12 || tail.AngularMomentum.Value != 0 {
		t.Errorf("tail %+v, want energy 1/6 and no angular momentum", *tail)
	}
}

// TestSpanThatIsTooShortIsRefused: with what would be enough, which is enough.
func TestSpanThatIsTooShortIsRefused(t *testing.T) {
	for _, file := range []string{"circular.yaml", "eccentric.yaml", "plunge.yaml"} {
		path := filepath.Join("..", "..", "..", "configs", file)
		sets := []string{"span.until=100", "accuracy.relative=1e-4", "waves.modes=[[2,2]]", "numerics.rungs=2"}
		_, err := configs.Reader{Sets: sets, Checks: Checks()}.Read(path)
		if err == nil || !strings.Contains(err.Error(), "span.until is 100, but must be at least") {
			t.Errorf("%s: %v", file, err)
			continue
		}
		var least float64
		if _, err := fmt.Sscanf(err.Error()[strings.Index(err.Error(), "at least"):], "at least %g", &least); err != nil {
			t.Fatal(err)
		}
		sets[0] = fmt.Sprintf("span.until=%g", least)
		c, err := configs.Reader{Sets: sets, Checks: Checks()}.Read(path)
		if err != nil {
			t.Errorf("%s: %g is said to be enough and refused: %v", file, least, err)
			continue
		}
		run(t, c)
	}
}

// TestConventionsSpeakOfWhatIsThere: what is true of circular orbits alone is
// told of no pulse.
func TestConventionsSpeakOfWhatIsThere(t *testing.T) {
	for key := range pulseConventions() {
		if strings.HasPrefix(key, "circular") || strings.HasPrefix(key, "orbital") {
			t.Errorf("a pulse's result states %q", key)
		}
	}
}
