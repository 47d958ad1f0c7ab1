package store

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"strings"
)

// Exists is returned when a result directory must not be replaced: it holds
// the result of another case, or files that are no part of a result.
type Exists struct {
	Dir string
	// Foreign names what lies in Dir and is no part of a result. Such files
	// are never deleted, not even when force is given.
	Foreign []string
	// NotDir says that Dir is there but is no directory.
	NotDir bool
}

func (e *Exists) Error() string {
	switch {
	case e.NotDir:
		return fmt.Sprintf("%s is not a directory; choose another place with --out", e.Dir)
	case len(e.Foreign) > 0:
		names := e.Foreign
		more := ""
		if len(names) > 3 {
			more = fmt.Sprintf(" and %d more", len(names)-3)
			names = names[:3]
		}
		return fmt.Sprintf("%s holds files that are not part of a result (%s%s), which --force does not delete either; move them away or choose another place with --out",
			e.Dir, strings.Join(names, ", "), more)
	}
	return fmt.Sprintf("%s holds the result of another case; use --force to replace it or choose another place with --out", e.Dir)
}

// FileSystem is a failed operation of the operating system. Unwrap gives the
// original error, so that errors.Is(err, syscall.ENOSPC) and the like work.
type FileSystem struct {
	Doing string // what was being done, e.g. "write waveform.npz for"
	Path  string // the result directory (or the file in it that was read)
	Note  string // optional: what the failure left behind
	Err   error
}

func (e *FileSystem) Error() string {
	s := fmt.Sprintf("cannot %s %s: %v", e.Doing, e.Path, plain(e.Err))
	if e.Note != "" {
		s += "; " + e.Note
	}
	return s
}

func (e *FileSystem) Unwrap() error { return e.Err }

// plain strips the path that os errors carry: it is that of a temporary file
// which no longer exists when the sentence is read.
func plain(err error) error {
	var path *fs.PathError
	var link *os.LinkError
	switch {
	case errors.As(err, &path):
		return path.Err
	case errors.As(err, &link):
		return link.Err
	}
	return err
}

// Invalid is returned for a bundle that cannot be stored as it is: a number
// that JSON does not have (NaN, infinity), series whose lengths disagree, a
// number without its error bar. Nothing has been written then.
type Invalid struct {
	File    string // the file that would have held it
	Path    string // where in it, e.g. "modes[3].infinity.energy.error"
	Problem string
}

func (e *Invalid) Error() string {
	return fmt.Sprintf("the result cannot be stored: %s in %s %s", e.Path, e.File, e.Problem)
}

// NotResult is returned by Read for a directory that is not a whole result.
type NotResult struct {
	Dir    string
	Reason string
	Err    error // may be nil
}

func (e *NotResult) Error() string {
	return fmt.Sprintf("%s is not a usable result directory: %s", e.Dir, e.Reason)
}

func (e *NotResult) Unwrap() error { return e.Err }

// Damaged lists the files of a result directory that differ from what was
// written.
type Damaged struct {
	Dir   string
	Files []Difference // in the order of SHA256SUMS
}

// Difference is one file that is not as it was written.
type Difference struct {
	Name   string
	Reason string // "missing", "differs from its SHA-256 sum", …
}

func (e *Damaged) Error() string {
	parts := make([]string, len(e.Files))
	for i, f := range e.Files {
		parts[i] = f.Name + " " + f.Reason
	}
	return fmt.Sprintf("%s is damaged: %s; run the case again", e.Dir, strings.Join(parts, ", "))
}
