//go:build unix

package solve

import (
	"runtime"
	"syscall"
	"time"
)

// processUse returns the processor time in seconds and the peak of resident memory in bytes of this process.
func processUse() (cpu float64, peak int64) {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		return 0, 0
	}
	peak = int64(u.Maxrss)
	if runtime.GOOS != "darwin" && runtime.GOOS != "ios" {
		peak <<= 10 // counted in KiB
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano()).Seconds(), peak
}
