package atomicfile

import (
	"errors"
	"math"
	"os"

	"golang.org/x/sys/windows"
)

// tryLock returns errHeld if another open file has the lock. Windows keeps others from reading what is locked, so the lock covers
// one byte far beyond the text.
func tryLock(f *os.File) error {
	const flags = windows.LOCKFILE_EXCLUSIVE_LOCK | windows.LOCKFILE_FAIL_IMMEDIATELY
	far := &windows.Overlapped{OffsetHigh: math.MaxInt32}
	err := windows.LockFileEx(windows.Handle(f.Fd()), flags, 0, 1, 0, far)
	if errors.Is(err, windows.ERROR_LOCK_VIOLATION) || errors.Is(err, windows.ERROR_IO_PENDING) {
		return errHeld
	}
	return err
}
