//go:build unix

package main

import (
	"os"
	"os/signal"
	"syscall"
)

// stopSignals ask the process to stop; a hang-up does so unless the program was started to outlive it.
func stopSignals() []os.Signal {
	s := []os.Signal{os.Interrupt, syscall.SIGTERM}
	if !signal.Ignored(syscall.SIGHUP) {
		s = append(s, syscall.SIGHUP)
	}
	return s
}

// ignoreFileSizeSignal makes a file beyond the limit on sizes an error instead of the end of the process.
func ignoreFileSizeSignal() { signal.Ignore(syscall.SIGXFSZ) }
