package store

import (
	"archive/zip"
	"bytes"
	"errors"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nullmark/extract/result"
)

// writeSpoiled copies a zip archive with from replaced by to in every entry;
// the checksums are those of the spoilt data, so that only the array's own
// format is wrong.
func writeSpoiled(w io.Writer, archive []byte, from, to string) error {
	in, err := zip.NewReader(bytes.NewReader(archive), int64(len(archive)))
	if err != nil {
		return err
	}
	out := zip.NewWriter(w)
	for _, f := range in.File {
		rc, err := f.Open()
		if err != nil {
			return err
		}
		data, err := io.ReadAll(rc)
		if err != nil {
			return err
		}
		entry, err := out.Create(f.Name)
		if err != nil {
			return err
		}
		if _, err := entry.Write(bytes.ReplaceAll(data, []byte(from), []byte(to))); err != nil {
			return err
		}
	}
	return out.Close()
}

// npyio reads a file that ends early as if the last number went on; we must not.
func TestSpoiltArraysAreRefused(t *testing.T) {
	var good bytes.Buffer
	if err := writeNPZ(&good, []array{{name: "u", reals: []float64{1, 2}}, {name: "h_2_2", complex: []complex128{1, 2i}}}); err != nil {
		t.Fatal(err)
	}
	for _, c := range [][2]string{
		{"(2,)", "(3,)"}, {"(2,)", "(1,)"}, {"(2,)", "(-2,)"}, {"(2,)", "(99999999999,)"}, {"(2,)", "(2,1)"}, {"(2,)", "()"},
		{"<f8", "<i8"}, {"<f8", ">f8"}, {"<f8", "<c16"}, {"<c16", "<f8"}, {"\n", " "}, {"'shape'", "'sharp'"},
		{"NUMPY\x01", "NUMPY\x02"}, {"NUMPY", "LUMPY"}, {"}", " "}, {"False", "Maybe"},
	} {
		dir := t.TempDir()
		var spoilt bytes.Buffer
		if err := writeSpoiled(&spoilt, good.Bytes(), c[0], c[1]); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(dir, waveformFile), spoilt.Bytes(), 0o666); err != nil {
			t.Fatal(err)
		}
		s := new(result.Series)
		_, err := readNPZ(dir, waveformFile, func(a array) string { return takeWave(s, a) })
		var not *NotResult
		if !errors.As(err, &not) || !strings.Contains(err.Error(), waveformFile) {
			t.Errorf("%q for %q: %v", c[1], c[0], err)
		}
	}
}
