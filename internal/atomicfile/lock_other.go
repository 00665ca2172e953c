//go:build !(darwin || dragonfly || freebsd || illumos || linux || netbsd || openbsd || windows)

package atomicfile

import (
	"errors"
	"os"
)

func tryLock(*os.File) error { return errors.ErrUnsupported }
