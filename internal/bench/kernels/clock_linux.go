package main

import "golang.org/x/sys/unix"

// threadSeconds is the CPU time of the calling thread.
func threadSeconds() float64 {
	var t unix.Timespec
	if err := unix.ClockGettime(unix.CLOCK_THREAD_CPUTIME_ID, &t); err != nil {
		panic(err)
	}
	return float64(t.Sec) + 1e-9*float64(t.Nsec)
}
