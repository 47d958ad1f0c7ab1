package app

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"runtime/debug"
	"slices"
	"strings"
	"syscall"
	"testing"
	"time"

	"nullmark/cmd/internal/verify"
	"nullmark/cmd/internal/wire"
	"nullmark/configs"
	"nullmark/equations/evolve"
	"nullmark/extract/result"
	"nullmark/extract/store"
)

const circularCase = `title: Invented case for the tests
waves:
  l_max: 3
orbit:
  kind: circular
  radius: 10
accuracy:
  relative: 1.0e-6
`

// bundleOf is a small finished run with invented numbers.
func bundleOf(kase *configs.Case, met bool) *result.Bundle {
	q := result.Q{Value: 1e-4, Error: 1e-11}
	flux := result.Flux{Energy: q, AngularMomentum: q}
	mode := result.Mode{L: 2, M: 2, Parity: "even", Measure: "rate", Counts: "both signs of m",
		Infinity: &flux, Horizon: &flux, Strain: &result.Complex{Re: q, Im: q}, Met: met}
	asked := 1e-6
	if kase != nil {
		asked = kase.Accuracy.Relative
	}
	return &result.Bundle{
		Result: &result.Result{Schema: result.Schema, Title: "Invented case for the tests",
			Conventions: map[string]string{"units": "G = c = M = 1"},
			Orbit:       &result.Orbit{Kind: "circular", Energy: 0.96, AngMom: 3.78, Numbers: map[string]float64{"radius": 10}},
			Modes:       []result.Mode{mode}, Total: &result.Total{Measure: "rate", Infinity: &flux, Horizon: &flux},
			Rungs:    []result.Rung{{Modes: "all", Points: 200, Dx: 0.3, Dt: 0.2, Kernel: 0.5, Moments: 8, Order: 12, Until: 400}},
			Accuracy: result.Accuracy{Asked: asked, Met: met, Worst: result.Worst{L: 2, M: 2, What: "energy at the horizon", Relative: 1e-7}},
		},
		Series: &result.Series{Prefix: "h", HorizonPrefix: "psi", U: []float64{0, 1, 2}, V: []float64{0, 1, 2},
			T: []float64{0, 1}, R: []float64{10, 10}, Phi: []float64{0, 0.1},
			Modes: []result.ModeSeries{{L: 2, M: 2, Wave: []complex128{1, 1i, -1}, WaveErr: []float64{1e-9, 1e-9, 1e-9},
				Horizon: []complex128{1, 1i, -1}, HorizonErr: []float64{1e-9, 1e-9, 1e-9}}}},
	}
}

// fake is an engine whose evolution is run, where that is not nil.
func fake(run func(context.Context, *configs.Case, wire.Options) (*result.Bundle, error)) Engine {
	if run == nil {
		run = func(_ context.Context, kase *configs.Case, _ wire.Options) (*result.Bundle, error) {
			return bundleOf(kase, true), nil
		}
	}
	return Engine{
		Checks: func() []func(*configs.Case) []configs.Problem {
			return []func(*configs.Case) []configs.Problem{func(k *configs.Case) []configs.Problem {
				if k.Orbit != nil && k.Orbit.Radius == 2.5 {
					return []configs.Problem{{Key: "orbit.radius", Value: 2.5, Want: "above 3"}}
				}
				return nil
			}}
		},
		Warnings: func(k *configs.Case) []string {
			if k.Orbit.Radius < 6 {
				return []string{"the orbit is unstable"}
			}
			return nil
		},
		Plan: func(*configs.Case) (*wire.Plan, error) {
			return &wire.Plan{Orbit: &result.Orbit{Kind: "circular", Energy: 0.96, AngMom: 3.78, Numbers: map[string]float64{"omega_phi": 0.0316}},
				Modes:       []wire.PlannedMode{{L: 2, M: 2, Points: 216, Dx: 0.4, Dt: 0.25, Kernel: 0.64, Until: 900}},
				Rungs:       []result.Rung{{Modes: "l = 2, 3", Points: 216, Dx: 0.4, Dt: 0.25, Kernel: 0.64, Moments: 12, Order: 12, Until: 900, CoreSeconds: 3}},
				CoreSeconds: 12, MemoryBytes: 41e6, Warnings: []string{"a warning of the plan"}}, nil
		},
		Run: run,
	}
}

