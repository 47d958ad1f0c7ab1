package store

import (
	"errors"
	"os"
	"path/filepath"
	"slices"
	"strings"
)

// A directory is replaced by way of a hidden holder beside it:
//
//	.NAME.writing-123/new   the new directory while it is being written
//	.NAME.writing-123/old   the earlier one, only between two renames
//
// Where the system can exchange two paths, NAME is the old whole directory in
// one instant and the new whole one in the next. Elsewhere it is absent
// between two renames; if the process dies just there, the earlier directory
// is whole in the holder and restore brings it back.
const (
	holderMark = ".writing-"
	addMark    = ".adding-" // holder of files being added, inside the directory
	newName    = "new"
	oldName    = "old"
)

// holders lists the holders that an interrupted write of dir left behind.
func holders(dir string) ([]string, error) {
	parent, base := filepath.Split(dir)
	entries, err := os.ReadDir(parent)
	if errors.Is(err, os.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	var out []string
	for _, e := range entries {
		if e.IsDir() && strings.HasPrefix(e.Name(), "."+base+holderMark) {
			out = append(out, filepath.Join(parent, e.Name()))
		}
	}
	slices.Sort(out)
	return out, nil
}

// restore puts the earlier directory back where a process died between the two
// renames. It changes nothing when dir is there.
func restore(d disk, dir string) error {
	if present(dir) {
		return nil
	}
	left, err := holders(dir)
	if err != nil {
		return err
	}
	for _, h := range left {
		old := filepath.Join(h, oldName)
		if !present(old) {
			continue
		}
		if err := d.Rename(old, dir); err != nil {
			return err
		}
		return d.SyncDir(filepath.Dir(dir))
	}
	return nil
}

// tidy removes what interrupted writes of dir left behind. It keeps a holder
// that has the only copy of the earlier directory.
func tidy(d disk, dir string) error {
	left, err := holders(dir)
	if err != nil {
		return err
	}
	for _, h := range left {
		if !present(dir) && present(filepath.Join(h, oldName)) {
			continue
		}
		if err := d.RemoveAll(h); err != nil {
			return err
		}
	}
	return nil
}

// swap puts holder/new in the place of dir, which may be absent. After an
// error dir is what it was before, or (when only a sync failed) the new one.
func swap(d disk, holder, dir string) error {
	fresh := filepath.Join(holder, newName)
	parent := filepath.Dir(dir)
	if !present(dir) {
		if err := d.Rename(fresh, dir); err != nil {
			return err
		}
		return d.SyncDir(parent)
	}
	err := d.Exchange(fresh, dir)
	if errors.Is(err, errors.ErrUnsupported) {
		err = renameTwice(d, holder, dir)
	}
	if err != nil {
		return err
	}
	return errors.Join(d.SyncDir(parent), d.SyncDir(holder))
}

func renameTwice(d disk, holder, dir string) error {
	old := filepath.Join(holder, oldName)
	if err := d.Rename(dir, old); err != nil {
		return err
	}
	if err := d.Rename(filepath.Join(holder, newName), dir); err != nil {
		return errors.Join(err, d.Rename(old, dir))
	}
	return nil
}

// present says whether something lies at path, whatever it is.
func present(path string) bool {
	_, err := os.Lstat(path)
	return err == nil
}

// resolve gives the absolute path of dir with symbolic links followed where it
// exists, so that renaming replaces the directory and not a link to it.
func resolve(dir string) (string, error) {
	abs, err := filepath.Abs(dir)
	if err != nil {
		return "", err
	}
	real, err := filepath.EvalSymlinks(abs)
	if err == nil {
		return real, nil
	}
	if errors.Is(err, os.ErrNotExist) {
		return abs, nil
	}
	return "", err
}
