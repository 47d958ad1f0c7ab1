package main

import (
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nullmark/configs"
	"nullmark/extract/compare"
	"nullmark/extract/result"
	"nullmark/extract/store"
	"nullmark/extract/table"
)

// The faults that the program documents are what a comparison finds. The
// reference is a circular orbit at r = 10 with frequency-domain amplitudes and
// invented bars.
func TestFaultsAreFound(t *testing.T) {
	omega := math.Pow(10, -1.5)
	q := func(x float64) result.Q { return result.Q{Value: x, Error: 1e-9 * x} }
	total := &result.Flux{Energy: q(6.150372549041e-5), AngularMomentum: q(6.150372549041e-5 / omega)}
	b := &result.Bundle{Result: &result.Result{Schema: result.Schema, Orbit: &result.Orbit{Kind: "circular", Numbers: map[string]float64{"omega_phi": omega}},
		Total: &result.Total{Measure: "rate", Infinity: total}, Accuracy: result.Accuracy{Asked: 1e-9, Met: true}, Warnings: []string{}},
		Series: &result.Series{Prefix: "h", HorizonPrefix: "psi", JunkUntil: 100}}
	s := b.Series
	for u := 0.0; u <= 500; u += 0.5 {
		s.U, s.T, s.R, s.Phi = append(s.U, u), append(s.T, u), append(s.R, 10), append(s.Phi, omega*u)
	}
	for _, m := range []struct {
		l, m int
		h    complex128
	}{{2, 1, 0.013594004 + 0.068336424i}, {2, 2, -0.560320396 + 0.152880419i}, {3, 2, -0.016204208 + 0.006225749i}, {3, 3, -0.059153776 - 0.120190845i}} {
		w := result.ModeSeries{L: m.l, M: m.m}
		for _, u := range s.U {
			w.Wave = append(w.Wave, m.h*cmplx.Exp(complex(0, -float64(m.m)*omega*u)))
			w.WaveErr = append(w.WaveErr, 1e-9*cmplx.Abs(m.h))
		}
		s.Modes = append(s.Modes, w)
	}
	dir := t.TempDir()
	from, to := filepath.Join(dir, "result"), filepath.Join(dir, "invented")
	if err := store.Write(from, b, []byte("title: x\n"), store.Parts{Waveform: true, Flux: true}, false); err != nil {
		t.Fatal(err)
	}
	if err := write(from, to); err != nil {
		t.Fatal(err)
	}
	c, model := compared(t, b, filepath.Join(to, "model.yaml"))
	for i, want := range []string{"the sign of the mode is reversed", "drifts by +2.00e-4", "(3,2) agrees", "too small by 0.01 "} {
		if !strings.Contains(c.Modes[i].Sentence, want) {
			t.Errorf("%q does not say %q", c.Modes[i].Sentence, want)
		}
	}
	for _, name := range []string{model.Force.File, model.Flux.File} {
		if _, err := os.Stat(name); err != nil {
			t.Error(err)
		}
	}
	if err := writeRight(from, to); err != nil {
		t.Fatal(err)
	}
	right, err := filepath.Glob(filepath.Join(to, "*-*.yaml"))
	if err != nil || len(right) != 12 {
		t.Fatalf("%v %v", right, err)
	}
	for _, path := range right {
		if c, _ := compared(t, b, path); c.Overall.Verdict != result.Inside {
			t.Errorf("%s: %s", path, c.Overall.Sentence)
		}
	}
	if write(filepath.Join(dir, "none"), to) == nil {
		t.Error("no result, and no error")
	}
}

// compared reads a model file and compares its waveform.
func compared(t *testing.T, b *result.Bundle, path string) (*result.Comparison, *configs.Model) {
	t.Helper()
	model, _, err := configs.Reader{}.ReadModel(path)
	if err != nil {
		t.Fatal(err)
	}
	tab, err := table.Open(model.Waveform.File)
	if err != nil {
		t.Fatal(err)
	}
	defer tab.Close()
	var columns []compare.ModeColumns
	for _, m := range model.Waveform.Modes {
		columns = append(columns, compare.ModeColumns{L: m.L, M: m.M, Arrays: m.Arrays})
	}
	wave, err := compare.NewFileWaveform(tab, model.Waveform.Time, columns)
	if err != nil {
		t.Fatal(err)
	}
	c, _, err := compare.Compare(compare.Input{Reference: b, Model: wave, Convention: compare.Convention{Quantity: model.Quantity, Phase: model.Phase, PhaseOf: model.PhaseOf}})
	if err != nil {
		t.Fatal(err)
	}
	return c, model
}
