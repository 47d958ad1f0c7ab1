package wire

import (
	"encoding/json"
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
			if math.Abs(x.got-x.want) > x.bar+2e-12*x.want {
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
			want = append(want, truth{m.L, m.M, m.Infinity, m.Horizon})
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

var _ = json.Marshal
