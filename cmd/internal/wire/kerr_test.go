package wire

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"sort"
	"strings"
	"testing"

	"nullmark/configs"
	"nullmark/extract/result"
)

// readKerr makes a case from a shipped one and settings.
func readKerr(t testing.TB, name string, sets ...string) *configs.Case {
	t.Helper()
	c, err := configs.Reader{Sets: sets, Checks: Checks()}.Read(filepath.Join("..", "..", "..", "configs", name))
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// kerrReference is one orbit of the independent frequency-domain table (see its
// "origin"), m and -m together.
type kerrReference struct {
	A, R0      float64
	Spheroidal []struct {
		L, M int
		E    float64 `json:"energy_horizon"`
	}
	Spherical []struct {
		L, M   int
		E      float64 `json:"energy_infinity"`
		Strain [2]float64
	}
	PerM []struct {
		M     int
		Value float64
	} `json:"per_m_energy_infinity"`
}

func kerrReferences(t testing.TB) []kerrReference {
	t.Helper()
	data, err := os.ReadFile(filepath.Join("..", "verify", "published", "circular_kerr.json"))
	if err != nil {
		t.Fatal(err)
	}
	var table struct{ Orbits []kerrReference }
	if err := json.Unmarshal(data, &table); err != nil {
		t.Fatal(err)
	}
	return table.Orbits
}

// tally counts bars that hold a known truth.
type tally struct {
	inside int
	ratio  []float64
}

// add books a number; digits is the relative accuracy of the truth.
func (y *tally) add(q result.Q, truth, digits float64) bool {
	d, slack := math.Abs(q.Value-truth), digits*math.Abs(truth)
	ok := d <= q.Error+slack
	if ok {
		y.inside++
	}
	y.ratio = append(y.ratio, (q.Error+slack)/math.Max(d, slack))
	return ok
}

func (y *tally) coverage() float64 { return float64(y.inside) / float64(len(y.ratio)) }

func (y *tally) median() float64 {
	sort.Float64s(y.ratio)
	return y.ratio[len(y.ratio)/2]
}

// against sets a result beside the table: every number that both have.
func (ref *kerrReference) against(t testing.TB, res *result.Result, y *tally) {
	const digits = 1e-14
	say := func(ok bool, what string, l, m int, q result.Q, truth float64) {
		if !ok {
			t.Logf("a=%g r=%g (%d,%d) %s: off by %.1e, bar %.1e", ref.A, ref.R0, l, m, what, math.Abs(q.Value-truth), q.Error)
		}
	}
	for _, p := range res.PerM {
		for _, w := range ref.PerM {
			if w.M == p.M {
				say(y.add(p.Infinity.Energy, w.Value, digits), "sum over l", 0, w.M, p.Infinity.Energy, w.Value)
			}
		}
	}
	for _, w := range ref.Spherical {
		if m := res.Find(w.L, w.M); m != nil {
			say(y.add(m.Infinity.Energy, w.E, digits), "energy at infinity", w.L, w.M, m.Infinity.Energy, w.E)
			say(y.add(m.Strain.Re, w.Strain[0], digits), "strain", w.L, w.M, m.Strain.Re, w.Strain[0])
			say(y.add(m.Strain.Im, w.Strain[1], digits), "strain", w.L, w.M, m.Strain.Im, w.Strain[1])
		}
	}
	for _, w := range ref.Spheroidal {
		if m := res.Find(w.L, w.M); m != nil {
			say(y.add(m.Horizon.Energy, w.E, digits), "energy at the horizon", w.L, w.M, m.Horizon.Energy, w.E)
		}
	}
}

// TestKerrCircularReachesTheReference: the sums over l at each m to 1e-10 and
// the strain of the modes that make them up to 1e-9, amplitude and phase.
func TestKerrCircularReachesTheReference(t *testing.T) {
	for _, ref := range kerrReferences(t) {
		sets := []string{fmt.Sprintf("hole.spin=%g", ref.A), fmt.Sprintf("orbit.radius=%g", ref.R0)}
		if !*long {
			if ref.R0 == 10 {
				continue
			}
			sets = append(sets, "waves.modes=[[2,2],[3,2],[3,3],[4,3]]")
		} else {
			sets = append(sets, "accuracy.relative=2e-10")
		}
		b := run(t, readKerr(t, "kerr-circular.yaml", sets...))
		res := b.Result
		if !res.Accuracy.Met {
			t.Errorf("a=%g r=%g: not met: %v", ref.A, ref.R0, res.Warnings)
		}
		var worst float64
		for _, w := range ref.PerM {
			for _, p := range res.PerM {
				if p.M != w.M {
					continue
				}
				d := math.Abs(p.Infinity.Energy.Value/w.Value - 1)
				worst = math.Max(worst, d)
				if !(d < 1e-10) {
					t.Errorf("a=%g r=%g m=%d: the sum over l is off by %.1e", ref.A, ref.R0, w.M, d)
				}
				if !p.LConverged {
					t.Errorf("a=%g r=%g m=%d: the sum over l has not ended", ref.A, ref.R0, w.M)
				}
			}
		}
		for _, w := range ref.Spherical {
			m := res.Find(w.L, w.M)
			if m == nil || w.L > w.M+1 && w.L > 3 {
				continue // weak: what the strong modes leave in them rules
			}
			d := math.Hypot(m.Strain.Re.Value-w.Strain[0], m.Strain.Im.Value-w.Strain[1]) / math.Hypot(w.Strain[0], w.Strain[1])
			if !(d < 1e-9) {
				t.Errorf("a=%g r=%g (%d,%d): strain off by %.1e", ref.A, ref.R0, w.L, w.M, d)
			}
		}
		var y tally
		ref.against(t, res, &y)
		t.Logf("a=%g r=%g: sums off by %.1e at most; %d of %d bars hold, median bar/error %.1f; %.1f core-seconds", ref.A, ref.R0, worst, y.inside, len(y.ratio), y.median(), res.Provenance.CoreSeconds)
		if y.coverage() < 0.95 {
			t.Errorf("a=%g r=%g: %d of %d bars hold the truth", ref.A, ref.R0, y.inside, len(y.ratio))
		}
		// The second opinion agrees within the bars of both.
		if err := SecondOpinion(context.Background(), readKerr(t, "kerr-circular.yaml", sets...), res, 2); err != nil {
			t.Fatal(err)
		}
		out := 0
		for _, o := range res.SecondOpinion {
			if o.InBars > 1 {
				out++
				t.Logf("second opinion: %+v", o)
			}
		}
		if n := len(res.SecondOpinion); n < 12 || out > n/20 {
			t.Errorf("a=%g r=%g: %d of %d second opinions differ by more than both bars", ref.A, ref.R0, out, n)
		}
		// The stored series is the certified tone: at a late u, h e^{i m phi_p} is
		// the strain of the table.
		k := len(b.Series.U) - 1
		for _, s := range b.Series.Modes {
			m := res.Find(s.L, s.M)
			sin, cos := math.Sincos(float64(s.M) * b.Series.Phi[k])
			z := s.Wave[k] * complex(cos, sin)
			if d := math.Hypot(real(z)-m.Strain.Re.Value, imag(z)-m.Strain.Im.Value); d > 1e-12*math.Hypot(real(z), imag(z)) {
				t.Errorf("(%d,%d): the series leaves its tone by %.1e", s.L, s.M, d)
			}
		}
	}
}

// TestKerrAtZeroSpinIsTheMasterEquation: two equations, two sources, two
// slicings and two normalisations give the same modes at a = 0, strain phase
// included.
func TestKerrAtZeroSpinIsTheMasterEquation(t *testing.T) {
	sets := []string{"accuracy.relative=1e-8", "orbit.radius=7"}
	modes := "waves.modes=[[2,1],[2,2],[3,2],[3,3]]"
	if *long {
		modes = "waves.l_max=5"
	}
	sets = append(sets, modes)
	a := run(t, read(t, sets...)).Result
	b := run(t, readKerr(t, "kerr-circular.yaml", append(sets, "hole.spin=0")...)).Result
	for _, m := range a.Modes {
		q := b.Find(m.L, m.M)
		if q == nil {
			t.Fatalf("no mode (%d,%d)", m.L, m.M)
		}
		check := func(what string, x, y result.Q, scale float64) {
			d := math.Abs(x.Value - y.Value)
			if d > x.Error+y.Error || d > 1e-8*scale {
				t.Errorf("(%d,%d) %s: %.15g and %.15g differ by %.1e, bars %.1e and %.1e", m.L, m.M, what, x.Value, y.Value, d/scale, x.Error/scale, y.Error/scale)
			}
		}
		check("energy at infinity", m.Infinity.Energy, q.Infinity.Energy, m.Infinity.Energy.Value)
		check("angular momentum at infinity", m.Infinity.AngularMomentum, q.Infinity.AngularMomentum, m.Infinity.AngularMomentum.Value)
		check("energy at the horizon", m.Horizon.Energy, q.Horizon.Energy, m.Horizon.Energy.Value)
		size := math.Hypot(m.Strain.Re.Value, m.Strain.Im.Value)
		check("real part of strain", m.Strain.Re, q.Strain.Re, size)
		check("imaginary part of strain", m.Strain.Im, q.Strain.Im, size)
	}
}

// TestKerrRefusals: one sentence each.
func TestKerrRefusals(t *testing.T) {
	for _, c := range []struct{ sets, want string }{
		{"orbit.radius=2", fmt.Sprintf("light ring r = %.6g at spin 0.7", 2*(1+math.Cos(2./3*math.Acos(-0.7))))},
		{"orbit.radius=1.5", "the horizon of this hole lies at r = 1.71414"},
		{"hole.spin=1", "hole.spin"},
		{"orbit.radius=1001", "at most 1000"},
		{"waves.equation=master", "needs waves.equation teukolsky"},
	} {
		sets := append([]string{"hole.spin=0.7"}, strings.Fields(c.sets)...)
		_, err := configs.Reader{Sets: sets, Checks: Checks()}.Read(filepath.Join("..", "..", "..", "configs", "kerr-circular.yaml"))
		if err == nil || !strings.Contains(err.Error(), c.want) || strings.Count(strings.TrimSpace(err.Error()), "\n") != 0 {
			t.Errorf("%s: %v", c.sets, err)
		}
	}
	w := strings.Join(Warnings(readKerr(t, "kerr-circular.yaml", "hole.spin=0.995", "orbit.radius=1.3")), "\n")
	for _, want := range []string{"close to extremal", "inside the innermost stable one"} {
		if !strings.Contains(w, want) {
			t.Errorf("no warning %q in %q", want, w)
		}
	}
}
