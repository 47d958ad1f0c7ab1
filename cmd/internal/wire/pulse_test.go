package wire

import (
	"context"
	"fmt"
	"math"
	"sort"
	"strings"
	"testing"

	"nullmark/configs"
	"nullmark/extract/result"
)

// Quasinormal frequencies M omega of a hole without spin, by field spin, l, n:
// E. W. Leaver, Proc. R. Soc. A 402, 285 (1985), tables 1 (there 2M = 1) for the
// gravitational ones; E. Berti, V. Cardoso & A. Starinets, Class. Quantum Grav.
// 26, 163001 (2009) for the scalar ones; further digits from the continued
// fraction of the former.
type pulseTone struct{ spin, l, n int }

func publishedTones() map[pulseTone]complex128 {
	return map[pulseTone]complex128{
		{2, 2, 0}: complex(0.373671684418042, -0.0889623156889357),
		{2, 2, 1}: complex(0.346710996879163, -0.273914875291235),
		{2, 3, 0}: complex(0.59944328843749, -0.0927030479449476),
		{2, 3, 1}: complex(0.582643803033299, -0.281298113435044),
		{2, 4, 0}: complex(0.809178377532239, -0.0941639609889233),
		{2, 4, 1}: complex(0.796631532034503, -0.284334349404841),
		{0, 0, 0}: complex(0.11045493908042, -0.104895717086881),
		{0, 1, 0}: complex(0.292936133267283, -0.0976599889135782),
		{0, 1, 1}: complex(0.264448650604833, -0.306257391559047),
		{0, 2, 0}: complex(0.483643872210713, -0.0967587759782879),
		{0, 2, 1}: complex(0.463850579019766, -0.295603936987963),
		{0, 3, 0}: complex(0.675366232536621, -0.0964996277340096),
		{0, 3, 1}: complex(0.660671497955962, -0.292284785138412),
	}
}

func pulseOf(centre, width float64, moving string, modes ...[2]int) *configs.Case {
	return &configs.Case{
		Title: "pulse", Pulse: &configs.Pulse{Centre: centre, Width: width, Moving: moving},
		Waves:    configs.Waves{Equation: configs.Master, Modes: modes, LMax: 4},
		Accuracy: configs.Accuracy{Relative: 1e-9, Floor: 1e-14},
		Output:   configs.Output{Every: 0.5},
	}
}

// offBy is the error of a frequency over the modulus, and bar over error, the
// worse of the two parts.
func offBy(r result.Ringing, w complex128) (relative, ratio float64) {
	re, im := math.Abs(r.Re.Value-real(w)), math.Abs(r.Im.Value-imag(w))
	return math.Hypot(re, im) / math.Hypot(real(w), imag(w)), math.Min(r.Re.Error/(re+1e-18), r.Im.Error/(im+1e-18))
}