// outcome is what a command line has led to.
type outcome struct {
	code           int
	stdout, stderr string
}

// try runs a command line in a directory of its own that holds case.yaml.
func try(t *testing.T, e Engine, args ...string) outcome {
	t.Helper()
	var stdout, stderr bytes.Buffer
	code := Run(context.Background(), e, args, &stdout, &stderr)
	got := outcome{code, stdout.String(), stderr.String()}
	for line := range strings.Lines(got.stderr) {
		if !strings.HasPrefix(line, "nullmark: ") && code != ExitDone && !strings.Contains(got.stderr, "Usage:") {
			t.Errorf("%q: a line on stderr without the program's name: %q", args, line)
		}
	}
	if strings.Contains(got.stdout+got.stderr, "\x1b") {
		t.Errorf("%q: an escape code where there is no terminal", args)
	}
	return got
}

// room makes a directory with case.yaml the working directory.
func room(t *testing.T) {
	t.Helper()
	t.Chdir(t.TempDir())
	for _, v := range os.Environ() {
		if name, _, _ := strings.Cut(v, "="); strings.HasPrefix(name, "NULLMARK_") {
			t.Setenv(name, "") // restores it afterwards
			os.Unsetenv(name)
		}
	}
	put(t, "case.yaml", circularCase)
}

