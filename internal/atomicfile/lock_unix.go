//go:build darwin || dragonfly || freebsd || illumos || linux || netbsd || openbsd

package atomicfile

import (
	"errors"
	"os"
	"syscall"
)

// tryLock returns errHeld if another open file has the lock.
func tryLock(f *os.File) error {
	for {
		err := syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB)
		switch {
		case errors.Is(err, syscall.EINTR):
			continue
		case errors.Is(err, syscall.EWOULDBLOCK):
			return errHeld
		case errors.Is(err, syscall.ENOLCK):
			return errors.ErrUnsupported
		}
		return err
	}
}
