//go:build !linux

package store

import "errors"

// exchange has no portable form; the caller renames twice instead.
func exchange(a, b string) error { return errors.ErrUnsupported }