func put(t *testing.T, path, text string) {
	t.Helper()
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

func names(t *testing.T, dir string) []string {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	var all []string
	for _, e := range entries {
		all = append(all, e.Name())
	}
	return all
}

func TestUsage(t *testing.T) {
	mustNotRun := fake(func(context.Context, *configs.Case, wire.Options) (*result.Bundle, error) {
		return nil, errors.New("the engine was started")
	})
	for _, c := range []struct {
		args []string
		code int
		want string // on stderr, or on stdout when the code is 0
	}{
		{nil, ExitUsage, "name a command: compare, plan, report, run, verify"},
		{[]string{"--version"}, ExitDone, "nullmark "},
		{[]string{"--help"}, ExitDone, "Exit codes"},
		{[]string{"rnu", "case.yaml"}, ExitUsage, `there is no command "rnu" (did you mean run? There are compare, plan, report, run, verify)`},
		{[]string{"simulate"}, ExitUsage, `there is no command "simulate" (there are compare, plan,`},
		{[]string{"compare", "x"}, ExitUsage, "x is not a usable result directory"},
		{[]string{"compare", "x", "--model", "m.yaml", "--with", "y"}, ExitUsage, "--model and --with are both given"},
		{[]string{"compare"}, ExitUsage, "compare wants one result directory, not 0"},
		{[]string{"run"}, ExitUsage, "run wants one case file, not 0: nullmark run CASE.yaml"},
		{[]string{"run", "a.yaml", "b.yaml"}, ExitUsage, "run wants one case file, not 2"},
		{[]string{"run", "--fast", "case.yaml"}, ExitUsage, "nullmark run has no flag --fast (nullmark run --help lists the flags)"},
		{[]string{"run", "-x", "case.yaml"}, ExitUsage, "nullmark run has no flag -x"},
		{[]string{"run", "case.yaml", "--out"}, ExitUsage, "--out wants a value"},
		{[]string{"run", "--workers", "two", "case.yaml"}, ExitUsage, `--workers is "two", but must be a whole number`},
		{[]string{"run", "--workers", "0", "case.yaml"}, ExitUsage, "--workers is 0, but must be 1 or more"},
		{[]string{"run", "--quiet=perhaps", "case.yaml"}, ExitUsage, `--quiet is "perhaps", but must be true or false`},
		{[]string{"run", "nowhere.yaml"}, ExitUsage, "nowhere.yaml"},
		{[]string{"run", "."}, ExitUsage, "nullmark: .: "},
		{[]string{"run", "--set", "orbit.radius=ten", "case.yaml"}, ExitUsage, "orbit.radius"},
		{[]string{"run", "--set", "orbit.radius=2.5", "case.yaml"}, ExitUsage, "must be above 3"},
		{[]string{"plan", "--set", "orbit.radus=7", "case.yaml"}, ExitUsage, "orbit.radus"},
		{[]string{"report", "nowhere"}, ExitUsage, "nowhere"},
		{[]string{"report", "."}, ExitUsage, "nullmark: "},
		{[]string{"verify", "all"}, ExitUsage, `verify wants no argument, not "all"`},
	} {
		t.Run(strings.Join(c.args, " "), func(t *testing.T) {
			room(t)
			got := try(t, mustNotRun, c.args...)
			text := got.stderr
			if c.code == ExitDone {
				text = got.stdout
			}
			if got.code != c.code || !strings.Contains(text, c.want) {
				t.Errorf("exit %d, stdout %q, stderr %q; want exit %d and %q", got.code, got.stdout, got.stderr, c.code, c.want)
			}
			if c.code != ExitDone && got.stdout != "" {
				t.Errorf("an error leaves %q on stdout", got.stdout)
			}
			if len(c.args) > 0 && c.code != ExitDone && strings.Count(got.stderr, "\n") != 1 {
				t.Errorf("not one sentence: %q", got.stderr)
			}
			if left := names(t, "."); !slices.Equal(left, []string{"case.yaml"}) {
				t.Errorf("wrong input has written %q", left)
			}
		})
	}
}

func TestEveryFaultIsTold(t *testing.T) {
	room(t)
	put(t, "case.yaml", "orbit: {kind: circular, radius: ten}\naccuracy: {relative: -1}\nwaves: {l_max: 8.5}\n")
	got := try(t, fake(nil), "run", "case.yaml")
	if got.code != ExitUsage || strings.Count(got.stderr, "nullmark: case.yaml:") != 3 {
		t.Errorf("exit %d, stderr:\n%s", got.code, got.stderr)
	}
}

func TestRunStoresAndShows(t *testing.T) {
	room(t)
	got := try(t, fake(nil), "run", "case.yaml")
	if got.code != ExitDone {
		t.Fatalf("exit %d: %s", got.code, got.stderr)
	}
	want := []string{"SHA256SUMS", "case.yaml", "flux.csv", "horizon.npz", "report.html", "result.json", "waveform.npz"}
	dir := filepath.Join("results", "case")
	if left := names(t, dir); !slices.Equal(left, want) {
		t.Errorf("the directory holds %q, want %q", left, want)
	}
	if left := names(t, "results"); !slices.Equal(left, []string{"case"}) {
		t.Errorf("beside the directory lies %q", left)
	}
	if err := store.Check(dir); err != nil {
		t.Error(err)
	}
	for _, part := range append(want, dir) {
		if !strings.Contains(got.stdout, part) {
			t.Errorf("stdout does not name %s:\n%s", part, got.stdout)
		}
	}
	if got.stderr != "" {
		t.Errorf("stderr after a short run: %q", got.stderr)
	}

	// The stored case is accepted as input and names the same directory.
	again := try(t, fake(nil), "run", "--out", dir, filepath.Join(dir, "case.yaml"))
	if again.code != ExitDone {
		t.Errorf("the stored case: exit %d: %s", again.code, again.stderr)
	}

	// Parts that are not to be kept are not there.
	got = try(t, fake(nil), "run", "--out", "few", "--set", "output.keep=[flux]", "case.yaml")
	if left := names(t, "few"); got.code != ExitDone || !slices.Equal(left, []string{"SHA256SUMS", "case.yaml", "flux.csv", "result.json"}) {
		t.Errorf("exit %d, kept %q: %s", got.code, left, got.stderr)
	}
}

func TestJSONIsTheStoredResult(t *testing.T) {
	room(t)
	got := try(t, fake(nil), "run", "--json", "--quiet", "case.yaml")
	stored, err := os.ReadFile("results/case/result.json")
	if err != nil {
		t.Fatal(err)
	}
	if got.code != ExitDone || got.stdout != string(stored) || !json.Valid(stored) {
		t.Errorf("exit %d, stdout %q", got.code, got.stdout)
	}
}

func TestNotMetIsKeptAndExits1(t *testing.T) {
	room(t)
	got := try(t, fake(func(_ context.Context, k *configs.Case, _ wire.Options) (*result.Bundle, error) {
		return bundleOf(k, false), nil
	}), "run", "case.yaml")
	if got.code != ExitNotMet || !strings.Contains(got.stdout, "NOT met") {
		t.Errorf("exit %d, stdout:\n%s", got.code, got.stdout)
	}
	if err := store.Check("results/case"); err != nil {
		t.Error(err)
	}
}

func TestSettingsReachTheEngine(t *testing.T) {
	room(t)
	t.Setenv("NULLMARK_ORBIT_RADIUS", "8")
	t.Setenv("NULLMARK_WAVES_L_MAX", "5")
	var seen *configs.Case
	var workers int
	e := fake(func(_ context.Context, k *configs.Case, o wire.Options) (*result.Bundle, error) {
		seen, workers = k, o.Workers
		return bundleOf(k, true), nil
	})
	got := try(t, e, "run", "--workers", "3", "--set", "orbit.radius=5", "--set", "title=a, b", "case.yaml")
	if got.code != ExitDone {
		t.Fatalf("exit %d: %s", got.code, got.stderr)
	}
	if seen.Orbit.Radius != 5 || seen.Waves.LMax != 5 || seen.Title != "a, b" || workers != 3 {
		t.Errorf("radius %v, l_max %v, title %q, workers %v", seen.Orbit.Radius, seen.Waves.LMax, seen.Title, workers)
	}
	if !strings.Contains(got.stderr, "nullmark: warning: the orbit is unstable") {
		t.Errorf("no warning on stderr: %q", got.stderr)
	}
	if got := try(t, e, "run", "--quiet", "--set", "orbit.radius=5", "--out", "quiet", "case.yaml"); got.stderr != "" {
		t.Errorf("--quiet, and yet %q", got.stderr)
	}
}

func TestNumericalFailure(t *testing.T) {
	room(t)
	got := try(t, fake(func(context.Context, *configs.Case, wire.Options) (*result.Bundle, error) {
		return nil, fmt.Errorf("mode (3,1): %w", &evolve.Failure{Step: 412, Time: 103.5, Place: "rho = -3", Mode: "(3,1)"})
	}), "run", "case.yaml")
	if got.code != ExitNumerical {
		t.Errorf("exit %d", got.code)
	}
	for _, part := range []string{"412", "103.5", "rho = -3", "(3,1)"} {
		if !strings.Contains(got.stderr, part) {
			t.Errorf("the message lacks %q: %q", part, got.stderr)
		}
	}
	if left := names(t, "."); !slices.Equal(left, []string{"case.yaml"}) {
		t.Errorf("a failed run leaves %q", left)
	}
}

func TestPlacesThatCannotBeWritten(t *testing.T) {
	room(t)
	mustNotRun := fake(func(context.Context, *configs.Case, wire.Options) (*result.Bundle, error) {
		t.Error("the engine was started")
		return nil, errors.New("started")
	})
	put(t, "file", "")
	for _, out := range []string{"file/below", "/proc/nullmark", "/dev/null/results"} {
		got := try(t, mustNotRun, "run", "--out", out, "case.yaml")
		if got.code != ExitFiles || !strings.Contains(got.stderr, out) || strings.Count(got.stderr, "\n") != 1 {
			t.Errorf("--out %s: exit %d, stderr %q", out, got.code, got.stderr)
		}
	}

	// Another case's result and a directory with something else are refused.
	if got := try(t, fake(nil), "run", "--out", "taken", "case.yaml"); got.code != ExitDone {
		t.Fatal(got.stderr)
	}
	before, _ := os.ReadFile("taken/SHA256SUMS")
	got := try(t, mustNotRun, "run", "--out", "taken", "--set", "orbit.radius=12", "case.yaml")
	if got.code != ExitUsage || !strings.Contains(got.stderr, "--force") || strings.Count(got.stderr, "\n") != 1 {
		t.Errorf("another case's result: exit %d, stderr %q", got.code, got.stderr)
	}
	if after, _ := os.ReadFile("taken/SHA256SUMS"); !bytes.Equal(before, after) {
		t.Error("a refused run has changed the earlier result")
	}
	if got := try(t, fake(nil), "run", "--out", "taken", "--set", "orbit.radius=12", "--force", "case.yaml"); got.code != ExitDone {
		t.Errorf("--force: exit %d: %s", got.code, got.stderr)
	}
	if got := try(t, mustNotRun, "run", "--out", ".", "--force", "case.yaml"); got.code != ExitUsage {
		t.Errorf("a directory with other files: exit %d: %s", got.code, got.stderr)
	}
}

func TestInterruptedAndResumed(t *testing.T) {
	room(t)
	engine := func(signalled bool, loaded *[]string) Engine {
		return fake(func(ctx context.Context, k *configs.Case, o wire.Options) (*result.Bundle, error) {
			for _, key := range []string{"l2m1 rung 0", "l2m2/rung 0"} {
				if data, ok := o.Keep.Load(key); ok {
					*loaded = append(*loaded, string(data))
					continue
				}
				if err := o.Keep.Save(key, []byte("part "+key)); err != nil {
					t.Error(err)
				}
				if signalled {
					if err := syscall.Kill(os.Getpid(), syscall.SIGINT); err != nil {
						t.Error(err)
					}
					select {
					case <-ctx.Done():
						return nil, fmt.Errorf("mode (2,1): %w", ctx.Err())
					case <-time.After(10 * time.Second):
						t.Error("the signal has not ended the context")
					}
				}
			}
			return bundleOf(k, true), nil
		})
	}
	var loaded []string
	got := try(t, engine(true, &loaded), "run", "case.yaml")
	if got.code != ExitInterrupted || got.stderr != "nullmark: interrupted; finished parts are kept: run again with --resume\n" || got.stdout != "" {
		t.Errorf("exit %d, stdout %q, stderr %q", got.code, got.stdout, got.stderr)
	}
	if _, err := store.NewKeeper("results/case", nil).Load("x"); err {
		t.Error("a part of another case was found")
	}
	if _, _, err := store.Read("results/case"); err == nil {
		t.Error("an interrupted run left something that reads as a result")
	}

	// Another case does not take the parts over.
	loaded = nil
	if got := try(t, engine(false, &loaded), "run", "--resume", "--set", "orbit.radius=11", "--out", "other", "case.yaml"); got.code != ExitDone || len(loaded) > 0 {
		t.Errorf("another case: exit %d, took over %q", got.code, loaded)
	}
	// The same case does, and cleans up.
	got = try(t, engine(false, &loaded), "run", "--resume", "case.yaml")
	if got.code != ExitDone || !slices.Equal(loaded, []string{"part l2m1 rung 0"}) {
		t.Errorf("--resume: exit %d, took over %q: %s", got.code, loaded, got.stderr)
	}
	for _, n := range names(t, "results/case") {
		if strings.HasPrefix(n, ".") {
			t.Errorf("%s is left in the result", n)
		}
	}

	// Without --resume a run starts afresh.
	loaded = nil
	if got := try(t, engine(true, &loaded), "run", "--out", "fresh", "case.yaml"); got.code != ExitInterrupted {
		t.Fatal(got)
	}
	if got := try(t, engine(false, &loaded), "run", "--out", "fresh", "case.yaml"); got.code != ExitDone || len(loaded) > 0 {
		t.Errorf("no --resume: exit %d, took over %q", got.code, loaded)
	}

	// Before the first part there is nothing to resume from.
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	var stdout, stderr bytes.Buffer
	code := Run(ctx, fake(func(ctx context.Context, _ *configs.Case, _ wire.Options) (*result.Bundle, error) {
		return nil, ctx.Err()
	}), []string{"run", "--out", "none", "case.yaml"}, &stdout, &stderr)
	if code != ExitInterrupted || !strings.Contains(stderr.String(), "nothing is kept") {
		t.Errorf("exit %d, stderr %q", code, stderr.String())
	}
}

func TestReportIsRenderedAgain(t *testing.T) {
	room(t)
	if got := try(t, fake(nil), "run", "case.yaml"); got.code != ExitDone {
		t.Fatal(got.stderr)
	}
	dir := "results/case"
	page, err := os.ReadFile(filepath.Join(dir, "report.html"))
	if err != nil {
		t.Fatal(err)
	}
	put(t, filepath.Join(dir, "report.html"), "spoilt")
	got := try(t, fake(nil), "report", dir)
	if got.code != ExitDone || !strings.Contains(got.stdout, "report.html") {
		t.Errorf("exit %d, stdout %q, stderr %q", got.code, got.stdout, got.stderr)
	}
	again, err := os.ReadFile(filepath.Join(dir, "report.html"))
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(page, again) {
		t.Errorf("the page from the stored data differs from the run's (%d and %d bytes)", len(again), len(page))
	}
	if err := store.Check(dir); err != nil {
		t.Error(err)
	}
}

func TestPlanShowsAndEvolvesNothing(t *testing.T) {
	room(t)
	e := fake(func(context.Context, *configs.Case, wire.Options) (*result.Bundle, error) {
		t.Error("the engine was started")
		return nil, errors.New("started")
	})
	got := try(t, e, "plan", "--workers", "4", "--set", "orbit.radius=5", "case.yaml")
	for _, part := range []string{"radius: 5", "omega_phi", "0.0316", "216", "12 s of one core, about 3.0 s on 4", "41 MB",
		"a warning of the plan", "the orbit is unstable"} {
		if !strings.Contains(got.stdout, part) {
			t.Errorf("the plan lacks %q:\n%s", part, got.stdout)
		}
	}
	if got.code != ExitDone || !slices.Equal(names(t, "."), []string{"case.yaml"}) {
		t.Errorf("exit %d, left %q", got.code, names(t, "."))
	}
	got = try(t, e, "plan", "--json", "case.yaml")
	var doc planJSON
	if err := json.Unmarshal([]byte(got.stdout), &doc); err != nil {
		t.Fatal(err)
	}
	if doc.Schema != planSchema || doc.CoreSeconds != 12 || len(doc.Modes) != 1 || doc.Modes[0].Points != 216 || !strings.Contains(doc.Case, "radius: 10") {
		t.Errorf("%+v", doc)
	}
}

func TestVerifyExits1WhenOneValueIsChanged(t *testing.T) {
	room(t)
	check := verify.Check{Group: "equation", Name: "(2,2) energy", Source: verify.Source{Short: "invented", Full: "invented for this test"},
		Published: 1e-4, Cases: []verify.Case{{Shipped: "circular.yaml", Changes: []string{"orbit.radius=7"}}}, Ours: func(r []*result.Result) (result.Q, error) {
			return r[0].Find(2, 2).Infinity.Energy, nil
		}}
	do := func(args ...string) outcome {
		var stdout, stderr bytes.Buffer
		c := &command{engine: fake(nil), stdout: &stdout, stderr: &stderr, checks: []verify.Check{check}}
		return outcome{c.execute(context.Background(), args), stdout.String(), stderr.String()}
	}
	if got := do("verify"); got.code != ExitDone || !strings.Contains(got.stdout, "invented for this test") {
		t.Errorf("exit %d: %s%s", got.code, got.stdout, got.stderr)
	}
	check.Published *= 1 + 1e-6 // ten of our bars
	if got := do("verify"); got.code != ExitNotMet || !strings.Contains(got.stdout, "FAIL") || got.stderr != "" {
		t.Errorf("a changed value: exit %d: %s%s", got.code, got.stdout, got.stderr)
	}
	page := filepath.Join(t.TempDir(), "verify.html")
	if got := do("verify", "--page", page); got.code != ExitNotMet {
		t.Errorf("exit %d with a page: %s", got.code, got.stderr)
	}
	if text, err := os.ReadFile(page); err != nil || !strings.Contains(string(text), "invented for this test") || !strings.Contains(string(text), "1 of 1 checks FAILED") {
		t.Errorf("%v: page\n%s", err, text)
	}
	if got := do("verify", "--page", filepath.Join(page, "below", "x.html")); got.code != ExitFiles || got.stdout != "" {
		t.Errorf("a page into nowhere: exit %d: %s", got.code, got.stderr)
	}
	got := do("verify", "--json")
	var o verify.Outcome
	if err := json.Unmarshal([]byte(got.stdout), &o); err != nil || got.code != ExitNotMet || o.Passed || len(o.Checks) != 1 {
		t.Errorf("exit %d, %v, %+v", got.code, err, o)
	}
}

// TestVerifysCasesAreGoodInput reads every case that the built-in checks need.
func TestVerifysCasesAreGoodInput(t *testing.T) {
	c := &command{engine: fake(nil)}
	for _, check := range verify.Checks() {
		for _, v := range check.Cases {
			if _, err := c.shipped(v.Shipped, v.Changes); err != nil {
				t.Errorf("%s, %s: %v", check.Group, check.Name, err)
			}
		}
	}
}

// TestNothingIsWrittenHalf: results that cannot be shown are an error.
func TestNothingIsWrittenHalf(t *testing.T) {
	room(t)
	var stderr bytes.Buffer
	code := Run(context.Background(), fake(nil), []string{"plan", "case.yaml"}, refusing{}, &stderr)
	if code != ExitFiles || !strings.Contains(stderr.String(), "standard output") {
		t.Errorf("exit %d, stderr %q", code, stderr.String())
	}
}

type refusing struct{}

func (refusing) Write([]byte) (int, error) { return 0, syscall.ENOSPC }

func TestExitCodes(t *testing.T) {
	for _, c := range []struct {
		err  error
		want int
	}{
		{nil, 0},
		{errNotMet, 1},
		{configs.Faults{{}}, 2},
		{&store.Exists{}, 2},
		{usagef("x"), 2},
		{fmt.Errorf("a: %w", &evolve.Failure{}), 3},
		{&store.FileSystem{Err: syscall.ENOSPC}, 4},
		{&os.PathError{Err: syscall.EACCES}, 4},
		{fmt.Errorf("b: %w", syscall.EIO), 4},
		{fmt.Errorf("c: %w", context.Canceled), 130},
		{coded(ExitFiles, context.Canceled), 130},
	} {
		if got := exitCode(c.err); got != c.want {
			t.Errorf("%v: exit %d, want %d", c.err, got, c.want)
		}
	}
}

func TestVersionSaysWhichBuild(t *testing.T) {
	info := &debug.BuildInfo{Main: debug.Module{Version: "v1.2.3"}, Settings: []debug.BuildSetting{
		{Key: "vcs.revision", Value: "0123456789abcdef0123"}, {Key: "vcs.modified", Value: "true"}}}
	got := describe(info)
	for _, part := range []string{"v1.2.3 (commit 0123456789ab, changed since, go"} {
		if !strings.HasPrefix(got, part) {
			t.Errorf("%q lacks %q", got, part)
		}
	}
	if got := describe(nil); !strings.HasPrefix(got, "unversioned (commit unknown, go") {
		t.Errorf("%q", got)
	}
}
