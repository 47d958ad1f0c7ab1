package store

import (
	"errors"
	"fmt"

	"golang.org/x/sys/unix"
)

// exchange swaps the paths a and b in one step.
func exchange(a, b string) error {
	err := unix.Renameat2(unix.AT_FDCWD, a, unix.AT_FDCWD, b, unix.RENAME_EXCHANGE)
	if err == unix.EINVAL || err == unix.ENOSYS || err == unix.ENOTSUP {
		return fmt.Errorf("exchange %s and %s: %w", a, b, errors.ErrUnsupported)
	}
	return err
}
