package wire

import (
	"context"
	"fmt"
	"math"
	"strings"
	"testing"

	"nullmark/configs"
)

// spinningTones are quasinormal frequencies M omega of spinning holes by (l,m):
// E. W. Leaver, Proc. R. Soc. A 402, 285 (1985); E. Berti, V. Cardoso & A.
// Starinets, Class. Quantum Grav. 26, 163001 (2009); these digits from the former's
// continued fraction by a program that shares nothing with this one.
func spinningTones() map[string]map[[2]int]complex128 {
	return map[string]map[[2]int]complex128{
		"0.5": {{2, 2}: complex(0.4641230260, -0.0856388350), {2, 1}: complex(0.4206323930, -0.0861729943), {3, 3}: complex(0.7409210977, -0.0886762575)},
		"0.7": {{2, 2}: complex(0.5326002436, -0.0807928732), {2, 1}: complex(0.4551214854, -0.0820852262), {3, 3}: complex(0.8436868622, -0.0828556820)},
	}
}

func kerrPulse(spin float64, weight int, modes ...[2]int) *configs.Case {
	c := pulseOf(10, 1, "in", modes...)
	c.Waves.Equation, c.Waves.SpinWeight, c.Hole.Spin, c.Accuracy.Relative = configs.Teukolsky, weight, spin, 1e-7
	return c
}

// checkSpinning holds every fundamental of a run to its bar and to a limit.
func checkSpinning(t *testing.T, c *configs.Case, limit float64) {
	t.Helper()
	b, err := runPulse(context.Background(), c, Options{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	seen := 0
	for _, r := range b.Result.Ringing {
		w, ok := spinningTones()[fmt.Sprint(c.Hole.Spin)][[2]int{r.L, r.M}]
		if !ok {
			t.Errorf("(%d,%d) was not asked for", r.L, r.M)
		}
		if r.N != 0 {
			continue
		}
		seen++
		// The table has ten digits.
		r.Re.Error += 5e-11
		r.Im.Error += 5e-11
		rel, ratio := offBy(r, w)
		t.Logf("a = %g, s = %d, (%d,%d) at %s: off by %.1e, bar/error %.1f", c.Hole.Spin, c.Waves.SpinWeight, r.L, r.M, r.Where, rel, ratio)
		if ratio < 1 || rel > limit {
			t.Errorf("a = %g, s = %d, (%d,%d) at %s: %+v, want %v", c.Hole.Spin, c.Waves.SpinWeight, r.L, r.M, r.Where, r, w)
		}
	}
	if want := 2 * len(c.Waves.Modes); seen != want {
		t.Errorf("%d fundamentals, want %d: %v", seen, want, b.Result.Warnings)
	}
	mixed := false
	for _, w := range b.Result.Warnings {
		mixed = mixed || strings.Contains(w, "also carries other tones") && strings.Contains(w, "(3,2) n = 0")
	}
	if !mixed {
		t.Errorf("the neighbour (3,2) of (2,2) is not named: %v", b.Result.Warnings)
	}
}

// TestRingingOfSpinningHoles: the short form has one mode on a coarse grid.
func TestRingingOfSpinningHoles(t *testing.T) {
	if !*long {
		c := kerrPulse(0.7, -2, [2]int{2, 2})
		c.Pulse.Width, c.Accuracy.Relative = 2, 1e-4
		checkSpinning(t, c, 2e-6)
		return
	}
	for _, a := range []float64{0.5, 0.7} {
		for _, s := range []int{-2, 2} {
			checkSpinning(t, kerrPulse(a, s, [2]int{2, 1}, [2]int{2, 2}, [2]int{3, 3}), 1e-7)
		}
	}
}

// Without spin the coupled equation rings like the master functions.
func TestCoupledWithoutSpin(t *testing.T) {
	c := kerrPulse(0, -2, [2]int{2, 1})
	c.Pulse.Width, c.Accuracy.Relative = 2, 1e-5
	b, err := runPulse(context.Background(), c, Options{Workers: 1})
	if err != nil {
		t.Fatal(err)
	}
	seen := 0
	for _, r := range b.Result.Ringing {
		if rel, ratio := offBy(r, publishedTones()[pulseTone{2, 2, r.N}]); ratio < 1 || r.N == 0 && rel > 1e-7 {
			t.Errorf("%+v", r)
		} else if r.N == 0 {
			seen++
			t.Logf("at %s: off by %.1e, bar/error %.1f", r.Where, rel, ratio)
		}
	}
	if seen != 2 || b.Result.Rungs[1].Angular != 1 {
		t.Errorf("%d fundamentals, %d coupled l", seen, b.Result.Rungs[1].Angular)
	}
}

func TestSpinOfPulses(t *testing.T) {
	for _, a := range []float64{0.96, -0.99} {
		p := pulseProblems(kerrPulse(a, -2, [2]int{2, 2}))
		if len(p) != 1 || p[0].Key != "hole.spin" {
			t.Errorf("a = %g: %v", a, p)
		}
	}
	if d := damping(kerrPulse(0.9, -2, [2]int{2, 2})); math.Abs(d-0.0649) > 2e-4 {
		// Berti, Cardoso & Starinets (2009): 0.6716 - 0.0649 i at a = 0.9, from memory.
		t.Errorf("damping %g", d)
	}
}
