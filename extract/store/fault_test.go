package store

import (
	"bytes"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"syscall"
	"testing"

	"nullmark/extract/result"
)

// faulty is a disk (one that syncs nothing, for speed) whose operation number failAt (counted from 1) fails, and
// with dead every later one: the process is gone, nothing is cleaned up.
type faulty struct {
	system
	failAt     int
	dead       bool
	noExchange bool
	onlyRename int // > 0: every Rename from this one on fails, nothing else does
	count      int
	renames    int
	failed     string // the operation that failed
	log        []string
}

func (d *faulty) step(format string, args ...any) error {
	d.count++
	d.log = append(d.log, fmt.Sprintf(format, args...))
	if d.count == d.failAt || d.dead && d.failAt > 0 && d.count > d.failAt {
		if d.failed == "" {
			d.failed = fmt.Sprintf(format, args...)
		}
		return syscall.ENOSPC
	}
	return nil
}

func (d *faulty) MkdirAll(path string) error {
	if err := d.step("MkdirAll"); err != nil {
		return err
	}
	return d.system.MkdirAll(path)
}

func (d *faulty) Mkdir(path string) error {
	if err := d.step("Mkdir"); err != nil {
		return err
	}
	return d.system.Mkdir(path)
}

func (d *faulty) MkdirTemp(parent, pattern string) (string, error) {
	if err := d.step("MkdirTemp"); err != nil {
		return "", err
	}
	return d.system.MkdirTemp(parent, pattern)
}

func (d *faulty) Create(path string) (file, error) {
	if err := d.step("Create %s", filepath.Base(path)); err != nil {
		return nil, err
	}
	f, err := d.system.Create(path)
	return &faultyFile{f, d, filepath.Base(path)}, err
}

func (d *faulty) Rename(from, to string) error {
	d.renames++
	if d.onlyRename > 0 && d.renames >= d.onlyRename {
		return syscall.EIO
	}
	if err := d.step("Rename"); err != nil {
		return err
	}
	return d.system.Rename(from, to)
}

func (d *faulty) Exchange(a, b string) error {
	if d.noExchange {
		return errors.ErrUnsupported
	}
	if err := d.step("Exchange"); err != nil {
		return err
	}
	return d.system.Exchange(a, b)
}

func (d *faulty) Remove(path string) error {
	if err := d.step("Remove"); err != nil {
		return err
	}
	return d.system.Remove(path)
}

func (d *faulty) RemoveAll(path string) error {
	if err := d.step("RemoveAll"); err != nil {
		return err
	}
	return d.system.RemoveAll(path)
}

func (d *faulty) SyncDir(path string) error {
	if err := d.step("SyncDir %s", filepath.Base(path)); err != nil {
		return err
	}
	_, err := os.Stat(path)
	return err
}

type faultyFile struct {
	file
	d    *faulty
	name string
}

// Write of a full disk takes part of the bytes and fails.
func (f *faultyFile) Write(p []byte) (int, error) {
	if err := f.d.step("Write %s", f.name); err != nil {
		n, _ := f.file.Write(p[:len(p)/2])
		return n, err
	}
	return f.file.Write(p)
}

func (f *faultyFile) Sync() error { return f.d.step("Sync %s", f.name) }

func (f *faultyFile) Close() error {
	err := f.d.step("Close %s", f.name)
	return errors.Join(err, f.file.Close())
}

// short is sample with a few samples only.
func short(seed float64) *result.Bundle {
	b := sample(seed)
	s := b.Series
	s.U, s.T, s.R, s.Phi = s.U[:50], s.T[:40], s.R[:40], s.Phi[:40]
	for i := range s.Modes {
		m := &s.Modes[i]
		m.Wave, m.WaveErr, m.Evidence = m.Wave[:50], m.WaveErr[:50], nil
	}
	return b
}

// replacement gives the trees of an earlier result and of the one that replaces
// it, and a function that lays the earlier one at dir.
func replacement(t *testing.T, earlier bool) (old, new map[string]string, lay func(dir string)) {
	t.Helper()
	root := t.TempDir()
	a, b := filepath.Join(root, "a"), filepath.Join(root, "b")
	mustWrite(t, a, short(1), caseA)
	mustWrite(t, b, short(2), caseA)
	old, new = tree(t, a), tree(t, b)
	lay = func(dir string) {
		if err := os.MkdirAll(filepath.Dir(dir), 0o777); err != nil {
			t.Fatal(err)
		}
		if earlier {
			if err := os.CopyFS(dir, os.DirFS(a)); err != nil {
				t.Fatal(err)
			}
		}
	}
	if !earlier {
		old = nil
	}
	return old, new, lay
}

