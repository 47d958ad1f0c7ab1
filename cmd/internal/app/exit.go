package app

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"syscall"

	"nullmark/configs"
	"nullmark/equations/evolve"
	"nullmark/extract/store"
)

// The exit codes of every command.
const (
	ExitDone        = 0   // done, and everything asked for was reached
	ExitNotMet      = 1   // done, but an asked-for accuracy or a check was not met; the results are kept and say so
	ExitUsage       = 2   // wrong usage or bad input; nothing was written
	ExitNumerical   = 3   // the evolution failed; the message says at which step, time and place
	ExitFiles       = 4   // the file system refused
	ExitInterrupted = 130 // stopped by a signal; finished parts are kept
)

// codedError is an error whose exit code the place that made it knows.
type codedError struct {
	code int
	err  error
}

func (e *codedError) Error() string { return e.err.Error() }
func (e *codedError) Unwrap() error { return e.err }

// coded attaches an exit code to an error; nil stays nil.
func coded(code int, err error) error {
	if err == nil {
		return nil
	}
	return &codedError{code, err}
}

// usagef is wrong usage or bad input.
func usagef(format string, args ...any) error {
	return coded(ExitUsage, fmt.Errorf(format, args...))
}

// errNotMet ends a command whose result is complete and says itself, on
// stdout, what was not reached.
var errNotMet = errors.New("not met")

// exitCode decides by which code an error leaves. An interruption wins over
// what it broke; then comes what the place that made the error has said; then
// the type of the error.
func exitCode(err error) int {
	var said *codedError
	var failure *evolve.Failure
	var faults configs.Faults
	var exists *store.Exists
	switch {
	case err == nil:
		return ExitDone
	case errors.Is(err, context.Canceled):
		return ExitInterrupted
	case errors.As(err, &said):
		return said.code
	case errors.Is(err, errNotMet):
		return ExitNotMet
	case errors.As(err, &failure):
		return ExitNumerical
	case errors.As(err, &faults), errors.As(err, &exists):
		return ExitUsage
	case isFiles(err):
		return ExitFiles
	}
	return ExitUsage
}

// isFiles says whether an error comes from the file system.
func isFiles(err error) bool {
	var path *fs.PathError
	var link *os.LinkError
	var number syscall.Errno
	return errors.As(err, &path) || errors.As(err, &link) || errors.As(err, &number)
}
