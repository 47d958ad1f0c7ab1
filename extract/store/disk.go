package store

import (
	"errors"
	"io"
	"os"
	"path/filepath"
	"syscall"
)

// disk is every operation that changes the file system, so that tests can make
// each of them fail. Reading goes through os directly.
type disk interface {
	MkdirAll(path string) error
	Mkdir(path string) error
	MkdirTemp(parent, pattern string) (string, error)
	Create(path string) (file, error)
	Rename(from, to string) error
	// Exchange swaps two paths in one step, or fails with an error that is
	// errors.ErrUnsupported where the system cannot.
	Exchange(a, b string) error
	Remove(path string) error
	RemoveAll(path string) error
	SyncDir(path string) error
}

type file interface {
	io.Writer
	Sync() error
	Close() error
}

// system is the disk of the operating system.
type system struct{}

func (system) MkdirAll(path string) error                    { return os.MkdirAll(path, 0o777) }
func (system) Mkdir(path string) error                       { return os.Mkdir(path, 0o777) }
func (system) MkdirTemp(dir, pattern string) (string, error) { return os.MkdirTemp(dir, pattern) }
func (system) Rename(from, to string) error                  { return os.Rename(from, to) }
func (system) Exchange(a, b string) error                    { return exchange(a, b) }
func (system) Remove(path string) error                      { return os.Remove(path) }
func (system) RemoveAll(path string) error                   { return os.RemoveAll(path) }

func (system) Create(path string) (file, error) {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	if err != nil {
		return nil, err
	}
	return f, nil
}

// SyncDir makes the entries of a directory durable. File systems that cannot
// sync a directory (they answer EINVAL or "not supported") are taken to do it
// by themselves.
func (system) SyncDir(path string) error {
	d, err := os.Open(path)
	if err != nil {
		return err
	}
	err = d.Sync()
	if errors.Is(err, syscall.EINVAL) || errors.Is(err, errors.ErrUnsupported) {
		err = nil
	}
	return errors.Join(err, d.Close())
}

// mkdirDurable creates path with its missing parents and syncs the directory
// that got a new entry.
func mkdirDurable(d disk, path string) error {
	var parents []string
	for p := path; ; p = filepath.Dir(p) {
		if _, err := os.Lstat(p); err == nil || p == filepath.Dir(p) {
			break
		}
		parents = append(parents, filepath.Dir(p))
	}
	if len(parents) == 0 {
		return nil
	}
	if err := d.MkdirAll(path); err != nil {
		return err
	}
	for _, p := range parents {
		if err := d.SyncDir(p); err != nil {
			return err
		}
	}
	return nil
}

// writeFile creates path, lets fill write it, and makes the contents durable.
func writeFile(d disk, path string, fill func(io.Writer) error) error {
	f, err := d.Create(path)
	if err != nil {
		return err
	}
	if err := fill(f); err != nil {
		f.Close()
		return err
	}
	if err := f.Sync(); err != nil {
		f.Close()
		return err
	}
	return f.Close()
}
