package app

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nullmark/cmd/internal/wire"
	"nullmark/configs"
	"nullmark/extract/result"
)

// ringEngine finishes at once with a circular orbit of one mode whose bar is
// a hundredth of the asked accuracy, or 1e-3 as long as no more than 1e-6 is asked.
func ringEngine() Engine {
	return fake(func(_ context.Context, kase *configs.Case, _ wire.Options) (*result.Bundle, error) {
		b := bundleOf(kase, true)
		rel := kase.Accuracy.Relative / 100
		if kase.Accuracy.Relative >= 1e-6 {
			rel = 1e-3
		}
		b.Result.Orbit.Numbers["omega_phi"] = math.Pow(10, -1.5)
		s := &result.Series{Prefix: "h", HorizonPrefix: "psi", JunkUntil: 20}
		wave := result.ModeSeries{L: 2, M: 2}
		for u := 0.0; u <= 300; u += 0.5 {
			s.U, s.T, s.R, s.Phi = append(s.U, u), append(s.T, u), append(s.R, 10), append(s.Phi, u*math.Pow(10, -1.5))
			wave.Wave = append(wave.Wave, ringAt(u))
			wave.WaveErr = append(wave.WaveErr, rel*cmplx.Abs(ringAt(u)))
		}
		s.Modes = []result.ModeSeries{wave}
		b.Series = s
		return b, nil
	})
}

func ringAt(u float64) complex128 {
	return 0.58 * cmplx.Exp(complex(0, -2*math.Pow(10, -1.5)*u))
}

// modelFile writes the mode times a factor as csv, conjugated on request.
func modelFile(t *testing.T, path string, factor float64, conj bool) {
	t.Helper()
	var b strings.Builder
	b.WriteString("# M, 1, 1\nt,re,im\n")
	for u := 0.0; u <= 290; u += 0.5 {
		h := complex(factor, 0) * ringAt(u)
		if conj {
			h = cmplx.Conj(h)
		}
		fmt.Fprintf(&b, "%g,%.17g,%.17g\n", u, real(h), imag(h))
	}
	put(t, path, b.String())
}

const modelYAML = `model:
  name: mine
  waveform: {file: m.csv, modes: {"2,2": [re, im]}}
`

func TestCompare(t *testing.T) {
	room(t)
	put(t, "case.yaml", strings.Replace(circularCase, "1.0e-6", "1.0e-7", 1))
	if got := try(t, ringEngine(), "run", "case.yaml", "--out", "res", "--quiet"); got.code != ExitDone {
		t.Fatalf("%+v", got)
	}
	put(t, "model.yaml", modelYAML)
	modelFile(t, "m.csv", 1, false)
	got := try(t, ringEngine(), "compare", "res", "--model", "model.yaml", "--strict")
	if got.code != ExitDone || !strings.Contains(got.stdout, "agrees with the reference inside the error bar") {
		t.Errorf("a right model: %+v", got)
	}
	for _, name := range []string{"comparison.json", "comparison.html", "comparison.csv"} {
		if _, err := os.Stat(filepath.Join("res", name)); err != nil {
			t.Error(err)
		}
	}
	modelFile(t, "m.csv", 1.001, false)
	got = try(t, ringEngine(), "compare", "res", "--model", "model.yaml", "--json", "--out", "elsewhere")
	var c result.Comparison
	if err := json.Unmarshal([]byte(got.stdout), &c); err != nil || got.code != ExitDone || c.Schema != result.ComparisonSchema || c.Overall.Verdict != result.Differs {
		t.Errorf("a wrong model: %v %+v", err, got)
	}
	stored, err := os.ReadFile(filepath.Join("elsewhere", "comparison.json"))
	if err != nil || string(stored) != got.stdout {
		t.Errorf("--json is not comparison.json: %v", err)
	}
	if got = try(t, ringEngine(), "compare", "res", "--model", "model.yaml", "--strict"); got.code != ExitNotMet {
		t.Errorf("--strict: %+v", got)
	}
	modelFile(t, "m.csv", 1, true)
	if got = try(t, ringEngine(), "compare", "res", "--model", "model.yaml"); !strings.Contains(got.stdout, "The difference vanishes if phase: plus.") {
		t.Errorf("no hint: %+v", got)
	}
	if got = try(t, ringEngine(), "compare", "res", "--model", "model.yaml", "--set", "model.phase=plus", "--strict"); got.code != ExitDone {
		t.Errorf("--set: %+v", got)
	}
	if got = try(t, ringEngine(), "compare", "res", "--with", "res", "--strict"); got.code != ExitDone || !strings.Contains(got.stdout, "0 of ") {
		t.Errorf("--with: %+v", got)
	}
}

