package store

import (
	"math/cmplx"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"nullmark/extract/result"
)

// What only pulses have comes back as it was written: the fitted tones, NaN
// before the fit begins, and the local index at every place.
func TestPulsesRoundTrip(t *testing.T) {
	b := sample(1)
	s := b.Series
	s.Prefix, s.T, s.R, s.Phi = "psi", nil, nil, nil
	tones := make([]complex128, len(s.U))
	for k := range tones {
		tones[k] = complex(float64(k), -1)
	}
	tones[0] = cmplx.NaN()
	s.Modes[1].Tones = tones
	s.Decay = []result.LocalIndex{
		{L: 2, M: 1, Where: "infinity", Times: []float64{700, 800}, Index: []float64{4.2, 4.1}, Error: []float64{1e-3, 2e-3}},
		{L: 2, M: 1, Where: "radius 10", Times: []float64{1, 2, 3}, Index: []float64{7, 8, 9}, Error: []float64{4, 5, 6}},
		{L: 12, M: -11, Where: "horizon", Times: []float64{}, Index: []float64{}, Error: []float64{}},
	}
	dir := filepath.Join(t.TempDir(), "r")
	mustWrite(t, dir, b, caseA)
	got, _, err := Read(dir)
	if err != nil {
		t.Fatal(err)
	}
	back := got.Series.Modes[1].Tones
	if len(back) != len(tones) || !cmplx.IsNaN(back[0]) || !reflect.DeepEqual(back[1:], tones[1:]) {
		t.Error("the tones came back changed")
	}
	if !reflect.DeepEqual(got.Series.Decay, s.Decay) {
		t.Errorf("the local indices came back as %+v", got.Series.Decay)
	}
	s.Decay[0].Error = s.Decay[0].Error[:1]
	err = Write(filepath.Join(t.TempDir(), "r"), b, []byte(caseA), all(), false)
	if err == nil || !strings.Contains(err.Error(), "index_err_2_1_infinity") {
		t.Errorf("a bar too few: %v", err)
	}
}

// An index whose times are missing, or belong elsewhere, is refused.
func TestStrayIndexIsRefused(t *testing.T) {
	for _, list := range [][]array{
		{{name: "index_2_1_infinity", reals: []float64{1}}},
		{{name: "index_t_2_1_horizon", reals: []float64{1}}, {name: "index_2_1_infinity", reals: []float64{1}}},
		{{name: "index_t_2_1_horizon", reals: []float64{1}}, {name: "index_err_2_1_horizon", reals: []float64{1, 2}}},
		{{name: "index_2_1_", reals: []float64{1}}},
	} {
		s, last := new(result.Series), ""
		for _, a := range list {
			last = takeWave(s, a)
		}
		if last == "" {
			t.Errorf("%s is taken", list[len(list)-1].name)
		}
	}
}
