package wire

import (
	"encoding/json"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"testing"

	"nullmark/extract/result"
	"nullmark/extract/ringing"
)

// wave returns a stored mode; it fails the test where there is none.
func wave(t testing.TB, s *result.Series, l, m int) *result.ModeSeries {
	t.Helper()
	for i := range s.Modes {
		if s.Modes[i].L == l && s.Modes[i].M == m {
			return &s.Modes[i]
		}
	}
	t.Fatalf("no stored mode (%d,%d)", l, m)
	return nil
}

func energyOfL(r *result.Result, l int) (q result.Q) {
	for _, m := range r.Modes {
		if m.L == l {
			q.Value += m.Infinity.Energy.Value
			q.Error += m.Infinity.Energy.Error
		}
	}
	return q
}

// TestPlungeConvergesThroughMerger: the geodesic plunge from the innermost stable
// circular orbit with another finest rung and another slicing: the strain agrees
// to 1e-10 of its peak through merger and to 1e-9 of itself 80 M after the peak.
func TestPlungeConvergesThroughMerger(t *testing.T) {
	modes := [][2]int{{2, 2}, {2, 1}, {3, 3}, {4, 4}}
	sets := []string{"accuracy.relative=1e-9", "output.every=0.25", "span.until=900"}
	first := run(t, shipped(t, "plunge", sets...))
	finest := first.Result.Rungs[len(first.Result.Rungs)-1].Points
	for name, change := range map[string][]string{
		"finer":   {fmt.Sprintf("numerics.points=%d", finest*5/4)},
		"slicing": {"numerics.layer=45"},
	} {
		other := run(t, shipped(t, "plunge", append(change, sets...)...))
		for _, lm := range modes {
			a, b := wave(t, first.Series, lm[0], lm[1]), wave(t, other.Series, lm[0], lm[1])
			top, peak := 0, 0.0
			for i, u := range first.Series.U {
				if v := cmplx.Abs(a.Wave[i]); u > first.Series.JunkUntil && v > peak {
					top, peak = i, v
				}
			}
			var through, late, covered float64
			n, in := 0, 0
			for i, u := range first.Series.U[:min(len(a.Wave), len(b.Wave))] {
				d := cmplx.Abs(a.Wave[i] - b.Wave[i])
				if u >= first.Series.U[top]-20 && u <= first.Series.U[top]+40 {
					through = math.Max(through, d/peak)
				}
				if u >= first.Series.U[top]+79 && u <= first.Series.U[top]+81 {
					late = math.Max(late, d/cmplx.Abs(a.Wave[i]))
				}
				if u > first.Series.JunkUntil {
					n++
					if d <= a.WaveErr[i]+b.WaveErr[i] {
						in++
					}
				}
			}
			covered = float64(in) / float64(n)
			t.Logf("%s (%d,%d): %.1e of the peak through merger, %.1e of itself at peak + 80 M, %.1f %% of the samples inside both bars",
				name, lm[0], lm[1], through, late, 100*covered)
			if through > 1e-10 || late > 1e-9 || covered < 0.97 {
				t.Errorf("%s (%d,%d): %.1e of the peak through merger (want 1e-10), %.1e at peak + 80 M (want 1e-9), coverage %.3f", name, lm[0], lm[1], through, late, covered)
			}
		}
	}
}

