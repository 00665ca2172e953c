//go:build unix

package atomicfile

import (
	"errors"
	"os"
	"syscall"
)

// syncFolder makes a rename in a folder last. Some file systems have no such operation and say so.
func syncFolder(folder string) error {
	f, err := os.Open(folder)
	if err != nil {
		return err
	}
	defer f.Close()
	if err := f.Sync(); err != nil && !errors.Is(err, syscall.EINVAL) && !errors.Is(err, errors.ErrUnsupported) {
		return err
	}
	return nil
}
