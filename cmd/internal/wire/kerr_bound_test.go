package wire

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nullmark/configs"
	"nullmark/extract/result"
)

func kerrTable(t testing.TB, name string, into any) {
	t.Helper()
	data, err := os.ReadFile(filepath.Join("..", "verify", "published", name))
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, into); err != nil {
		t.Fatal(err)
	}
}

// TestKerrInclinedReachesTheReference: an inclined circular orbit against the
// independent frequency-domain table (see its "origin"), energy and angular
// momentum per m at both ends, to 1e-9 and inside the bars; the second opinion
// agrees.
func TestKerrInclinedReachesTheReference(t *testing.T) {
	var ref struct {
		Orbits []struct {
			PerM []struct {
				M int
				E float64 `json:"energy_infinity"`
				L float64 `json:"angular_momentum_infinity"`
				H float64 `json:"energy_horizon"`
			} `json:"per_m"`
		}
	}
	kerrTable(t, "inclined_kerr.json", &ref)
	sets := []string{"waves.modes=[[2,2]]"}
	if *long {
		sets = []string{"waves.l_max=4", "accuracy.relative=1e-9"}
	}
	c := readKerr(t, "kerr-inclined.yaml", sets...)
	res := run(t, c).Result
	if !res.Accuracy.Met {
		t.Errorf("not met: %v", res.Warnings)
	}
	var y tally
	for _, w := range ref.Orbits[0].PerM {
		for _, p := range res.PerM {
			if p.M != w.M {
				continue
			}
			check := func(what string, q result.Q, truth float64) {
				d := math.Abs(q.Value/truth - 1)
				// the table has 12 digits
				if !y.add(q, truth, 1e-12) || !(d < 1e-9) {
					t.Errorf("m = %d %s: off by %.1e, bar %.1e", p.M, what, d, q.Error/math.Abs(truth))
				}
			}
			check("energy at infinity", p.Infinity.Energy, w.E)
			check("energy at the horizon", p.Horizon.Energy, w.H)
			if p.M > 0 {
				check("angular momentum at infinity", p.Infinity.AngularMomentum, w.L)
			}
		}
	}
	t.Logf("%d of %d bars hold, median bar/error %.1f; %.1f core-seconds", y.inside, len(y.ratio), y.median(), res.Provenance.CoreSeconds)
	a, b := res.Find(2, 2), res.Find(2, -2)
	if a == nil || b == nil || a.Counts != thisM || a.Infinity.Energy != b.Infinity.Energy {
		t.Errorf("both signs of m should be listed apart and alike: %+v, %+v", a, b)
	}
	if err := SecondOpinion(context.Background(), c, res, 2); err != nil {
		t.Fatal(err)
	}
	for _, o := range res.SecondOpinion {
		if o.L <= 3 && !(o.InBars < 1) {
			t.Errorf("second opinion: %+v", o)
		}
	}
	if len(res.SecondOpinion) < 6 {
		t.Errorf("%d second opinions", len(res.SecondOpinion))
	}
}

// TestKerrEccentricAtZeroSpin: the modes of the eccentric Schwarzschild orbit of
// the independent table (the orbit of C. Cutler, D. Kennefick, E. Poisson, PRD 50,
// 3816 (1994)) through the Teukolsky equation, to 1e-9 and inside the bars.
func TestKerrEccentricAtZeroSpin(t *testing.T) {
	var ref struct {
		Orbits []struct {
			P, E  float64
			Modes []struct {
				L, M int
				Inf  float64 `json:"energy_infinity"`
				Ang  float64 `json:"angular_momentum_infinity"`
				Hor  float64 `json:"energy_horizon"`
			}
		}
	}
	kerrTable(t, "eccentric_schwarzschild.json", &ref)
	o := ref.Orbits[0]
	sets := []string{"hole.spin=0", "orbit.p=7.50478", "orbit.e=0.188917"}
	if *long {
		sets = append(sets, "waves.l_max=4", "accuracy.relative=1e-9")
	} else {
		sets = append(sets, "waves.modes=[[2,2],[3,2]]", "accuracy.relative=1e-7")
	}
	res := run(t, readKerr(t, "kerr-eccentric.yaml", sets...)).Result
	var y tally
	for _, w := range o.Modes {
		m := res.Find(w.L, w.M)
		if m == nil {
			continue
		}
		for _, q := range []struct {
			what  string
			got   result.Q
			truth float64
		}{{"energy at infinity", m.Infinity.Energy, w.Inf}, {"angular momentum at infinity", m.Infinity.AngularMomentum, w.Ang}, {"energy at the horizon", m.Horizon.Energy, w.Hor}} {
			if q.truth == 0 {
				continue
			}
			d := math.Abs(q.got.Value/q.truth - 1)
			digits := 1e-11
			if q.what == "energy at the horizon" {
				digits = 5e-10 // the table gives ten digits there
			}
			if ok := y.add(q.got, q.truth, digits); !ok || !(d < 1e-9) {
				t.Errorf("(%d,%d) %s: off by %.1e, bar %.1e", w.L, w.M, q.what, d, q.got.Error/q.truth)
			}
		}
	}
	if len(y.ratio) < 6 {
		t.Fatalf("only %d numbers compared", len(y.ratio))
	}
	t.Logf("%d of %d bars hold, median bar/error %.1f; %.1f core-seconds", y.inside, len(y.ratio), y.median(), res.Provenance.CoreSeconds)
}