// TestRingingOfPulses holds the frequencies of a hole without spin, both
// parities, both ends, to published values and to their own bars.
func TestRingingOfPulses(t *testing.T) {
	c := pulseOf(10, 2, "in", [2]int{2, 0}, [2]int{3, 0}, [2]int{4, 1}, [2]int{2, 2})
	b, err := runPulse(context.Background(), c, Options{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	// The targets, relative: fundamental and first overtone by end.
	limit := map[string]map[int]float64{"infinity": {20: 1e-9, 21: 1e-4, 30: 1e-8, 40: 1e-8}, "horizon": {20: 1e-11, 21: 1e-6, 30: 1e-8, 40: 1e-8}}
	seen := 0
	for _, r := range b.Result.Ringing {
		w, ok := publishedTones()[pulseTone{2, r.L, r.N}]
		if !ok {
			t.Errorf("unexpected (%d,%d) n = %d", r.L, r.M, r.N)
			continue
		}
		seen++
		rel, ratio := offBy(r, w)
		t.Logf("(%d,%d) n = %d at %s: off by %.1e, bar/error %.1f", r.L, r.M, r.N, r.Where, rel, ratio)
		if ratio < 1 {
			t.Errorf("(%d,%d) n = %d at %s: %+v outside its bar", r.L, r.M, r.N, r.Where, r)
		}
		if tol, ok := limit[r.Where][10*r.L+r.N]; ok && rel > tol {
			t.Errorf("(%d,%d) n = %d at %s: off by %.1e, want %.0e", r.L, r.M, r.N, r.Where, rel, tol)
		}
	}
	if seen != 4*2*2 {
		t.Errorf("%d frequencies, want 2 of each of 4 modes at 2 ends: %v", seen, b.Result.Warnings)
	}
	if !b.Result.Accuracy.Met {
		t.Errorf("1e-9 not met: %+v", b.Result.Accuracy)
	}
	s := b.Series
	if len(s.Modes) != 4 || len(s.U) != len(s.Modes[0].Wave) || len(s.V) != len(s.Modes[3].HorizonErr) || len(s.U) != len(s.Modes[2].Evidence) {
		t.Errorf("series of unequal lengths")
	}
	// (2,0) and (2,2) obey one equation: the same numbers, bit for bit.
	for k, v := range s.Modes[0].Wave {
		if v != s.Modes[1].Wave[k] {
			t.Fatalf("(2,0) and (2,2) differ at sample %d", k)
		}
	}
}

func TestScalarPulses(t *testing.T) {
	c := pulseOf(10, 2, "in", [2]int{1, 0}, [2]int{2, 0})
	c.Waves.Equation, c.Waves.SpinWeight = configs.Teukolsky, 0
	b, err := runPulse(context.Background(), c, Options{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	fundamentals := 0
	for _, r := range b.Result.Ringing {
		w := publishedTones()[pulseTone{0, r.L, r.N}]
		rel, ratio := offBy(r, w)
		t.Logf("(%d,%d) n = %d at %s: off by %.1e, bar/error %.1f", r.L, r.M, r.N, r.Where, rel, ratio)
		if ratio < 1 {
			t.Errorf("(%d,%d) n = %d at %s: %+v outside its bar of %v", r.L, r.M, r.N, r.Where, r, w)
		}
		if r.N == 0 {
			fundamentals++
			if rel > 1e-7 {
				t.Errorf("(%d,%d) at %s: off by %.1e", r.L, r.M, r.Where, rel)
			}
		}
	}
	if fundamentals != 4 {
		t.Errorf("%d fundamentals, want 4: %v", fundamentals, b.Result.Warnings)
	}
}

// TestPulseSchedulingChangesNothing: workers, and a run taken up from what was
// kept, give the same bits.
func TestPulseSchedulingChangesNothing(t *testing.T) {
	c := pulseOf(6, 2, "out", [2]int{2, 0})
	c.Numerics.Points = new(int)
	*c.Numerics.Points = 330
	keep := &memoryKeeper{parts: map[string][]byte{}}
	text := func(o Options) string {
		b, err := runPulse(context.Background(), c, o)
		if err != nil {
			t.Fatal(err)
		}
		return fmt.Sprintf("%v %v %v", b.Result.Ringing, b.Result.Accuracy, b.Series.Modes[0].Wave)
	}
	a := text(Options{Workers: 1, Keep: keep})
	if len(keep.parts) != 2 {
		t.Errorf("%d parts kept, want 2", len(keep.parts))
	}
	if again := text(Options{Workers: 2, Keep: keep}); again != a || keep.loads != 2 {
		t.Errorf("a resumed run differs, or took up %d parts", keep.loads)
	}
	if fresh := text(Options{Workers: 2}); fresh != a {
		t.Error("a run with two workers differs")
	}
}

func TestPulseProblems(t *testing.T) {
	points := func(c *configs.Case, n int) *configs.Case { c.Numerics.Points = &n; return c }
	for _, q := range []struct {
		c    *configs.Case
		want string
	}{
		{pulseOf(10, 2, "in"), ""},
		{pulseOf(-90, 2, "in"), "pulse.centre"},
		{pulseOf(500, 2, "in"), "pulse.centre"},
		{pulseOf(10, 0.1, "in"), "pulse.width"},
		{pulseOf(10, 50, "in"), "pulse.width"},
		{pulseOf(-90, 50, "in"), "pulse.centre pulse.width"},
		{points(pulseOf(10, 1, "in"), 100), "numerics.points"},
		{points(pulseOf(10, 1, "in"), 300), ""},
	} {
		var keys []string
		for _, p := range pulseProblems(q.c) {
			keys = append(keys, p.Key)
			if p.Want == "" {
				t.Errorf("%s: no remedy", p.Key)
			}
		}
		if got := strings.Join(keys, " "); got != q.want {
			t.Errorf("%+v: %q, want %q", *q.c.Pulse, got, q.want)
		}
	}
	// What the check promises holds in the run.
	c := pulseOf(10, 1, "in", [2]int{2, 0})
	if s := newPulseScheme(points(c, 100)); s.pulse.Check(s.domain.Ri, s.domain.Ro, s.grid(s.dx).Dx) == nil {
		t.Error("the coarse grid passes the pulse's own check")
	}
}

func TestPlanPulse(t *testing.T) {
	c := pulseOf(10, 2, "in", [2]int{2, 0}, [2]int{2, 1})
	p, err := planPulse(c)
	if err != nil {
		t.Fatal(err)
	}
	if len(p.Rungs) != 2 || len(p.Modes) != 2 || !(p.CoreSeconds > 0) || p.MemoryBytes == 0 {
		t.Errorf("%+v", p)
	}
	if r := p.Rungs[1].Dx / p.Rungs[0].Dx; math.Abs(r-pulseRatio) > 0.01 {
		t.Errorf("rungs differ by %g", r)
	}
}

// TestTailsOfPulses holds the exponents: l+2 at null infinity, 2l+3 at a fixed
// radius and on the horizon, one more for static data: R. H. Price, Phys. Rev. D
// 5, 2419 (1972); C. Gundlach, R. H. Price & J. Pullin, Phys. Rev. D 49, 883
// (1994).
func TestTailsOfPulses(t *testing.T) {
	if !*long {
		t.Log("with -long")
		return
	}
	for _, moving := range []string{"in", "static"} {
		c := pulseOf(40, 4, moving, [2]int{2, 1})
		until := 2500.0
		c.Span.Until = &until
		c.Waves.LMax = 2
		b, err := runPulse(context.Background(), c, Options{Workers: 2})
		if err != nil {
			t.Fatal(err)
		}
		if len(b.Result.Tail) != 3 {
			t.Errorf("%s: %d tails, want 3: %v", moving, len(b.Result.Tail), b.Result.Warnings)
		}
		for _, g := range b.Result.Tail {
			want := float64(2*g.L + 3)
			if g.Where == "infinity" {
				want = float64(g.L + 2)
			}
			if moving == "static" {
				want++
			}
			d := math.Abs(g.Exponent.Value - want)
			t.Logf("%s, l = %d at %s: %.5f ± %.1e, want %g", moving, g.L, g.Where, g.Exponent.Value, g.Exponent.Error, want)
			if d > 0.01 || d > g.Exponent.Error {
				t.Errorf("%s, l = %d at %s: %.5f ± %.1e, want %g", moving, g.L, g.Where, g.Exponent.Value, g.Exponent.Error, want)
			}
		}
	}
}

// TestCalibrationOfPulses measures the bars of frequencies over positions,
// widths and motions: at least 95 % hold the published value, and the median
// bar is at most 10 times the error.
func TestCalibrationOfPulses(t *testing.T) {
	if !*long {
		t.Log("with -long")
		return
	}
	ratios := map[string][]float64{}
	cases := 0
	for _, moving := range []string{"in", "static", "out"} {
		for _, centre := range []float64{4, 7, 11, 16, 23} {
			for _, width := range []float64{1, 1.7, 2.6, 3.7} {
				cases++
				c := pulseOf(centre, width, moving, [2]int{2, 0}, [2]int{3, 0}, [2]int{4, 0})
				b, err := runPulse(context.Background(), c, Options{Workers: 2})
				if err != nil {
					t.Fatal(err)
				}
				for _, r := range b.Result.Ringing {
					rel, ratio := offBy(r, publishedTones()[pulseTone{2, r.L, r.N}])
					key := fmt.Sprintf("n = %d at %s", r.N, r.Where)
					ratios[key] = append(ratios[key], ratio)
					if ratio < 1 {
						t.Logf("%s %g %g: l = %d n = %d at %s off by %.1e, bar/error %.2f", moving, centre, width, r.L, r.N, r.Where, rel, ratio)
					}
				}
			}
		}
	}
	for key, r := range ratios {
		sort.Float64s(r)
		covered := 1 - float64(sort.SearchFloat64s(r, 1))/float64(len(r))
		mid := r[len(r)/2]
		t.Logf("%s: %d of %d, covered %.3f, median bar/error %.2f", key, len(r), 3*cases, covered, mid)
		if covered < 0.95 {
			t.Errorf("%s: the bars cover %.3f, want 0.95", key, covered)
		}
		if mid > 10 {
			t.Errorf("%s: the median bar is %.1f times the error, want at most 10", key, mid)
		}
	}
}

// TestCalibrationOfTails measures the bars of exponents over positions, widths
// and motions, l = 2 and 3 of both parities and the scalar l = 0 and 1.
func TestCalibrationOfTails(t *testing.T) {
	if !*long {
		t.Log("with -long")
		return
	}
	var ratio []float64
	worst := 0.0
	for _, moving := range []string{"in", "static", "out"} {
		for _, place := range [][2]float64{{25, 3}, {40, 4}, {60, 5}} {
			for _, scalar := range []bool{false, true} {
				c := pulseOf(place[0], place[1], moving, [2]int{2, 0}, [2]int{2, 1}, [2]int{3, 0}, [2]int{3, 1})
				if scalar {
					c = pulseOf(place[0], place[1], moving, [2]int{0, 0}, [2]int{1, 0})
					c.Waves.Equation = configs.Teukolsky
				}
				until := 2500.0
				c.Span.Until = &until
				b, err := runPulse(context.Background(), c, Options{Workers: 2})
				if err != nil {
					t.Fatal(err)
				}
				for _, g := range b.Result.Tail {
					want := float64(2*g.L + 3)
					if g.Where == "infinity" {
						want = float64(g.L + 2)
					}
					if moving == "static" {
						want++
					}
					d := math.Abs(g.Exponent.Value - want)
					ratio = append(ratio, g.Exponent.Error/(d+1e-16))
					if g.L <= 2 {
						worst = math.Max(worst, d)
					}
					if d > g.Exponent.Error {
						t.Logf("%s %v l = %d at %s: %.5f ± %.1e, want %g", moving, place, g.L, g.Where, g.Exponent.Value, g.Exponent.Error, want)
					}
				}
			}
		}
	}
	sort.Float64s(ratio)
	covered := 1 - float64(sort.SearchFloat64s(ratio, 1))/float64(len(ratio))
	mid := ratio[len(ratio)/2]
	t.Logf("%d tails, covered %.3f, median bar/error %.2f, largest error for l <= 2 %.1e", len(ratio), covered, mid, worst)
	if covered < 0.95 || mid > 10 {
		t.Errorf("covered %.3f, median bar/error %.1f; want 0.95 and at most 10", covered, mid)
	}
	if worst > 0.01 {
		t.Errorf("an exponent of l <= 2 is off by %.3f", worst)
	}
}
