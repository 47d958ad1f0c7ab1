package wire

import (
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"nullmark/configs"
	"nullmark/extract/result"
	"nullmark/extract/store"
	"nullmark/source/worldline"
)

// writeTable samples a worldline every dt from t0 to t1 into a csv file whose
// times are those of the worldline plus shift. Numbers have the given number of
// digits, 17 for all of them.
func writeTable(t testing.TB, w worldline.Worldline, t0, t1, dt, shift float64, digits int, own bool) string {
	t.Helper()
	var b strings.Builder
	b.WriteString("t,r,phi")
	if own {
		b.WriteString(",E,L")
	}
	b.WriteString("\n")
	var s worldline.State
	g := func(x float64) string { return strconv.FormatFloat(x, 'g', digits, 64) }
	for i := 0; t0+float64(i)*dt <= t1; i++ {
		x := t0 + float64(i)*dt
		w.At(x, &s)
		fmt.Fprintf(&b, "%s,%s,%s", g(x+shift), g(s.R), g(s.Phi))
		if own {
			fmt.Fprintf(&b, ",%s,%s", g(s.E), g(s.L))
		}
		b.WriteString("\n")
	}
	path := filepath.Join(t.TempDir(), "path.csv")
	if err := os.WriteFile(path, []byte(b.String()), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// readTable makes a case of kind table.
func readTable(t testing.TB, file string, sets ...string) (*configs.Case, error) {
	t.Helper()
	path := filepath.Join(t.TempDir(), "table.yaml")
	text := fmt.Sprintf("orbit: {kind: table, file: %q}\nwaves: {l_max: 3}\naccuracy: {relative: 1.0e-8}\n", file)
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return configs.Reader{Sets: sets, Checks: Checks()}.Read(path)
}

func mustTable(t testing.TB, file string, sets ...string) *configs.Case {
	t.Helper()
	c, err := readTable(t, file, sets...)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// truth is the flux of a mode computed independently.
type truth struct {
	l, m              int
	infinity, horizon float64
	halves            [2]float64 // half a unit of the last digits known
}

func compareTruth(t *testing.T, name string, res *result.Result, want []truth, limit, floor float64) {
	t.Helper()
	var largest [2]float64
	for _, w := range want {
		largest[0], largest[1] = math.Max(largest[0], w.infinity), math.Max(largest[1], w.horizon)
	}
	var worst, bars [2]float64
	outside := 0
	for _, w := range want {
		m := res.Find(w.l, w.m)
		if m == nil {
			continue
		}
		for e, x := range []struct{ got, bar, want float64 }{
			{m.Infinity.Energy.Value, m.Infinity.Energy.Error, w.infinity}, {m.Horizon.Energy.Value, m.Horizon.Energy.Error, w.horizon},
		} {
			if x.want < floor*largest[e] {
				continue
			}
			off := math.Abs(x.got-x.want) / x.want
			worst[e] = math.Max(worst[e], off)
			bars[e] = math.Max(bars[e], x.bar/x.want)
			if off > limit {
				t.Errorf("%s (%d,%d) end %d: %.14g, truth %.14g, off by %.1e", name, w.l, w.m, e, x.got, x.want, off)
			}
			if math.Abs(x.got-x.want) > x.bar+2e-12*x.want+w.halves[e] {
				outside++
				t.Errorf("%s (%d,%d) end %d: off by %.1e, bar %.1e", name, w.l, w.m, e, off, x.bar/x.want)
			}
		}
	}
	t.Logf("%s: worst error %.1e at infinity, %.1e at the horizon; largest bars %.1e, %.1e; %d outside; %.1f core-s", name, worst[0], worst[1], bars[0], bars[1], outside, res.Provenance.CoreSeconds)
}

// circularTable writes a circular geodesic.
func circularTable(t testing.TB, r0, length, shift float64, digits int) string {
	t.Helper()
	w, err := worldline.NewCircular(r0, 0)
	if err != nil {
		t.Fatal(err)
	}
	return writeTable(t, w, 0, length, 0.5, shift, digits, false)
}

// TestCircularTable: a circular orbit given as rows 0.5 M apart has the fluxes of
// the orbit itself, and its strain the phase of the table's own time, which
// does not begin at zero.
func TestCircularTable(t *testing.T) {
	for _, ref := range references(t) {
		length, modes := 1500.0, "waves.modes=[[2,2],[2,1],[3,3]]"
		if *long {
			length, modes = 3000, "waves.l_max=8"
		}
		const shift = -437.25
		file := circularTable(t, ref.R0, length, shift, 17)
		b := run(t, mustTable(t, file, modes, "output.every=5"))
		var want []truth
		for _, m := range ref.Modes {
			want = append(want, truth{l: m.L, m: m.M, infinity: m.Infinity, horizon: m.Horizon})
		}
		compareTruth(t, fmt.Sprintf("r0 = %g", ref.R0), b.Result, want, 1e-8, 1e-10)
		for _, m := range ref.Modes {
			if m.L != 2 || m.M != 2 {
				continue
			}
			z := complex(m.Strain[0], m.Strain[1])
			for _, s := range b.Series.Modes {
				if s.L != 2 || s.M != 2 {
					continue
				}
				worst := 0.0
				for i, u := range b.Series.U {
					if u < b.Series.U[len(b.Series.U)-1]-300 {
						continue
					}
					phase := 2 * math.Pow(ref.R0, -1.5) * (u - shift)
					d := cmplx.Abs(s.Wave[i] - z*cmplx.Exp(complex(0, -phase)))
					worst = math.Max(worst, d/cmplx.Abs(z))
					if d > s.WaveErr[i]+1e-10*cmplx.Abs(z) {
						t.Errorf("r0 = %g: strain at u = %g off by %.1e, bar %.1e", ref.R0, u, d, s.WaveErr[i])
						break
					}
				}
				t.Logf("r0 = %g: (2,2) strain against the analytic orbit: %.1e", ref.R0, worst)
				if worst > 1e-6 {
					t.Errorf("r0 = %g: strain off by %.1e of its modulus", ref.R0, worst)
				}
			}
		}
	}
}

// TestEccentricTable: an eccentric orbit given as rows 0.5 M apart has the fluxes
// of the independent table.
func TestEccentricTable(t *testing.T) {
	ref := eccentricTable(t)
	w, err := worldline.NewEccentric(7.50478, 0.188917, 1, 0)
	if err != nil {
		t.Fatal(err)
	}
	length, sets := 1900.0, []string{"waves.modes=[[2,2],[2,1],[3,3],[2,0]]"}
	if *long {
		length, sets = 3000, []string{"waves.l_max=6"}
	}
	file := writeTable(t, w, 100, 100+length, 0.5, 0, 17, false)
	res := run(t, mustTable(t, file, sets...)).Result
	var want []truth
	for _, m := range ref.Modes {
		want = append(want, truth{m.L, m.M, m.EnergyInfinity.value, m.EnergyHorizon.value, [2]float64{m.EnergyInfinity.half, m.EnergyHorizon.half}})
	}
	compareTruth(t, "eccentric", res, want, 1e-7, 1e-9)
	t.Logf("%v %v", res.Orbit.Numbers, res.Conventions["averages"])
	near := func(what string, got, want, by float64) {
		if math.Abs(got/want-1) > by {
			t.Errorf("%s is %.12g, want %.12g", what, got, want)
		}
	}
	for _, n := range w.Numbers() {
		if n.Name == "period_r" || n.Name == "omega_phi" {
			near(n.Name, res.Orbit.Numbers[n.Name], n.Value, 1e-9)
		}
	}
}

// TestTableOfARun: the particle's path that an eccentric run stores gives, as a
// table, the fluxes of that run inside both bars.
func TestTableOfARun(t *testing.T) {
	b := run(t, shipped(t, "eccentric", "waves.modes=[[2,2],[2,1],[3,3]]", "accuracy.relative=1e-7"))
	dir := filepath.Join(t.TempDir(), "out")
	if err := store.Write(dir, b, []byte("x: 1\n"), store.Parts{Waveform: true}, false); err != nil {
		t.Fatal(err)
	}
	c := mustTable(t, filepath.Join(dir, "waveform.npz"), "orbit.columns={t: t_p, r: r_p, phi: phi_p}", "waves.modes=[[2,2],[2,1],[3,3]]", "accuracy.relative=1e-7")
	res := run(t, c).Result
	for _, m := range b.Result.Modes {
		o := res.Find(m.L, m.M)
		for _, q := range [][2]result.Q{
			{m.Infinity.Energy, o.Infinity.Energy}, {m.Horizon.Energy, o.Horizon.Energy},
			{m.Infinity.AngularMomentum, o.Infinity.AngularMomentum}, {m.Horizon.AngularMomentum, o.Horizon.AngularMomentum},
		} {
			d := math.Abs(q[0].Value - q[1].Value)
			t.Logf("(%d,%d): %.12g apart by %.1e, bars %.1e and %.1e", m.L, m.M, q[0].Value, d/q[0].Value, q[0].Error/q[0].Value, q[1].Error/q[0].Value)
			if d > q[0].Error+q[1].Error {
				t.Errorf("(%d,%d): %.12g and %.12g from its own path, bars %.1e and %.1e", m.L, m.M, q[0].Value, q[1].Value, q[0].Error, q[1].Error)
			}
		}
	}
}

// TestPlungingTable: the plunge from the innermost stable orbit as a table has
// the radiated totals, the peak and the recoil of the geodesic, in the table's
// own time.
func TestPlungingTable(t *testing.T) {
	e, l := math.Sqrt(8.0/9), math.Sqrt(12)
	sets := []string{"waves.modes=[[2,2],[3,3]]", "accuracy.relative=1e-6"}
	a := run(t, shipped(t, "plunge", append(sets, "orbit.from=5.9", fmt.Sprintf("orbit.energy=%.17g", e), fmt.Sprintf("orbit.angular_momentum=%.17g", l))...))
	w, err := worldline.NewInfall(5.9, e, l, 0)
	if err != nil {
		t.Fatal(err)
	}
	ring := a.Result.Orbit.Markers[worldline.MarkLightRing]
	const shift = 1000.5
	file := writeTable(t, w, 0, ring+5, 0.25, shift, 17, true)
	b := run(t, mustTable(t, file, sets...))
	for _, m := range a.Result.Modes {
		o := b.Result.Find(m.L, m.M)
		d := math.Abs(m.Infinity.Energy.Value/o.Infinity.Energy.Value - 1)
		t.Logf("(%d,%d): radiated %.10g apart by %.1e; peak at %.8g and %.8g", m.L, m.M, m.Infinity.Energy.Value, d, m.Peak.U.Value, o.Peak.U.Value)
		if d > 1e-6 {
			t.Errorf("(%d,%d): radiated %.10g, the geodesic %.10g", m.L, m.M, o.Infinity.Energy.Value, m.Infinity.Energy.Value)
		}
		if d := math.Abs(o.Peak.U.Value - shift - m.Peak.U.Value); d > 1e-4 {
			t.Errorf("(%d,%d): the peak is off by %.1e", m.L, m.M, d)
		}
	}
	for name, at := range a.Result.Orbit.Markers {
		if d := math.Abs(b.Result.Orbit.Markers[name] - shift - at); d > 1e-4 {
			t.Errorf("marker %s is off by %.1e", name, d)
		}
	}
	if d, ok := b.Result.Orbit.Numbers["own_energy_difference"]; !ok || math.Abs(d) > 1e-7 {
		t.Errorf("the table's own E and L change a geodesic's radiation by %g (%v)", d, ok)
	}
	t.Logf("%v %v %v", b.Result.Warnings, b.Result.Conventions["totals"], b.Result.Orbit.Numbers)
}

// TestScatteringTable: a passage as a table has the strain of the geodesic, in the
// table's own time, and says that its totals end with its rows.
func TestScatteringTable(t *testing.T) {
	from, asked := "orbit.from=80", "accuracy.relative=1e-4"
	if *long {
		from, asked = "orbit.from=400", "accuracy.relative=1e-6"
	}
	c := shipped(t, "scatter", from, "waves.modes=[[2,2],[2,1]]", asked)
	a := run(t, c)
	w, err := worldline.NewScatter(c.Orbit.Energy, c.Orbit.AngularMomentum, c.Orbit.From, 0, 0)
	if err != nil {
		t.Fatal(err)
	}
	_, t1 := w.Span()
	const shift = -20
	b := run(t, mustTable(t, writeTable(t, w, 0, t1, 0.5, shift, 17, false), "waves.modes=[[2,2],[2,1]]", asked))
	for i, m := range a.Series.Modes {
		o := b.Series.Modes[i]
		peak, worst := 0.0, 0.0
		for _, h := range m.Wave {
			peak = math.Max(peak, cmplx.Abs(h))
		}
		for k, u := range b.Series.U {
			// both grids of times are multiples of output.every, as shift is
			j := int(math.Round((u - shift - a.Series.U[0]) / c.Output.Every))
			if u < b.Series.JunkUntil || j >= len(m.Wave) {
				continue
			}
			d := cmplx.Abs(o.Wave[k] - m.Wave[j])
			worst = math.Max(worst, d/peak)
			if d > o.WaveErr[k]+m.WaveErr[j] {
				t.Errorf("(%d,%d) u = %g: strains apart by %.1e, bars %.1e and %.1e", m.L, m.M, u, d, o.WaveErr[k], m.WaveErr[j])
				break
			}
		}
		t.Logf("(%d,%d): apart by %.1e of the peak at most", m.L, m.M, worst)
		if worst > 1e-6 {
			t.Errorf("(%d,%d): strains apart by %.1e of the peak", m.L, m.M, worst)
		}
	}
	if w := strings.Join(b.Result.Warnings, "; "); !strings.Contains(w, "single passage") {
		t.Errorf("no word that the totals end with the rows: %s", w)
	}
}

// TestTableRefusals: what cannot be followed or averaged is refused in one
// sentence that names row and value, or how much is missing.
func TestTableRefusals(t *testing.T) {
	w, err := worldline.NewCircular(10, 0)
	if err != nil {
		t.Fatal(err)
	}
	good := writeTable(t, w, 0, 700, 1, 5, 17, false)
	text, err := os.ReadFile(good)
	if err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(string(text), "\n")
	row := func(i int, with string) string { // row i counted from 1
		out := append([]string{}, lines...)
		out[i] = with
		return strings.Join(out, "\n")
	}
	for _, k := range []struct {
		name, text, sets string
		says             []string
	}{
		{"horizon", row(51, "55,1.9,1.5"), "", []string{"orbit.file", "row 51, r = 1.9", "horizon"}},
		{"time", row(51, "54,10,1.5"), "", []string{"\"t\"", "line 52", "does not increase"}},
		{"word", row(51, "55,ten,1.5"), "", []string{"line 52", "\"r\""}},
		{"light", row(51, "55,14,1.5"), "", []string{"row 51, r = 14", "faster than light"}},
		{"gap", strings.Join(append(append([]string{}, lines[:100]...), lines[120:]...), "\n"), "", []string{"row 100, t = 124", "gap"}},
		{"no column", strings.Replace(string(text), "phi", "angle", 1), "", []string{"phi", "orbit.columns"}},
		{"short", strings.Join(lines[:500], "\n"), "", []string{"two azimuthal periods", "go on for"}},
		{"until late", string(text), "span.until=5000", []string{"span.until", "at most"}},
		{"until early", string(text), "span.until=300", []string{"span.until", "two azimuthal periods"}},
	} {
		path := filepath.Join(t.TempDir(), "bad.csv")
		if err := os.WriteFile(path, []byte(k.text), 0o644); err != nil {
			t.Fatal(err)
		}
		var sets []string
		if k.sets != "" {
			sets = []string{k.sets}
		}
		_, err := readTable(t, path, sets...)
		if err == nil {
			t.Errorf("%s: accepted", k.name)
			continue
		}
		t.Logf("%s: %v", k.name, err)
		for _, word := range k.says {
			if !strings.Contains(err.Error(), word) {
				t.Errorf("%s: %q does not say %q", k.name, err, word)
			}
		}
	}
	if _, err := readTable(t, good); err != nil {
		t.Errorf("the good table is refused: %v", err)
	}
	if _, err := readTable(t, filepath.Join(t.TempDir(), "none.csv")); err == nil || !strings.Contains(err.Error(), "none.csv") {
		t.Errorf("a missing file: %v", err)
	}
}
