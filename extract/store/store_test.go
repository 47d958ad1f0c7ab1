package store

import (
	"bytes"
	"encoding/json"
	"errors"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"syscall"
	"testing"

	"nullmark/extract/result"
)

const caseA = "title: an invented orbit\norbit:\n  kind: circular\n  radius: 10\n"
const caseB = "title: another invented orbit\norbit:\n  kind: circular\n  radius: 6\n"

// sample is an invented result; seed changes its numbers.
func sample(seed float64) *result.Bundle {
	q := func(x float64) result.Q { return result.Q{Value: x * seed, Error: math.Abs(x) * 1e-10} }
	flux := func(x float64) *result.Flux {
		return &result.Flux{Energy: q(x / 3), AngularMomentum: q(x * math.Pi)}
	}
	n, nv := 5000, 77
	series := &result.Series{Prefix: "h", HorizonPrefix: "psi", JunkUntil: 123.25 * seed}
	for i := range n {
		series.U = append(series.U, 0.5*float64(i))
		series.T = append(series.T, 0.25*float64(i))
		series.R = append(series.R, 10)
		series.Phi = append(series.Phi, 0.01*float64(i)*seed)
	}
	series.T, series.R, series.Phi = series.T[:n-1], series.R[:n-1], series.Phi[:n-1]
	for i := range nv {
		series.V = append(series.V, 0.75*float64(i))
	}
	for k, lm := range [][2]int{{2, 1}, {2, 2}, {3, -1}, {12, -11}} {
		m := result.ModeSeries{L: lm[0], M: lm[1]}
		for i := range n {
			s, c := math.Sincos(seed * float64(i*(k+1)) / 50)
			m.Wave = append(m.Wave, complex(c, -s))
			m.WaveErr = append(m.WaveErr, 1e-10*float64(k+1))
			m.Evidence = append(m.Evidence, 1e-11*float64(i+k))
		}
		for i := range nv {
			m.Horizon = append(m.Horizon, complex(seed*float64(i), float64(k)))
			m.HorizonErr = append(m.HorizonErr, 1e-12)
		}
		if k == 1 {
			m.Evidence = nil
		}
		series.Modes = append(series.Modes, m)
	}
	return &result.Bundle{
		Series: series,
		Result: &result.Result{
			Schema:      result.Schema,
			Title:       "An invented orbit, a < b & c",
			Case:        map[string]any{"orbit": map[string]any{"kind": "circular", "radius": 10.0}},
			Conventions: map[string]string{"units": "G = c = M = 1", "strain": "r h_lm/mu"},
			Provenance:  result.Provenance{Version: "0.0.0", PeakMemoryBytes: 12345},
			Orbit:       &result.Orbit{Kind: "circular", Energy: 0.9561828874675149, AngMom: 3.7796447300922722},
			Modes: []result.Mode{
				{L: 2, M: 1, Parity: "odd", Measure: "rate", Counts: "both signs of m", Infinity: flux(1e-7), Horizon: flux(1e-12), Met: true},
				{L: 2, M: 2, Parity: "even", Measure: "rate", Counts: "both signs of m", Infinity: flux(5e-5), Strain: &result.Complex{Re: q(1), Im: q(-2)}},
			},
			Total:    &result.Total{Measure: "rate", Infinity: flux(5.01e-5), Horizon: flux(1e-12), Truncation: &result.Truncation{LMax: 2, Infinity: flux(1e-9)}},
			Rungs:    []result.Rung{{Points: 400, Dx: 0.1}},
			Accuracy: result.Accuracy{Asked: 1e-9, Floor: 1e-14, Met: true},
			Warnings: []string{"none worth the name"},
		},
	}
}

func all() Parts {
	return Parts{Waveform: true, Horizon: true, Flux: true, Report: []byte("<!doctype html><title>x</title>")}
}