// A model in the case itself needs no --model; one that is missing is said.
func TestCompareUsesTheCasesModel(t *testing.T) {
	room(t)
	put(t, "case.yaml", circularCase+modelYAML)
	modelFile(t, "m.csv", 1, false)
	if got := try(t, ringEngine(), "run", "case.yaml", "--out", "res", "--quiet"); got.code != ExitDone {
		t.Fatalf("%+v", got)
	}
	if got := try(t, ringEngine(), "compare", "res"); got.code != ExitDone || !strings.Contains(got.stdout, "inside the error bar") {
		t.Errorf("%+v", got)
	}
	modelFile(t, "m.csv", 1, true)
	if got := try(t, ringEngine(), "compare", "res", "--set", "model.phase=plus", "--strict"); got.code != ExitDone {
		t.Errorf("--set on the case's model: %+v", got)
	}
	for what, c := range map[string]struct {
		args []string
		code int
		want string
	}{
		"no model":       {[]string{"compare", "bare"}, ExitUsage, "the case of bare names no model"},
		"no file":        {[]string{"compare", "res", "--set", "model.waveform.file=none.npz"}, ExitUsage, "none.npz: cannot be opened: no such file"},
		"no column":      {[]string{"compare", "res", "--set", "model.waveform.time=u"}, ExitUsage, `m.csv: column "u": is not there; the file holds: t, re, im`},
		"no other":       {[]string{"compare", "res", "--with", "nowhere"}, ExitUsage, "nowhere is not a usable result directory"},
		"not a model":    {[]string{"compare", "res", "--model", "case.yaml"}, ExitUsage, "does not belong in a model file"},
		"--set of a run": {[]string{"compare", "res", "--set", "orbit.radius=7"}, ExitUsage, "--set orbit.radius=7 changes nothing of a finished run's model"},
		"--set and with": {[]string{"compare", "res", "--with", "res", "--set", "model.phase=plus"}, ExitUsage, "--set changes a model"},
	} {
		if what == "no model" {
			put(t, "plain.yaml", circularCase)
			if got := try(t, ringEngine(), "run", "plain.yaml", "--out", "bare", "--quiet"); got.code != ExitDone {
				t.Fatalf("%+v", got)
			}
		}
		if got := try(t, ringEngine(), c.args...); got.code != c.code || !strings.Contains(got.stderr, c.want) {
			t.Errorf("%s: %+v, want %q", what, got, c.want)
		}
	}
}

// What is wrong with a model's file is said in one sentence with file and row,
// and ends with the exit code of bad input.
func TestCompareRefusesBadFiles(t *testing.T) {
	room(t)
	put(t, "case.yaml", circularCase)
	if got := try(t, ringEngine(), "run", "case.yaml", "--out", "res", "--quiet"); got.code != ExitDone {
		t.Fatalf("%+v", got)
	}
	put(t, "model.yaml", modelYAML)
	modelFile(t, "m.csv", 1, false)
	data, err := os.ReadFile("m.csv")
	if err != nil {
		t.Fatal(err)
	}
	good := string(data)
	row := strings.Split(good, "\n")[12] // the line 13 of the file
	for what, c := range map[string]struct{ file, text, want string }{
		"not a number":   {"m.csv", strings.Replace(good, row, "5,NaN,0", 1), `m.csv: line 13: column "re": is not a finite number`},
		"infinite":       {"m.csv", strings.Replace(good, row, "5,0,Inf", 1), `m.csv: line 13: column "im": is not a finite number`},
		"time":           {"m.csv", strings.Replace(good, row, "4.5,0,0", 1), `m.csv: line 13: column "t": does not increase`},
		"missing cell":   {"m.csv", strings.Replace(good, row, "5,0.1", 1), "m.csv: line 13: column \"im\": has 2 cells where the lines above have 3"},
		"empty cell":     {"m.csv", strings.Replace(good, row, "5,,0", 1), `m.csv: line 13: column "re": is empty`},
		"no overlap":     {"m.csv", late(good), "5000 … 5290 and the reference's 20 … 300"},
		"text as npz":    {"m.npz", good, "m.npz: is named .npz but holds text"},
		"truncated npz":  {"m.npz", "PK\x03\x04\x14\x00", "m.npz: is no complete zip archive"},
		"nothing at all": {"m.csv", "", "m.csv: "},
	} {
		put(t, c.file, c.text)
		got := try(t, ringEngine(), "compare", "res", "--model", "model.yaml", "--set", "model.waveform.file="+c.file)
		if got.code != ExitUsage || !strings.Contains(got.stderr, c.want) || strings.Count(strings.TrimSpace(got.stderr), "\n") > 0 {
			t.Errorf("%s: %d %q, want %q", what, got.code, got.stderr, c.want)
		}
	}
}

// late moves all times of a csv by 5000.
func late(text string) string {
	lines := strings.Split(text, "\n")
	for i, l := range lines {
		var x float64
		if n, _ := fmt.Sscanf(l, "%g,", &x); n == 1 {
			_, rest, _ := strings.Cut(l, ",")
			lines[i] = fmt.Sprintf("%g,%s", x+5000, rest)
		}
	}
	return strings.Join(lines, "\n")
}

// Where the result cannot tell, --settle runs the case again and then it can.
func TestCompareSettles(t *testing.T) {
	room(t)
	put(t, "case.yaml", circularCase)
	if got := try(t, ringEngine(), "run", "case.yaml", "--out", "res", "--quiet"); got.code != ExitDone {
		t.Fatalf("%+v", got)
	}
	put(t, "model.yaml", modelYAML)
	modelFile(t, "m.csv", 1.0015, false)
	got := try(t, ringEngine(), "compare", "res", "--model", "model.yaml")
	if got.code != ExitDone || !strings.Contains(got.stdout, "cannot be told") || !strings.Contains(got.stdout, "accuracy.relative: 3e-7") {
		t.Fatalf("%+v", got)
	}
	got = try(t, ringEngine(), "compare", "res", "--model", "model.yaml", "--settle")
	if got.code != ExitDone || !strings.Contains(got.stdout, "too large by 0.0015") {
		t.Errorf("%+v", got)
	}
	if _, err := os.Stat(filepath.Join("res-3e-07", "comparison.html")); err != nil {
		t.Error(err)
	}
}