// state gives the tree of dir, nil when it is absent.
func state(t *testing.T, dir string) map[string]string {
	t.Helper()
	if !present(dir) {
		return nil
	}
	return tree(t, dir)
}

// TestEveryFault lets each operation of a write fail once, with and without an
// earlier result, with and without an exchange of paths, as an error and as the
// death of the process.
func TestEveryFault(t *testing.T) {
	for _, earlier := range []bool{true, false} {
		old, new, lay := replacement(t, earlier)
		for _, noExchange := range []bool{false, true} {
			for _, dead := range []bool{false, true} {
				label := fmt.Sprintf("earlier %v, exchange %v, process dies %v", earlier, !noExchange, dead)
				sawOld, sawNew, sawAbsent := 0, 0, 0
				k := 0
				for {
					k++
					root := t.TempDir()
					dir := filepath.Join(root, "results", "r")
					lay(dir)
					d := &faulty{failAt: k, dead: dead, noExchange: noExchange}
					err := write(d, dir, short(2), []byte(caseA), all(), false)
					if d.failed == "" {
						if err != nil {
							t.Errorf("%s: no fault, yet %v", label, err)
						}
						break
					}
					at := fmt.Sprintf("%s, operation %d (%s)", label, k, d.failed)
					var fsErr *FileSystem
					if !errors.As(err, &fsErr) || !errors.Is(err, syscall.ENOSPC) {
						t.Errorf("%s: %v", at, err)
					}
					got := state(t, dir)
					switch {
					case reflect.DeepEqual(got, old):
						sawOld++
						if fsErr != nil && strings.Contains(fsErr.Note, "in place") {
							t.Errorf("%s: the old result is there, the error says %v", at, err)
						}
					case reflect.DeepEqual(got, new):
						sawNew++
						if fsErr != nil && !strings.Contains(fsErr.Note, "in place") {
							t.Errorf("%s: the new result is there, the error says only %v", at, err)
						}
					case got == nil && dead && noExchange:
						sawAbsent++
						if fsErr != nil && !strings.Contains(fsErr.Note, "kept in") {
							t.Errorf("%s: the error does not say where the earlier result is: %v", at, err)
						}
						// The next run finds the earlier result again.
						if err := Ready(dir, []byte(caseA), false); err != nil || !reflect.DeepEqual(state(t, dir), old) {
							t.Errorf("%s: not restored: %v", at, err)
						}
					default:
						t.Errorf("%s: neither the old nor the new result is there", at)
					}
					want := 1
					if got == nil && !earlier {
						want = 0
					}
					if left := len(names(t, filepath.Dir(dir))); !dead && left != want {
						t.Errorf("%s: left behind %v", at, names(t, filepath.Dir(dir)))
					}
					// The next write succeeds and leaves nothing but its result.
					if err := write(&faulty{}, dir, short(2), []byte(caseA), all(), false); err != nil {
						t.Errorf("%s: the next write: %v", at, err)
					}
					if !reflect.DeepEqual(state(t, dir), new) || len(names(t, filepath.Dir(dir))) != 1 {
						t.Errorf("%s: after the next write: %v", at, names(t, filepath.Dir(dir)))
					}
				}
				if k < 30 || sawOld == 0 || sawNew == 0 || (sawAbsent > 0) != (earlier && dead && noExchange) {
					t.Errorf("%s: %d operations; old %d, new %d, absent %d times", label, k, sawOld, sawNew, sawAbsent)
				}
			}
		}
	}
}

// Every file and the new directory are durable before the directory takes its
// place, and the place is durable before what it replaced is removed.
func TestSyncOrder(t *testing.T) {
	for _, noExchange := range []bool{false, true} {
		_, _, lay := replacement(t, true)
		dir := filepath.Join(t.TempDir(), "results", "r")
		lay(dir)
		d := &faulty{noExchange: noExchange}
		if err := write(d, dir, short(2), []byte(caseA), all(), false); err != nil {
			t.Fatal(err)
		}
		var order []string
		for _, name := range []string{"case.yaml", "result.json", "waveform.npz", "horizon.npz", "flux.csv", "report.html", "SHA256SUMS"} {
			order = append(order, "Create "+name, "Write "+name, "Sync "+name, "Close "+name)
		}
		order = append(order, "SyncDir new")
		if noExchange {
			order = append(order, "Rename", "Rename")
		} else {
			order = append(order, "Exchange")
		}
		order = append(order, "SyncDir results", "RemoveAll")
		at := 0
		for _, op := range order {
			for at < len(d.log) && d.log[at] != op {
				at++
			}
			if at == len(d.log) {
				t.Fatalf("no %q in its place:\n%s", op, strings.Join(d.log, "\n"))
			}
			at++
		}
	}
	d := &faulty{}
	dir := t.TempDir()
	if err := (&Keeper{disk: d, dir: dir}).save("a", []byte("data")); err != nil {
		t.Fatal(err)
	}
	if got, want := strings.Join(d.log, ", "), "MkdirAll, SyncDir "+filepath.Base(dir)+", MkdirTemp, Create data, Write data, Write data, Sync data, Close data, Rename, SyncDir .partial, RemoveAll"; got != want {
		t.Errorf("a checkpoint is saved by %s, want %s", got, want)
	}
}

