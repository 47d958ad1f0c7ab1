package compare

import (
	"bytes"
	"encoding/json"
	"math"
	"math/cmplx"
	"math/rand"
	"strings"
	"testing"

	"nullmark/extract/result"
)

func TestInputFaults(t *testing.T) {
	ref := reference(someModes, 1e-9, nil)
	late := model(grid(1000, 1100, 1), someModes, truth)
	_, _, err := Compare(Input{Reference: ref, Model: late})
	if err == nil || !strings.Contains(err.Error(), "1000 … 1100") || !strings.Contains(err.Error(), "40 … 560") {
		t.Errorf("no overlap: %v", err)
	}
	_, _, err = Compare(Input{Reference: ref, Model: model(grid(0, 500, 1), [][2]int{{5, 5}}, truth)})
	if err == nil || !strings.Contains(err.Error(), "no mode in common") {
		t.Errorf("no common mode: %v", err)
	}
	_, _, err = Compare(Input{Reference: ref, Model: late, Convention: Convention{Phase: "positive"}})
	if err == nil || !strings.Contains(err.Error(), `model.phase is "positive"`) {
		t.Errorf("unknown word: %v", err)
	}
	_, _, err = Compare(Input{Reference: ref, Model: late, Convention: Convention{TimeIs: "particle"}})
	if err == nil || !strings.Contains(err.Error(), "no orbit") {
		t.Errorf("particle time without orbit: %v", err)
	}
	_, _, err = Compare(Input{Reference: ref, Model: model(grid(0, 560, 1), someModes, truth), Align: &[2]float64{900, 950}})
	if err == nil || !strings.Contains(err.Error(), "align.window [900, 950]") {
		t.Errorf("window outside: %v", err)
	}
	c := mustCompare(t, Input{Reference: ref, Model: model(grid(0, 560, 0.5), [][2]int{{2, 2}, {5, 5}}, truth)})
	if len(c.Warnings) != 2 || !strings.Contains(c.Warnings[0], "(5,5)") || !strings.Contains(c.Warnings[1], "(2,1)") {
		t.Errorf("warnings %q", c.Warnings)
	}
}

func TestCoarseModelIsNotBlamed(t *testing.T) {
	c := mustCompare(t, Input{Reference: reference(someModes, 1e-10, nil), Model: model(grid(0, 560, 2), someModes, truth)})
	for _, m := range c.Modes {
		if m.Verdict == result.Differs {
			t.Errorf("%s", m.Sentence)
		}
	}
	if c.Overall.Verdict != result.CannotTell || !strings.Contains(c.Modes[1].Sentence, "more finely") {
		t.Error(c.Modes[1].Sentence)
	}
}

// comparison.json holds no number that JSON cannot, and reads back equal.
func TestJSONRoundTrip(t *testing.T) {
	ref := reference(append([][2]int{{2, 0}}, someModes...), 1e-9, nil)
	for _, w := range []*memory{
		model(grid(0, 560, 0.5), append([][2]int{{2, 0}}, someModes...), truth),
		model(grid(0, 560, 0.5), someModes, func(l, m int, u float64) complex128 { return 0 }),
	} {
		c, curves, err := Compare(Input{Reference: ref, Model: w})
		if err != nil {
			t.Fatal(err)
		}
		b, err := json.Marshal(c)
		if err != nil {
			t.Fatal(err)
		}
		var back result.Comparison
		if err := json.Unmarshal(b, &back); err != nil {
			t.Fatal(err)
		}
		again, _ := json.Marshal(&back)
		if !bytes.Equal(b, again) {
			t.Error("reading back changes it")
		}
		for _, key := range []string{`"schema":"nullmark.comparison/1"`, `"range":[`, `"shift":null`, `"verdict"`, `"snr_visible"`, `"by_stage"`, `"settings"`} {
			if !bytes.Contains(b, []byte(key)) {
				t.Errorf("no %s in %.300s", key, b)
			}
		}
		var csv bytes.Buffer
		if err := WriteCurves(&csv, curves); err != nil {
			t.Fatal(err)
		}
		lines := strings.Split(strings.TrimSpace(csv.String()), "\n")
		if len(lines) != len(curves.U)+2 || strings.Count(lines[0], ",") != strings.Count(lines[1], ",") || strings.Count(lines[1], ",") != strings.Count(lines[2], ",") {
			t.Errorf("csv: %d lines, %q", len(lines), lines[:2])
		}
	}
}

func TestVanishingReference(t *testing.T) {
	ref := reference([][2]int{{2, 0}, {2, 1}, {2, 2}}, 1e-9, nil)
	for i := range ref.Series.Modes {
		m := &ref.Series.Modes[i]
		for k, u := range ref.Series.U {
			if m.M < 2 || u > 300 && u < 301 {
				m.Wave[k], m.WaveErr[k] = 0, 0
			}
		}
	}
	c := mustCompare(t, Input{Reference: ref, Model: model(grid(0, 560, 0.5), [][2]int{{2, 0}, {2, 1}, {2, 2}}, truth)})
	if _, err := json.Marshal(c); err != nil {
		t.Fatal(err)
	}
	for _, m := range c.Modes {
		if m.Verdict != result.Differs {
			t.Errorf("%s", m.Sentence)
		}
	}
}

func TestOddModels(t *testing.T) {
	rng := rand.New(rand.NewSource(7))
	odd := map[string]func(l, m int, u float64) complex128{
		"noise":    func(int, int, float64) complex128 { return complex(rng.NormFloat64(), rng.NormFloat64()) },
		"constant": func(int, int, float64) complex128 { return 1 },
		"spikes": func(_, _ int, u float64) complex128 {
			if math.Mod(u, 50) == 0 {
				return 1
			}
			return 0
		},
		"tiny":     func(l, m int, u float64) complex128 { return 1e-300 * truth(l, m, u) },
		"huge":     func(l, m int, u float64) complex128 { return 1e39 * truth(l, m, u) },
		"too huge": func(int, int, float64) complex128 { return 1e200 },
		"fast":     func(l, m int, u float64) complex128 { return cmplx.Exp(complex(0, -6.1*u)) },
	}
	for name, f := range odd {
		for _, c := range []Convention{{}, {Quantity: "curvature"}, {Quantity: "master", Phase: "plus"}} {
			for _, align := range []*[2]float64{nil, {300, 400}} {
				got, curves, err := Compare(Input{Reference: reference(someModes, 1e-9, nil), Model: model(grid(0, 560, 0.5), someModes, f), Convention: c, Align: align})
				if err != nil {
					if _, ok := err.(*InputError); !ok {
						t.Errorf("%s: %T %v", name, err, err)
					}
					continue
				}
				if name == "too huge" {
					t.Errorf("%s: was believed", name)
				}
				if _, err := json.Marshal(got); err != nil {
					t.Errorf("%s %+v %v: %v", name, c, align, err)
				}
				if err := WriteCurves(&bytes.Buffer{}, curves); err != nil {
					t.Error(err)
				}
				for _, m := range got.Modes {
					if m.Verdict == result.Inside {
						t.Errorf("%s: %s", name, m.Sentence)
					}
				}
			}
		}
	}
}