// TestKerrRetrograde: the shipped retrograde orbit, short, against the second
// opinion; the same orbit named by an inclination of 180 degrees on the hole that
// spins the other way gives the same fluxes, by the code for inclined orbits.
func TestKerrRetrograde(t *testing.T) {
	sets := []string{"waves.modes=[[2,2]]", "accuracy.relative=1e-7"}
	c := readKerr(t, "kerr-retrograde.yaml", sets...)
	a := run(t, c).Result
	if err := SecondOpinion(context.Background(), c, a, 1); err != nil {
		t.Fatal(err)
	}
	for _, o := range a.SecondOpinion {
		if !(o.InBars < 1) {
			t.Errorf("second opinion: %+v", o)
		}
	}
	b := run(t, readKerr(t, "kerr-retrograde.yaml", append(sets, "hole.spin=0.7", "orbit.inclination=180")...)).Result
	for e, x := range []*result.Flux{a.PerM[0].Infinity, a.PerM[0].Horizon} {
		z := []*result.Flux{b.PerM[0].Infinity, b.PerM[0].Horizon}[e]
		if d := math.Abs(x.Energy.Value - z.Energy.Value); d > x.Energy.Error+z.Energy.Error {
			t.Errorf("end %d: %.15g and %.15g differ by %.1e, bars %.1e and %.1e", e, x.Energy.Value, z.Energy.Value, d, x.Energy.Error, z.Energy.Error)
		}
		if d := math.Abs(x.AngularMomentum.Value + z.AngularMomentum.Value); d > x.AngularMomentum.Error+z.AngularMomentum.Error {
			t.Errorf("end %d: angular momenta %.15g and %.15g should be opposite", e, x.AngularMomentum.Value, z.AngularMomentum.Value)
		}
	}
}

// TestKerrEccentricSpinning: prograde and, with -long, retrograde and e = 0.7:
// another slicing and another rung give the same rates inside the bars; e -> 0
// gives the circular orbit.
func TestKerrEccentricSpinning(t *testing.T) {
	var cases [][]string // two runs a case, each of many core-seconds
	if *long {
		cases = append(cases,
			[]string{"waves.modes=[[2,2]]", "accuracy.relative=1e-6"},
			[]string{"waves.modes=[[2,2],[3,3],[2,1]]", "accuracy.relative=1e-9"},
			[]string{"waves.modes=[[2,2],[3,3],[2,1]]", "accuracy.relative=1e-9", "hole.spin=-0.9", "orbit.p=12"},
			[]string{"waves.modes=[[2,2],[3,3]]", "accuracy.relative=1e-8", "orbit.p=6", "orbit.e=0.7"},
			[]string{"waves.modes=[[2,2]]", "accuracy.relative=1e-7", "orbit.p=8", "orbit.e=0.2", "orbit.inclination=25"},
		)
	}
	for _, sets := range cases {
		a := run(t, readKerr(t, "kerr-eccentric.yaml", sets...)).Result
		b := run(t, readKerr(t, "kerr-eccentric.yaml", append(sets, "numerics.layer=31", "numerics.courant=1.1")...)).Result
		if !a.Accuracy.Met {
			t.Errorf("%v: not met: %v", sets, a.Warnings)
		}
		for i, p := range a.PerM {
			q := b.PerM[i]
			for e, x := range []*result.Flux{p.Infinity, p.Horizon} {
				z := []*result.Flux{q.Infinity, q.Horizon}[e]
				d := math.Abs(x.Energy.Value - z.Energy.Value)
				t.Logf("%v m=%d end %d: slicings differ by %.1e, bars %.1e and %.1e", sets, p.M, e, d/math.Abs(x.Energy.Value), x.Energy.Error/math.Abs(x.Energy.Value), z.Energy.Error/math.Abs(x.Energy.Value))
				if d > x.Energy.Error+z.Energy.Error {
					t.Errorf("%v m=%d end %d: slicings differ by more than both bars", sets, p.M, e)
				}
			}
		}
	}
}

// TestKerrBoundRefusals: one sentence each, with the limit of that spin.
func TestKerrBoundRefusals(t *testing.T) {
	for _, c := range []struct{ file, sets, want string }{
		{"kerr-eccentric.yaml", "orbit.p=2.5", "separatrix p = "},
		{"kerr-eccentric.yaml", "orbit.e=1.2", "orbit.e"},
		{"kerr-eccentric.yaml", "orbit.p=900", "at most 350"},
		{"kerr-inclined.yaml", "orbit.radius=1.6", "at or inside the light ring r = "},
		{"kerr-inclined.yaml", "orbit.inclination=181", "orbit.inclination"},
	} {
		_, err := configs.Reader{Sets: strings.Fields(c.sets), Checks: Checks()}.Read(filepath.Join("..", "..", "..", "configs", c.file))
		if err == nil || !strings.Contains(err.Error(), c.want) || strings.Count(strings.TrimSpace(err.Error()), "\n") != 0 {
			t.Errorf("%s: %v", c.sets, err)
		}
	}
	// The photon orbit at 30 degrees lies outside the equatorial one (1.5579 at a = 0.9).
	w := fmt.Sprint(Warnings(readKerr(t, "kerr-inclined.yaml", "orbit.radius=2.3")))
	if !strings.Contains(w, "inside the innermost stable one") {
		t.Errorf("no warning in %q", w)
	}
}