// When even putting the earlier result back fails, it is kept, the error says
// where, and the next run restores it.
func TestEarlierResultSurvivesBrokenRenames(t *testing.T) {
	old, _, lay := replacement(t, true)
	dir := filepath.Join(t.TempDir(), "results", "r")
	lay(dir)
	d := &faulty{noExchange: true, onlyRename: 2}
	err := write(d, dir, short(2), []byte(caseA), all(), false)
	if !errors.Is(err, syscall.EIO) || present(dir) || !strings.Contains(err.Error(), "kept in") {
		t.Fatalf("%v, present %v", err, present(dir))
	}
	if err := Ready(dir, []byte(caseA), false); err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(state(t, dir), old) {
		t.Error("the earlier result is lost")
	}
}

// Leftovers of another directory with a similar name are not touched.
func TestTidyKnowsItsOwn(t *testing.T) {
	root := t.TempDir()
	for _, name := range []string{".r.writing-1", ".rr.writing-1", ".r2.writing-1", ".x", "r.writing-1"} {
		if err := os.MkdirAll(filepath.Join(root, name, "new"), 0o777); err != nil {
			t.Fatal(err)
		}
	}
	mustWrite(t, filepath.Join(root, "r"), sample(1), caseA)
	if got, want := fmt.Sprint(names(t, root)), "[.r2.writing-1 .rr.writing-1 .x r r.writing-1]"; got != want {
		t.Errorf("left %s, want %s", got, want)
	}
}

func TestEveryFaultOfAdd(t *testing.T) {
	_, _, lay := replacement(t, true)
	files := map[string][]byte{"report.html": []byte("again"), "comparison.json": []byte("{}")}
	k := 0
	for {
		k++
		dir := filepath.Join(t.TempDir(), "r")
		lay(dir)
		before := tree(t, dir)
		d := &faulty{failAt: k}
		err := add(d, dir, files)
		if d.failed == "" {
			if err != nil {
				t.Error(err)
			}
			break
		}
		at := fmt.Sprintf("operation %d (%s)", k, d.failed)
		var fsErr *FileSystem
		if !errors.As(err, &fsErr) || !errors.Is(err, syscall.ENOSPC) {
			t.Errorf("%s: %v", at, err)
		}
		for name, content := range tree(t, dir) {
			added, isAdded := files[name]
			switch {
			case strings.HasPrefix(name, addMark) && strings.HasPrefix(d.failed, "RemoveAll"): // cleaned by the next one
			case content == before[name], isAdded && content == string(added), name == sumsFile:
			default:
				t.Errorf("%s: %s is neither old nor new", at, name)
			}
		}
		if err := Add(dir, files); err != nil {
			t.Errorf("%s: adding again: %v", at, err)
		}
		if err := Check(dir); err != nil || len(names(t, dir)) != 8 {
			t.Errorf("%s: after adding again: %v, %v", at, err, names(t, dir))
		}
	}
	if k < 12 {
		t.Errorf("only %d operations", k)
	}
}

