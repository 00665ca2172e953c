package atomicfile

import (
	"errors"
	"fmt"
	"io"
	"os"
	"strings"
)

// Lock is a held lock. It has no useful zero value; use Acquire.
type Lock struct{ file *os.File }

// HeldError reports a lock that another process, or another part of this one, holds.
type HeldError struct {
	Path   string
	Holder string // as in "process 4711 on node12"; empty if unknown
}

func (e *HeldError) Error() string {
	holder := e.Holder
	if holder == "" {
		holder = "another process"
	}
	return fmt.Sprintf("%s: in use by %s; wait until it has ended, or choose another folder", e.Path, holder)
}

// errHeld is what tryLock returns when somebody else has the lock.
var errHeld = errors.New("held")

// Acquire takes the lock on the file at path, made if need be, without waiting. It returns a *HeldError if the lock is held and
// an error that is errors.ErrUnsupported where the file system has no locks.
func Acquire(path string) (*Lock, error) {
	f, err := os.OpenFile(path, os.O_RDWR|os.O_CREATE, 0o644)
	if err != nil {
		return nil, err
	}
	if err := tryLock(f); err != nil {
		defer f.Close()
		if errors.Is(err, errHeld) {
			return nil, &HeldError{Path: path, Holder: holder(f)}
		}
		return nil, fmt.Errorf("lock %s: %w", path, err)
	}
	// Who holds it is a courtesy: a full disk must not stand in the way of the lock.
	host, _ := os.Hostname()
	if f.Truncate(0) == nil {
		fmt.Fprintf(f, "process %d on %s\n", os.Getpid(), host)
	}
	return &Lock{file: f}, nil
}

// holder reads the courtesy line of Acquire.
func holder(f *os.File) string {
	b, err := io.ReadAll(io.LimitReader(f, 200))
	s := strings.TrimSpace(string(b))
	if err != nil || !strings.HasPrefix(s, "process ") || strings.ContainsFunc(s, func(r rune) bool { return r < ' ' }) {
		return ""
	}
	return s
}

// Release gives the lock up. The file stays: to remove it would take the name from under one who is just acquiring it.
func (l *Lock) Release() error {
	return errors.Join(l.file.Truncate(0), l.file.Close())
}
