package store

import (
	"errors"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"testing"

	"nullmark/extract/result"
)

// TestSpectrumComesBack: every bit of a spectrum survives, a damaged file is named,
// and samples that are no numbers are refused.
func TestSpectrumComesBack(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "r")
	b := sample(3)
	b.Spectrum = &result.Spectrum{Omega: []float64{0, 0.1, 0.3}, Density: []float64{1e-300, math.Pi, 0}, Err: []float64{1e-9, 1. / 3, 2}}
	if err := Write(dir, b, []byte(caseA), Parts{Flux: true}, false); err != nil {
		t.Fatal(err)
	}
	back, _, err := Read(dir)
	if err != nil || !reflect.DeepEqual(back.Spectrum, b.Spectrum) {
		t.Errorf("%+v came back as %+v (%v)", b.Spectrum, back.Spectrum, err)
	}
	path := filepath.Join(dir, spectrumFile)
	if err := os.WriteFile(path, []byte("omega,density,density_error\n1,2\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	var damaged *NotResult
	if _, _, err := Read(dir); !errors.As(err, &damaged) {
		t.Errorf("a damaged spectrum gives %v", err)
	}
	b.Spectrum.Err[1] = math.NaN()
	var invalid *Invalid
	if err := Write(dir, b, []byte(caseA), Parts{Flux: true}, false); !errors.As(err, &invalid) {
		t.Errorf("a bar that is no number gives %v", err)
	}
	b.Spectrum.Err = b.Spectrum.Err[:2]
	if err := Write(dir, b, []byte(caseA), Parts{Flux: true}, false); !errors.As(err, &invalid) {
		t.Errorf("a missing bar gives %v", err)
	}
}