func TestKeeper(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "deeper", "r")
	k := NewKeeper(dir, []byte(caseA))
	if _, ok := k.Load("rung 1/block 2"); ok || present(dir) {
		t.Error("something is there before anything was saved")
	}
	big := bytes.Repeat([]byte("0123456789abcdef"), 1<<12)
	for key, data := range map[string][]byte{"rung 1/block 2": []byte("one"), "../escape": []byte("two"), "": {}, "big": big} {
		if err := k.Save(key, data); err != nil {
			t.Fatal(err)
		}
		if got, ok := k.Load(key); !ok || !bytes.Equal(got, data) {
			t.Errorf("%q came back as %d bytes, %v", key, len(got), ok)
		}
	}
	if err := k.Save("big", []byte("small")); err != nil {
		t.Fatal(err)
	}
	if got, ok := k.Load("big"); !ok || string(got) != "small" {
		t.Errorf("replaced: %q, %v", got, ok)
	}
	if got := names(t, dir); !reflect.DeepEqual(got, []string{".partial"}) || len(names(t, filepath.Join(dir, ".partial"))) != 4 {
		t.Errorf("files %v, %v", got, names(t, filepath.Join(dir, ".partial")))
	}
	// Another process finds them; another case does not.
	if _, ok := NewKeeper(dir, []byte(caseA)).Load("big"); !ok {
		t.Error("lost for a second keeper")
	}
	if _, ok := NewKeeper(dir, []byte(caseB)).Load("big"); ok {
		t.Error("another case was given this one's checkpoint")
	}
	if err := k.Clear(); err != nil || present(dir) {
		t.Errorf("after Clear: %v, present %v", err, present(dir))
	}
	if err := k.Clear(); err != nil {
		t.Errorf("clearing nothing: %v", err)
	}
	// Clear leaves a result alone.
	mustWrite(t, dir, sample(1), caseA)
	before := tree(t, dir)
	if err := errors.Join(k.Save("x", nil), k.Clear()); err != nil || !reflect.DeepEqual(tree(t, dir), before) {
		t.Errorf("Clear beside a result: %v", err)
	}
}

func TestCorruptCheckpointIsNotThere(t *testing.T) {
	dir := t.TempDir()
	k := NewKeeper(dir, []byte(caseA))
	if err := errors.Join(k.Save("a", []byte("some data")), k.Save("b", []byte("some data"))); err != nil {
		t.Fatal(err)
	}
	path := k.path("a")
	good, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	try := func(what string, data []byte) {
		if err := os.WriteFile(path, data, 0o666); err != nil {
			t.Fatal(err)
		}
		if _, ok := k.Load("a"); ok {
			t.Errorf("%s was taken for a checkpoint", what)
		}
	}
	for i := range good {
		bad := bytes.Clone(good)
		bad[i] ^= 0x10
		try(fmt.Sprintf("a flipped bit in byte %d", i), bad)
		try(fmt.Sprintf("the first %d bytes", i), good[:i])
	}
	try("a longer file", append(bytes.Clone(good), 0))
	other, err := os.ReadFile(k.path("b"))
	if err != nil {
		t.Fatal(err)
	}
	try("the file of another key", other)
}

func TestEveryFaultOfSave(t *testing.T) {
	n := 0
	for _, dead := range []bool{false, true} {
		for n = 1; ; n++ {
			dir := filepath.Join(t.TempDir(), "r")
			d := &faulty{failAt: n, dead: dead}
			k := &Keeper{disk: d, dir: dir, bind: NewKeeper(dir, []byte(caseA)).bind}
			good := NewKeeper(dir, []byte(caseA))
			if err := good.Save("a", []byte("old")); err != nil {
				t.Fatal(err)
			}
			err := k.Save("a", []byte("new"))
			if d.failed == "" {
				break
			}
			var fsErr *FileSystem
			if !errors.As(err, &fsErr) || !errors.Is(err, syscall.ENOSPC) {
				t.Errorf("%s: %v", d.failed, err)
			}
			got, ok := good.Load("a")
			if !ok || string(got) != "old" && string(got) != "new" {
				t.Errorf("%s: %q, %v", d.failed, got, ok)
			}
			if err := good.Clear(); err != nil || present(dir) {
				t.Errorf("%s: after Clear: %v", d.failed, err)
			}
		}
	}
	if n < 6 {
		t.Errorf("only %d operations", n)
	}
}

// The systems under test have an exchange; if not, the fallback above is what
// runs, and this says so.
func TestExchange(t *testing.T) {
	root := t.TempDir()
	a, b := filepath.Join(root, "a"), filepath.Join(root, "b")
	for _, p := range []string{a, b} {
		if err := errors.Join(os.Mkdir(p, 0o777), os.WriteFile(filepath.Join(p, filepath.Base(p)), nil, 0o666)); err != nil {
			t.Fatal(err)
		}
	}
	err := exchange(a, b)
	switch {
	case errors.Is(err, errors.ErrUnsupported):
		t.Log("no exchange of paths here: directories are replaced by two renames")
		if got := names(t, a)[0]; got != "a" {
			t.Errorf("an unsupported exchange changed a: %s", got)
		}
	case err != nil:
		t.Error(err)
	case names(t, a)[0] != "b" || names(t, b)[0] != "a":
		t.Errorf("after the exchange a holds %v, b %v", names(t, a), names(t, b))
	}
	if err := exchange(a, filepath.Join(root, "absent")); err == nil {
		t.Error("exchange with nothing succeeded")
	}
}