// tree gives every path below dir with its content ("" for directories).
func tree(t testing.TB, dir string) map[string]string {
	t.Helper()
	out := map[string]string{}
	err := filepath.WalkDir(dir, func(path string, e fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		name, _ := filepath.Rel(dir, path)
		if e.IsDir() {
			out[name+"/"] = ""
			return nil
		}
		data, err := os.ReadFile(path)
		out[name] = string(data)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func mustWrite(t testing.TB, dir string, b *result.Bundle, caseYAML string) {
	t.Helper()
	if err := Write(dir, b, []byte(caseYAML), all(), false); err != nil {
		t.Fatal(err)
	}
}

func names(t testing.TB, dir string) []string {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	var out []string
	for _, e := range entries {
		out = append(out, e.Name())
	}
	return out
}

func TestRoundTrip(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "results", "deeper", "one")
	want := sample(1)
	mustWrite(t, dir, want, caseA)
	if got, want := names(t, dir), []string{"SHA256SUMS", "case.yaml", "flux.csv", "horizon.npz", "report.html", "result.json", "waveform.npz"}; !slices.Equal(got, want) {
		t.Errorf("files %v, want %v", got, want)
	}
	if got := names(t, filepath.Dir(dir)); !slices.Equal(got, []string{"one"}) {
		t.Errorf("beside the result: %v", got)
	}
	got, caseYAML, err := Read(dir)
	if err != nil {
		t.Fatal(err)
	}
	if string(caseYAML) != caseA {
		t.Errorf("case.yaml came back as %q", caseYAML)
	}
	if !reflect.DeepEqual(got.Result, want.Result) {
		t.Errorf("result came back as\n%+v\nwant\n%+v", got.Result, want.Result)
	}
	if !reflect.DeepEqual(got.Series, want.Series) {
		t.Error("series came back changed")
	}
	if err := Check(dir); err != nil {
		t.Error(err)
	}
}

// Numbers with unusual bits come back bit for bit.
func TestRoundTripBits(t *testing.T) {
	odd := []float64{math.Copysign(0, -1), math.NaN(), math.Inf(1), math.Inf(-1), 5e-324, math.MaxFloat64, 0.1}
	b := sample(1)
	b.Series = &result.Series{Prefix: "psi", U: odd, Modes: []result.ModeSeries{{L: 0, M: 0, WaveErr: odd}}}
	for i := range odd {
		b.Series.Modes[0].Wave = append(b.Series.Modes[0].Wave, complex(odd[i], odd[len(odd)-1-i]))
	}
	dir := filepath.Join(t.TempDir(), "r")
	mustWrite(t, dir, b, caseA)
	got, _, err := Read(dir)
	if err != nil {
		t.Fatal(err)
	}
	if got.Series.Prefix != "psi" || got.Series.V != nil || len(got.Series.Modes) != 1 {
		t.Fatalf("read %+v", got.Series)
	}
	m := got.Series.Modes[0]
	for i := range odd {
		for _, pair := range [][2]float64{{got.Series.U[i], odd[i]}, {m.WaveErr[i], odd[i]}, {real(m.Wave[i]), odd[i]}, {imag(m.Wave[i]), odd[len(odd)-1-i]}} {
			if math.Float64bits(pair[0]) != math.Float64bits(pair[1]) {
				t.Errorf("sample %d: %v came back as %v", i, pair[1], pair[0])
			}
		}
	}
}

func TestPartsDecideWhatIsWritten(t *testing.T) {
	base := []string{"SHA256SUMS", "case.yaml", "result.json"}
	for _, c := range []struct {
		name   string
		parts  Parts
		change func(*result.Bundle)
		more   []string
	}{
		{"nothing", Parts{}, nil, nil},
		{"waveform", Parts{Waveform: true}, nil, []string{"waveform.npz"}},
		{"horizon", Parts{Horizon: true}, nil, []string{"horizon.npz"}},
		{"flux", Parts{Flux: true}, nil, []string{"flux.csv"}},
		{"report", Parts{Report: []byte{}}, nil, []string{"report.html"}},
		{"no series", all(), func(b *result.Bundle) { b.Series = nil }, []string{"flux.csv", "report.html"}},
		{"no horizon", all(), func(b *result.Bundle) {
			b.Series.V = nil
			for i := range b.Series.Modes {
				b.Series.Modes[i].Horizon, b.Series.Modes[i].HorizonErr = nil, nil
			}
		}, []string{"flux.csv", "report.html", "waveform.npz"}},
		{"no flux", all(), func(b *result.Bundle) {
			b.Result.Total, b.Result.Modes = nil, nil
		}, []string{"horizon.npz", "report.html", "waveform.npz"}},
	} {
		b := sample(1)
		if c.change != nil {
			c.change(b)
		}
		dir := filepath.Join(t.TempDir(), "r")
		if err := Write(dir, b, []byte(caseA), c.parts, false); err != nil {
			t.Fatalf("%s: %v", c.name, err)
		}
		want := append(slices.Clone(base), c.more...)
		slices.Sort(want)
		if got := names(t, dir); !slices.Equal(got, want) {
			t.Errorf("%s: wrote %v, want %v", c.name, got, want)
		}
		got, _, err := Read(dir)
		if err != nil {
			t.Fatalf("%s: %v", c.name, err)
		}
		if npz := slices.ContainsFunc(want, func(s string) bool { return strings.HasSuffix(s, ".npz") }); npz != (got.Series != nil) {
			t.Errorf("%s: series read: %v", c.name, got.Series != nil)
		}
	}
}

// A mode without a wave is left out of waveform.npz and kept in horizon.npz.
func TestModesOfOneEndOnly(t *testing.T) {
	b := sample(1)
	b.Series.Modes[0].Wave, b.Series.Modes[0].WaveErr = nil, nil
	b.Series.Modes[2].Horizon, b.Series.Modes[2].HorizonErr = nil, nil
	dir := filepath.Join(t.TempDir(), "r")
	mustWrite(t, dir, b, caseA)
	got, _, err := Read(dir)
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range b.Series.Modes {
		i := slices.IndexFunc(got.Series.Modes, func(m result.ModeSeries) bool { return m.L == want.L && m.M == want.M })
		if i < 0 {
			t.Fatalf("mode (%d,%d) is lost", want.L, want.M)
		}
		if want.Wave == nil {
			want.Evidence = nil // goes with the wave
		}
		if !reflect.DeepEqual(got.Series.Modes[i], want) {
			t.Errorf("mode (%d,%d) came back changed", want.L, want.M)
		}
	}
}

func TestSameNumbersSameBytes(t *testing.T) {
	root := t.TempDir()
	a, b := filepath.Join(root, "a"), filepath.Join(root, "b")
	mustWrite(t, a, sample(1), caseA)
	mustWrite(t, b, sample(1), caseA)
	if !reflect.DeepEqual(tree(t, a), tree(t, b)) {
		t.Error("the same bundle gave different bytes")
	}
	mustWrite(t, b, sample(2), caseA)
	for name, content := range tree(t, a) {
		same := content == tree(t, b)[name]
		if fixed := name == "./" || name == "case.yaml" || name == "report.html"; same != fixed {
			t.Errorf("%s after other numbers: same bytes: %v", name, same)
		}
	}
}

func TestReplacing(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "r")
	mustWrite(t, dir, sample(1), caseA)
	first := tree(t, dir)

	// Another case is refused, and untouched.
	err := Write(dir, sample(2), []byte(caseB), all(), false)
	var exists *Exists
	if !errors.As(err, &exists) || !strings.Contains(err.Error(), "--force") || !strings.Contains(err.Error(), "--out") {
		t.Fatalf("another case: %v", err)
	}
	if err := Ready(dir, []byte(caseB), false); !errors.As(err, &exists) {
		t.Errorf("Ready: %v", err)
	}
	if !reflect.DeepEqual(tree(t, dir), first) {
		t.Error("a refused write changed the directory")
	}

	// The same case replaces; files that are no longer kept go.
	if err := Ready(dir, []byte(caseA), false); err != nil {
		t.Error(err)
	}
	if err := Write(dir, sample(3), []byte(caseA), Parts{Flux: true}, false); err != nil {
		t.Fatal(err)
	}
	if got := names(t, dir); !slices.Equal(got, []string{"SHA256SUMS", "case.yaml", "flux.csv", "result.json"}) {
		t.Errorf("after replacing: %v", got)
	}

	// Force replaces another case.
	if err := Write(dir, sample(2), []byte(caseB), all(), true); err != nil {
		t.Fatal(err)
	}
	if _, caseYAML, err := Read(dir); err != nil || string(caseYAML) != caseB {
		t.Errorf("after force: %q, %v", caseYAML, err)
	}
	if got := names(t, filepath.Dir(dir)); !slices.Equal(got, []string{"r"}) {
		t.Errorf("left beside the result: %v", got)
	}
}

func TestForeignFilesAreNeverDeleted(t *testing.T) {
	for _, name := range []string{"notes.txt", ".git", "waveform.npz.bak"} {
		for _, force := range []bool{false, true} {
			dir := t.TempDir()
			path := filepath.Join(dir, name)
			if err := os.WriteFile(path, []byte("mine"), 0o600); err != nil {
				t.Fatal(err)
			}
			err := Write(dir, sample(1), []byte(caseA), all(), force)
			var exists *Exists
			if !errors.As(err, &exists) || !slices.Equal(exists.Foreign, []string{name}) || !strings.Contains(err.Error(), name) || !strings.Contains(err.Error(), "--out") {
				t.Errorf("%s, force %v: %v", name, force, err)
			}
			if got := names(t, dir); !slices.Equal(got, []string{name}) {
				t.Errorf("%s, force %v: directory now holds %v", name, force, got)
			}
		}
	}
	path := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(path, []byte("mine"), 0o600); err != nil {
		t.Fatal(err)
	}
	err := Write(path, sample(1), []byte(caseA), all(), true)
	var exists *Exists
	if !errors.As(err, &exists) || !exists.NotDir {
		t.Errorf("a file in the way: %v", err)
	}
}

func TestAcceptableStates(t *testing.T) {
	for name, lay := range map[string]func(dir string) error{
		"absent": func(dir string) error { return nil },
		"empty":  func(dir string) error { return os.Mkdir(dir, 0o777) },
		"interrupted run": func(dir string) error {
			return NewKeeper(dir, []byte(caseB)).Save("block", []byte("data"))
		},
		"interrupted run over a result of the case": func(dir string) error {
			return errors.Join(Write(dir, sample(2), []byte(caseA), all(), false), NewKeeper(dir, []byte(caseA)).Save("block", []byte("data")))
		},
		"result with a comparison": func(dir string) error {
			return errors.Join(Write(dir, sample(2), []byte(caseA), all(), false), Add(dir, map[string][]byte{"comparison.json": []byte("{}"), "comparison.html": []byte("page"), "comparison.csv": []byte("u\n")}))
		},
	} {
		dir := filepath.Join(t.TempDir(), "r")
		if err := lay(dir); err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		if err := Ready(dir, []byte(caseA), false); err != nil {
			t.Errorf("%s: Ready: %v", name, err)
		}
		if err := Write(dir, sample(1), []byte(caseA), all(), false); err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if got := len(names(t, dir)); got != 7 {
			t.Errorf("%s: %d files: %v", name, got, names(t, dir))
		}
		if got := names(t, filepath.Dir(dir)); !slices.Equal(got, []string{"r"}) {
			t.Errorf("%s: left beside the result: %v", name, got)
		}
	}
	// A torn result (no case.yaml) is nobody's: refused, replaced with force.
	dir := filepath.Join(t.TempDir(), "r")
	mustWrite(t, dir, sample(1), caseA)
	if err := os.Remove(filepath.Join(dir, "case.yaml")); err != nil {
		t.Fatal(err)
	}
	var exists *Exists
	if err := Write(dir, sample(1), []byte(caseA), all(), false); !errors.As(err, &exists) {
		t.Errorf("torn result: %v", err)
	}
	if err := Write(dir, sample(1), []byte(caseA), all(), true); err != nil {
		t.Error(err)
	}
}

// A link to a result directory stays a link; what it points to is replaced.
func TestLinkedDirectory(t *testing.T) {
	root := t.TempDir()
	dir, link := filepath.Join(root, "far", "r"), filepath.Join(root, "link")
	mustWrite(t, dir, sample(1), caseA)
	if err := os.Symlink(dir, link); err != nil {
		t.Fatal(err)
	}
	mustWrite(t, link, sample(2), caseA)
	if info, err := os.Lstat(link); err != nil || info.Mode()&fs.ModeSymlink == 0 {
		t.Errorf("the link became %v, %v", info, err)
	}
	got, _, err := Read(dir)
	if err != nil || got.Series.JunkUntil != 123.25*2 {
		t.Errorf("behind the link: %v", err)
	}
}

func TestJSONHasNoNaN(t *testing.T) {
	for path, spoil := range map[string]func(r *result.Result){
		"modes[1].infinity.energy.error": func(r *result.Result) { r.Modes[1].Infinity.Energy.Error = math.NaN() },
		"modes[1].strain.im.value":       func(r *result.Result) { r.Modes[1].Strain.Im.Value = math.Inf(-1) },
		"modes[0].budget.round-off": func(r *result.Result) {
			r.Modes[0].Budget = map[string]float64{"round-off": math.Inf(1), "transient": 0}
		},
		"total.truncation.infinity.energy.value": func(r *result.Result) { r.Total.Truncation.Infinity.Energy.Value = math.NaN() },
		"orbit.numbers.omega_phi":                func(r *result.Result) { r.Orbit.Numbers = map[string]float64{"omega_phi": math.NaN()} },
		"case.list[1]":                           func(r *result.Result) { r.Case = map[string]any{"list": []any{1, math.NaN()}} },
		"rungs[0].dt":                            func(r *result.Result) { r.Rungs[0].Dt = math.NaN() },
		"accuracy.worst.relative":                func(r *result.Result) { r.Accuracy.Worst.Relative = math.Inf(1) },
		"total.infinity.angular_momentum.error":  func(r *result.Result) { r.Total.Infinity.AngularMomentum.Error = math.Inf(1) },
		"ringing[0].re.value":                    func(r *result.Result) { r.Ringing = []result.Ringing{{Re: result.Q{Value: math.NaN()}}} },
		"modes[0].peak.at_light_ring.phase.value": func(r *result.Result) {
			r.Modes[0].Peak = &result.Peak{AtLightRing: map[string]result.Q{"phase": {Value: math.NaN()}}}
		},
	} {
		b := sample(1)
		spoil(b.Result)
		root := t.TempDir()
		err := Write(filepath.Join(root, "r"), b, []byte(caseA), all(), false)
		var invalid *Invalid
		if !errors.As(err, &invalid) || invalid.Path != path || invalid.File != "result.json" || !strings.Contains(err.Error(), path) {
			t.Errorf("%s: %v", path, err)
		}
		if got := names(t, root); got != nil {
			t.Errorf("%s: wrote %v", path, got)
		}
	}
	// An infall from infinity is a legal case.
	b := sample(1)
	b.Result.Case = map[string]any{"orbit": map[string]any{"from": math.Inf(1), "steps": []any{math.Inf(-1), 1.5}}}
	dir := filepath.Join(t.TempDir(), "r")
	mustWrite(t, dir, b, caseA)
	got, _, err := Read(dir)
	if err != nil {
		t.Fatal(err)
	}
	if want := map[string]any{"orbit": map[string]any{"from": ".inf", "steps": []any{"-.inf", 1.5}}}; !reflect.DeepEqual(got.Result.Case, want) {
		t.Errorf("case came back as %v", got.Result.Case)
	}
	if x := b.Result.Case.(map[string]any)["orbit"].(map[string]any)["from"]; x != math.Inf(1) {
		t.Errorf("Write changed the case to %v", x)
	}
}

// Lists and tables that a script iterates over are never null.
func TestJSONHasNoNull(t *testing.T) {
	b := sample(1)
	b.Result.Schema, b.Result.Conventions, b.Result.Rungs, b.Result.Warnings = "", nil, nil, nil
	dir := filepath.Join(t.TempDir(), "r")
	mustWrite(t, dir, b, caseA)
	data, err := os.ReadFile(filepath.Join(dir, "result.json"))
	if err != nil {
		t.Fatal(err)
	}
	var raw map[string]any
	if err := json.Unmarshal(data, &raw); err != nil {
		t.Fatal(err)
	}
	want := map[string]any{"schema": "nullmark.result/1", "conventions": map[string]any{}, "rungs": []any{}, "warnings": []any{}}
	for k, v := range want {
		if !reflect.DeepEqual(raw[k], v) {
			t.Errorf("%s is %v, want %v", k, raw[k], v)
		}
	}
	if bytes.Contains(data, []byte("null,")) || bytes.Contains(data, []byte(`\u003c`)) || data[len(data)-1] != '\n' {
		t.Errorf("result.json:\n%s", data)
	}
}

func TestInconsistentBundles(t *testing.T) {
	for name, spoil := range map[string]func(s *result.Series){
		"h_2_1":    func(s *result.Series) { s.Modes[0].Wave = s.Modes[0].Wave[1:] },
		"err_2_2":  func(s *result.Series) { s.Modes[1].WaveErr = nil },
		"psi_3_-1": func(s *result.Series) { s.Modes[2].Horizon = s.Modes[2].Horizon[2:] },
		"err_3_-1": func(s *result.Series) { s.Modes[2].HorizonErr = nil },
		"phi_p":    func(s *result.Series) { s.Phi = append(s.Phi, 1) },
		"h_2_2":    func(s *result.Series) { s.Modes[3].L, s.Modes[3].M = 2, 2 },
	} {
		b := sample(1)
		spoil(b.Series)
		root := t.TempDir()
		err := Write(filepath.Join(root, "r"), b, []byte(caseA), all(), false)
		var invalid *Invalid
		if !errors.As(err, &invalid) || invalid.Path != name {
			t.Errorf("%s: %v", name, err)
		}
		if got := names(t, root); got != nil {
			t.Errorf("%s: wrote %v", name, got)
		}
	}
}

func TestAdd(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "r")
	mustWrite(t, dir, sample(1), caseA)
	before := tree(t, dir)
	if err := Add(dir, map[string][]byte{"report.html": []byte("again"), "comparison.json": []byte("{}")}); err != nil {
		t.Fatal(err)
	}
	after := tree(t, dir)
	if after["report.html"] != "again" || after["comparison.json"] != "{}" || len(after) != len(before)+1 {
		t.Errorf("after adding: %d files", len(after))
	}
	for _, name := range []string{"case.yaml", "result.json", "waveform.npz", "horizon.npz", "flux.csv"} {
		if after[name] != before[name] {
			t.Errorf("%s changed", name)
		}
	}
	if !strings.Contains(after["SHA256SUMS"], "  comparison.json\n") {
		t.Errorf("sums:\n%s", after["SHA256SUMS"])
	}
	if err := Check(dir); err != nil {
		t.Error(err)
	}
	var not *NotResult
	if err := Add(t.TempDir(), map[string][]byte{"report.html": nil}); !errors.As(err, &not) {
		t.Errorf("adding to no result: %v", err)
	}
	for _, name := range []string{"result.json", "../x", ".x", "", "SHA256SUMS"} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("adding %q did not panic", name)
				}
			}()
			Add(dir, map[string][]byte{name: nil})
		}()
	}
}

func TestErrorsUnwrap(t *testing.T) {
	err := error(&FileSystem{Doing: "write waveform.npz of", Path: "results/x", Err: &fs.PathError{Op: "write", Path: "results/.x.writing-1/new/waveform.npz", Err: syscall.ENOSPC}})
	if !errors.Is(err, syscall.ENOSPC) {
		t.Error("the cause is hidden")
	}
	if got, want := err.Error(), "cannot write waveform.npz of results/x: no space left on device"; got != want {
		t.Errorf("%q, want %q", got, want)
	}
}
