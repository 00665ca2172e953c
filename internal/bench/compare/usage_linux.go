package main

import (
	"bufio"
	"fmt"
	"os"
	"syscall"
	"time"
)

// processSeconds is the processor time of this process since its start.
func processSeconds() float64 {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		panic(err)
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano()).Seconds()
}

// peakMemory is the most resident memory that this process had, in MiB. What its parent had does not count, as it would in getrusage.
func peakMemory() (float64, error) {
	f, err := os.Open("/proc/self/status")
	if err != nil {
		return 0, err
	}
	defer f.Close()
	for s := bufio.NewScanner(f); s.Scan(); {
		var kib float64
		if _, err := fmt.Sscanf(s.Text(), "VmHWM: %g kB", &kib); err == nil {
			return kib / 1024, nil
		}
	}
	return 0, fmt.Errorf("no VmHWM in %s", f.Name())
}
