package wire

import (
	"path/filepath"
	"testing"

	"nullmark/configs"
)

// TestPlansOfShippedCases: each case that comes with the tool can be foreseen,
// mode by mode, from coarse to fine; and a case that is run then has run on the
// rungs that were foreseen, up to those it climbed to.
func TestPlansOfShippedCases(t *testing.T) {
	for _, name := range configs.Shipped() {
		c, err := configs.Reader{Checks: Checks()}.Read(filepath.Join("..", "..", "..", "configs", name))
		if err != nil {
			t.Fatal(err)
		}
		p, err := MakePlan(c)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if len(p.Modes) == 0 || len(p.Rungs) < 2 || !(p.CoreSeconds > 0) || p.MemoryBytes == 0 {
			t.Errorf("%s: an empty plan: %d modes, %d rungs, %g s, %d bytes", name, len(p.Modes), len(p.Rungs), p.CoreSeconds, p.MemoryBytes)
		}
		for i := 1; i < len(p.Rungs); i++ {
			if p.Rungs[i].Points <= p.Rungs[i-1].Points {
				t.Errorf("%s: rung %d has %d points after %d", name, i, p.Rungs[i].Points, p.Rungs[i-1].Points)
			}
		}
		if name != "plunge.yaml" {
			continue
		}
		ran := map[int]bool{}
		for _, g := range run(t, c).Result.Rungs {
			ran[g.Points] = true
		}
		for _, m := range p.Modes {
			if !ran[m.Points] {
				t.Errorf("%s: (%d,%d) was planned on %d points, which were not run", name, m.L, m.M, m.Points)
			}
		}
	}
}
