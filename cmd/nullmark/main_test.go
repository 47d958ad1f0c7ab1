package main

import (
	"bytes"
	"context"
	"encoding/json"
	"os"
	"path/filepath"
	"slices"
	"sync/atomic"
	"testing"

	"nullmark/cmd/internal/app"
	"nullmark/cmd/internal/wire"
	"nullmark/configs"
	"nullmark/extract/result"
	"nullmark/extract/store"
)

// run carries out a command line with a given engine on a short case and wants
// its exit code to be one of those given.
func run(t *testing.T, e app.Engine, ctx context.Context, codes []int, args ...string) (stdout string) {
	t.Helper()
	text, err := configs.ShippedFile("circular.yaml")
	if err != nil {
		t.Fatal(err)
	}
	file := filepath.Join(t.TempDir(), "circular.yaml")
	if err := os.WriteFile(file, text, 0o644); err != nil {
		t.Fatal(err)
	}
	args = append(args, "--quiet", "--set", "waves.l_max=3", "--set", "accuracy.relative=1e-5", file)
	var out, errs bytes.Buffer
	code := app.Run(ctx, e, args, &out, &errs)
	if !slices.Contains(codes, code) {
		t.Fatalf("%q: exit %d, want one of %v\n%s", args, code, codes, errs.String())
	}
	return out.String()
}

// numbers is what a run has found: the files that hold nothing but numbers,
// and result.json without what belongs to the occasion.
func numbers(t *testing.T, dir string) map[string]string {
	t.Helper()
	if err := store.Check(dir); err != nil {
		t.Fatal(err)
	}
	all := map[string]string{}
	for _, name := range []string{"case.yaml", "waveform.npz", "horizon.npz", "flux.csv", "result.json"} {
		data, err := os.ReadFile(filepath.Join(dir, name))
		if err != nil {
			t.Fatal(err)
		}
		all[name] = string(data)
	}
	var r result.Result
	if err := json.Unmarshal([]byte(all["result.json"]), &r); err != nil {
		t.Fatal(err)
	}
	r.Provenance = result.Provenance{}
	for i := range r.Rungs {
		r.Rungs[i].CoreSeconds = 0
	}
	text, err := json.Marshal(r)
	if err != nil {
		t.Fatal(err)
	}
	all["result.json"] = string(text)
	return all
}

func same(t *testing.T, what string, a, b map[string]string) {
	t.Helper()
	for name := range a {
		if a[name] != b[name] {
			t.Errorf("%s: %s differs", what, name)
		}
	}
}

// TestSchedulingChangesNoBit: the number of workers, and whether a run was
// interrupted and taken up again, change no bit of any number.
func TestSchedulingChangesNoBit(t *testing.T) {
	dir := t.TempDir()
	one, two, resumed := filepath.Join(dir, "one"), filepath.Join(dir, "two"), filepath.Join(dir, "resumed")
	bg, done := context.Background(), []int{app.ExitDone}
	run(t, engine(), bg, done, "run", "--workers", "1", "--out", one)
	run(t, engine(), bg, done, "run", "--workers", "2", "--out", two)
	want := numbers(t, one)
	same(t, "two workers", want, numbers(t, two))

	// Interrupted when two parts of several are finished.
	ctx, cancel := context.WithCancel(bg)
	defer cancel()
	e := engine()
	e.Run = func(ctx context.Context, c *configs.Case, o wire.Options) (*result.Bundle, error) {
		var parts, none atomic.Int32
		o.Keep = counting{o.Keep, &none, &parts, func() {
			if parts.Load() == 2 {
				cancel()
			}
		}}
		return wire.Run(ctx, c, o)
	}
	run(t, e, ctx, []int{app.ExitInterrupted}, "run", "--workers", "2", "--out", resumed)
	if _, _, err := store.Read(resumed); err == nil {
		t.Error("an interrupted run left something that reads as a result")
	}

	var loaded, saved atomic.Int32
	e.Run = func(ctx context.Context, c *configs.Case, o wire.Options) (*result.Bundle, error) {
		o.Keep = counting{o.Keep, &loaded, &saved, func() {}}
		return wire.Run(ctx, c, o)
	}
	run(t, e, bg, done, "run", "--resume", "--out", resumed)
	if loaded.Load() == 0 || saved.Load() == 0 {
		t.Errorf("the resumed run took over %d parts and made %d: the test wants some of both", loaded.Load(), saved.Load())
	}
	same(t, "interrupted and resumed", want, numbers(t, resumed))

	// The stored case gives the same numbers again.
	again := filepath.Join(dir, "again")
	var out, errs bytes.Buffer
	if code := app.Run(bg, engine(), []string{"run", "--quiet", "--out", again, filepath.Join(one, "case.yaml")}, &out, &errs); code != app.ExitDone {
		t.Fatalf("exit %d: %s", code, errs.String())
	}
	same(t, "the stored case", want, numbers(t, again))
}

// counting counts the parts that a run takes over and makes.
type counting struct {
	wire.Keeper
	loaded, saved *atomic.Int32
	kept          func() // called when a part has been saved
}

func (k counting) Load(key string) ([]byte, bool) {
	data, ok := k.Keeper.Load(key)
	if ok {
		k.loaded.Add(1)
	}
	return data, ok
}

func (k counting) Save(key string, data []byte) error {
	err := k.Keeper.Save(key, data)
	k.saved.Add(1)
	k.kept()
	return err
}