// TestPlungeRings: the frequency of the (2,2) ringdown against E. W. Leaver, Proc.
// R. Soc. A 402, 285 (1985), recomputed by his continued fraction, and the orbital
// frequency's peak sqrt(6)/18 at the light ring (exact).
func TestPlungeRings(t *testing.T) {
	want := complex(0.373671684418, -0.088962315689)
	b := run(t, shipped(t, "plunge", "waves.modes=[[2,2]]", "accuracy.relative=1e-9", "output.every=0.25"))
	m := wave(t, b.Series, 2, 2)
	top := 0
	for i, u := range b.Series.U {
		if u > b.Series.JunkUntil && cmplx.Abs(m.Wave[i]) > cmplx.Abs(m.Wave[top]) {
			top = i
		}
	}
	first := top + 80 // 20 M after the peak
	fit, err := ringing.Analyse(ringing.Series{Start: b.Series.U[top], Step: 0.25, Values: m.Wave[top:]}, ringing.Options{L: 2, M: 2, From: &b.Series.U[first]})
	if err != nil {
		t.Fatal(err)
	}
	mode := fit.Find(2, 2, 0)
	got := complex(mode.Omega.Re.Value, mode.Omega.Im.Value)
	bar := mode.Omega.Re.Error + mode.Omega.Im.Error
	t.Logf("ringdown frequency off by %.1e, bar %.1e", cmplx.Abs(got-want), bar)
	if off := cmplx.Abs(got - want); off > 1e-9 || off > bar {
		t.Errorf("omega = %.9f, Leaver's %.9f: off by %.1e, bar %.1e", got, want, off, bar)
	}
	// The run quotes the same by itself.
	quoted := false
	for _, q := range b.Result.Ringing {
		if q.L != 2 || q.M != 2 || q.N != 0 {
			continue
		}
		quoted = true
		if math.Abs(q.Re.Value-real(want)) > q.Re.Error || math.Abs(q.Im.Value-imag(want)) > q.Im.Error || q.Re.Error > 1e-9 {
			t.Errorf("the result quotes %.12g(%.1e) %.12g(%.1e) i for %v", q.Re.Value, q.Re.Error, q.Im.Value, q.Im.Error, want)
		}
	}
	if !quoted {
		t.Errorf("the result quotes no ringing of (2,2): %v", b.Result.Warnings)
	}
	c := shipped(t, "plunge")
	w, err := burstPath(c)
	if err != nil {
		t.Fatal(err)
	}
	if got := peakOmega(w); math.Abs(got-math.Sqrt(6)/18) > 1e-12*got {
		t.Errorf("orbital frequency peaks at %.16g, want sqrt(6)/18", got)
	}
}

// TestInfallReachesTheReference: energy in l = 2 of the fall from rest at infinity
// against the independent value, within 1e-5 and inside the bar; up to l = 6
// (-long) against 0.0104 of M. Davis, R. Ruffini, W. H. Press, R. H. Price, Phys.
// Rev. Lett. 27, 1466 (1971), from memory.
func TestInfallReachesTheReference(t *testing.T) {
	data, err := os.ReadFile(filepath.Join("..", "verify", "published", "infall.json"))
	if err != nil {
		t.Fatal(err)
	}
	var table struct {
		PerL []struct {
			L      int
			Energy float64
		} `json:"per_l"`
	}
	if err := json.Unmarshal(data, &table); err != nil {
		t.Fatal(err)
	}
	// The fall along an axis excites each l with a single amplitude: turned into
	// the plane it is shared among the m by known numbers, here (l,m) = (2,2)
	// twice over (2,0): 2 |d^2_20(pi/2)|^2/|d^2_00(pi/2)|^2 = 2 (3/8)/(1/4) = 3.
	sets, share := []string{"waves.modes=[[2,0]]", "accuracy.relative=1e-3"}, 4.0
	if *long {
		sets, share = nil, 1
	}
	res := run(t, shipped(t, "infall", sets...)).Result
	q, want := energyOfL(res, 2), table.PerL[0].Energy
	q.Value, q.Error = share*q.Value, share*q.Error
	off := math.Abs(q.Value - want)
	t.Logf("l = 2: off by %.1e, bar %.1e; %.1f core-seconds", off/want, q.Error/want, res.Provenance.CoreSeconds)
	if off > 1e-5*want || off > q.Error {
		t.Errorf("l = 2: %.10g, want %.10g: off by %.1e, bar %.1e", q.Value, want, off/want, q.Error/want)
	}
	if !*long {
		return
	}
	ratio := res.Find(2, 2).Infinity.Energy.Value / res.Find(2, 0).Infinity.Energy.Value
	if math.Abs(ratio-3) > 1e-6 {
		t.Errorf("energy of (2,2) over (2,0) is %.9g, want 3", ratio)
	}
	if v := res.Total.Infinity.Energy.Value; math.Abs(v-0.0104) > 0.00005 {
		t.Errorf("total %.6g, published 0.0104", v)
	}
	t.Logf("total to l = 6 with tail: %.9g +- %.1e", res.Total.Infinity.Energy.Value, res.Total.Infinity.Energy.Error)
}
