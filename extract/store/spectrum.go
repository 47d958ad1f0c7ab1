package store

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"strconv"

	"nullmark/extract/result"
)

// checkSpectrum refuses what cannot be stored.
func checkSpectrum(s *result.Spectrum) error {
	if len(s.Density) != len(s.Omega) || len(s.Err) != len(s.Omega) {
		return &Invalid{File: spectrumFile, Path: "density", Problem: fmt.Sprintf("has %d samples and %d bars where omega has %d", len(s.Density), len(s.Err), len(s.Omega))}
	}
	for i := range s.Omega {
		for _, v := range []float64{s.Omega[i], s.Density[i], s.Err[i]} {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return &Invalid{File: spectrumFile, Path: fmt.Sprintf("row %d", i), Problem: "is not finite"}
			}
		}
	}
	return nil
}

// writeSpectrum writes spectrum.csv: a line of units, the header and one row a
// frequency, 17 significant digits.
func writeSpectrum(w io.Writer, s *result.Spectrum) error {
	var b bytes.Buffer
	b.WriteString("# G = c = M = 1; omega in 1/M, dE/domega at null infinity in mu^2, all modes that were run, both signs of omega and m; errors are absolute\n")
	b.WriteString("omega,density,density_error\n")
	for i := range s.Omega {
		b.WriteString(digits(s.Omega[i]) + "," + digits(s.Density[i]) + "," + digits(s.Err[i]) + "\n")
	}
	_, err := w.Write(b.Bytes())
	return err
}

// readSpectrum gives back what writeSpectrum stored, or nil where there is none.
func readSpectrum(dir string) (*result.Spectrum, error) {
	data, err := os.ReadFile(filepath.Join(dir, spectrumFile))
	if errors.Is(err, os.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, &FileSystem{Doing: "read " + spectrumFile + " of", Path: dir, Err: err}
	}
	damaged := func(err error) error {
		return &NotResult{Dir: dir, Reason: spectrumFile + " is damaged: " + err.Error(), Err: err}
	}
	rows := csv.NewReader(bytes.NewReader(data))
	rows.Comment = '#'
	rows.FieldsPerRecord = 3
	all, err := rows.ReadAll()
	if err != nil {
		return nil, damaged(err)
	}
	s := new(result.Spectrum)
	for i, row := range all {
		if i == 0 {
			continue // the header
		}
		for k, to := range []*[]float64{&s.Omega, &s.Density, &s.Err} {
			v, err := strconv.ParseFloat(row[k], 64)
			if err != nil {
				return nil, damaged(err)
			}
			*to = append(*to, v)
		}
	}
	return s, nil
}
