package wire

import (
	"fmt"
	"testing"
)

// TestKerrBarsAreCalibrated: over all numbers of both reference orbits, at several
// asked accuracies, at least 95 % of the bars hold the truth and the median bar is
// at most ten times the true error. With -long it prints the table of README.md.
func TestKerrBarsAreCalibrated(t *testing.T) {
	asked, lmax := []string{"1e-8"}, 3
	if *long {
		asked, lmax = []string{"1e-4", "1e-6", "1e-8", "1e-9", "1e-10"}, 6
	}
	var all tally
	for _, a := range asked {
		for i, ref := range kerrReferences(t) {
			if i == 0 && !*long {
				continue
			}
			res := run(t, readKerr(t, "kerr-circular.yaml", fmt.Sprintf("hole.spin=%g", ref.A), fmt.Sprintf("orbit.radius=%g", ref.R0),
				"accuracy.relative="+a, fmt.Sprintf("waves.l_max=%d", lmax))).Result
			var y tally
			ref.against(t, res, &y)
			all.inside += y.inside
			all.ratio = append(all.ratio, y.ratio...)
			worst := 0.0
			for _, p := range res.PerM {
				for _, w := range ref.PerM {
					if w.M == p.M {
						worst = max(worst, abs(complex(p.Infinity.Energy.Value/w.Value-1, 0)))
					}
				}
			}
			t.Logf("| %s | %g | %g | %.1e | %.1f %% | %.1f | %v | %.1f |", a, ref.A, ref.R0, worst, 100*y.coverage(), y.median(), res.Accuracy.Met, res.Provenance.CoreSeconds)
		}
	}
	t.Logf("| all | | | | %.1f %% of %d | %.1f | | |", 100*all.coverage(), len(all.ratio), all.median())
	if all.coverage() < 0.95 || all.median() > 10 {
		t.Errorf("%.1f %% of %d bars hold the truth, median bar/error %.1f", 100*all.coverage(), len(all.ratio), all.median())
	}
}
