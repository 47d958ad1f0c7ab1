package store

import (
	"crypto/sha256"
	"encoding/csv"
	"encoding/hex"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"nullmark/extract/result"
)

func TestFluxTable(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "r")
	b := sample(1)
	mustWrite(t, dir, b, caseA)
	data, err := os.ReadFile(filepath.Join(dir, "flux.csv"))
	if err != nil {
		t.Fatal(err)
	}
	first, rest, _ := strings.Cut(string(data), "\n")
	if !strings.HasPrefix(first, "# ") || !strings.Contains(first, "(mu/M)^2") || strings.Contains(rest, "#") {
		t.Errorf("first line %q", first)
	}
	rows, err := csv.NewReader(strings.NewReader(rest)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if len(rows) != 1+2+2 {
		t.Fatalf("%d rows", len(rows))
	}
	head := rows[0]
	column := map[string]int{}
	for i, name := range head {
		column[name] = i
	}
	for _, name := range []string{"energy_infinity", "energy_horizon", "angular_momentum_infinity", "angular_momentum_horizon"} {
		if i, ok := column[name]; !ok || head[i+1] != name+"_error" {
			t.Errorf("column %s and its error: %v", name, head)
		}
	}
	r := b.Result
	for i, want := range []struct {
		row, l, m string
		inf, hor  *result.Flux
	}{
		{"mode", "2", "1", r.Modes[0].Infinity, r.Modes[0].Horizon},
		{"mode", "2", "2", r.Modes[1].Infinity, nil},
		{"sum", "", "", r.Total.Infinity, r.Total.Horizon},
		{"truncation", "", "", r.Total.Truncation.Infinity, nil},
	} {
		row := rows[i+1]
		if row[column["row"]] != want.row || row[column["l"]] != want.l || row[column["m"]] != want.m {
			t.Errorf("row %d: %v", i, row)
		}
		for end, f := range map[string]*result.Flux{"infinity": want.inf, "horizon": want.hor} {
			var q [2]*result.Q
			if f != nil {
				q = [2]*result.Q{&f.Energy, &f.AngularMomentum}
			}
			for k, name := range []string{"energy_", "angular_momentum_"} {
				at := column[name+end]
				if q[k] == nil {
					if row[at] != "" || row[at+1] != "" {
						t.Errorf("row %d: %s%s should be empty: %v", i, name, end, row)
					}
					continue
				}
				x, errX := strconv.ParseFloat(row[at], 64)
				e, errE := strconv.ParseFloat(row[at+1], 64)
				if errX != nil || errE != nil || x != q[k].Value || e != q[k].Error {
					t.Errorf("row %d, %s%s: %s %s, want %v", i, name, end, row[at], row[at+1], *q[k])
				}
				mantissa, _, _ := strings.Cut(row[at], "e")
				if digits := strings.Trim(strings.Replace(mantissa, ".", "", 1), "-"); len(digits) != 17 {
					t.Errorf("row %d: %q has %d digits", i, row[at], len(digits))
				}
			}
		}
	}
}

func TestCheckListsEveryDifference(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "r")
	mustWrite(t, dir, sample(1), caseA)

	// SHA256SUMS is what its definition says, computed here anew.
	var want strings.Builder
	for _, name := range []string{"case.yaml", "flux.csv", "horizon.npz", "report.html", "result.json", "waveform.npz"} {
		data, err := os.ReadFile(filepath.Join(dir, name))
		if err != nil {
			t.Fatal(err)
		}
		digest := sha256.Sum256(data)
		fmt.Fprintf(&want, "%s  %s\n", hex.EncodeToString(digest[:]), name)
	}
	if got, err := os.ReadFile(filepath.Join(dir, "SHA256SUMS")); err != nil || string(got) != want.String() {
		t.Errorf("SHA256SUMS is\n%s\nwant\n%s", got, want.String())
	}

	path := filepath.Join(dir, "waveform.npz")
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	data[len(data)/2] ^= 1
	if err := errors.Join(os.WriteFile(path, data, 0o666), os.Remove(filepath.Join(dir, "flux.csv")), os.WriteFile(filepath.Join(dir, "case.yaml"), nil, 0o666)); err != nil {
		t.Fatal(err)
	}
	var damaged *Damaged
	if err := Check(dir); !errors.As(err, &damaged) {
		t.Fatal(err)
	}
	var got []string
	for _, f := range damaged.Files {
		got = append(got, f.Name)
	}
	if !slices.Equal(got, []string{"case.yaml", "flux.csv", "waveform.npz"}) {
		t.Errorf("Check lists %v", damaged)
	}
	// The flipped bit is found by Read, too: an entry has a checksum.
	var not *NotResult
	if _, _, err := Read(dir); !errors.As(err, &not) || !strings.Contains(err.Error(), "waveform.npz") {
		t.Errorf("Read of a flipped bit: %v", err)
	}
	for name, content := range map[string]string{
		"empty":     "",
		"malformed": "no sums here\n",
		"escaping":  strings.Repeat("0", 64) + "  ../case.yaml\n",
	} {
		if err := os.WriteFile(filepath.Join(dir, "SHA256SUMS"), []byte(content), 0o666); err != nil {
			t.Fatal(err)
		}
		if err := Check(dir); !errors.As(err, &damaged) {
			t.Errorf("%s sums: %v", name, err)
		}
	}
	if err := os.Remove(filepath.Join(dir, "SHA256SUMS")); err != nil {
		t.Fatal(err)
	}
	if err := Check(dir); !errors.As(err, &damaged) {
		t.Errorf("no sums: %v", err)
	}
}

func TestReadRefuses(t *testing.T) {
	whole := filepath.Join(t.TempDir(), "r")
	mustWrite(t, whole, sample(1), caseA)
	for name, c := range map[string]struct {
		spoil func(dir string) error
		says  string
	}{
		"no case":     {func(dir string) error { return os.Remove(filepath.Join(dir, "case.yaml")) }, "case.yaml"},
		"no result":   {func(dir string) error { return os.Remove(filepath.Join(dir, "result.json")) }, "result.json"},
		"half result": {func(dir string) error { return os.Truncate(filepath.Join(dir, "result.json"), 100) }, "result.json"},
		"other schema": {func(dir string) error {
			return os.WriteFile(filepath.Join(dir, "result.json"), []byte(`{"schema":"nullmark.result/9"}`), 0o666)
		}, "nullmark.result/9"},
		"half waveform": {func(dir string) error { return os.Truncate(filepath.Join(dir, "waveform.npz"), 1000) }, "waveform.npz"},
		"no zip": {func(dir string) error {
			return os.WriteFile(filepath.Join(dir, "horizon.npz"), []byte("not a zip archive"), 0o666)
		}, "horizon.npz"},
		"gone": {func(dir string) error { return os.RemoveAll(dir) }, "does not exist"},
	} {
		dir := filepath.Join(t.TempDir(), "copy")
		if err := errors.Join(os.CopyFS(dir, os.DirFS(whole)), c.spoil(dir)); err != nil {
			t.Fatal(err)
		}
		_, _, err := Read(dir)
		var not *NotResult
		if !errors.As(err, &not) || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%s: %v", name, err)
		}
	}
}
