//go:build !unix

package main

import (
	"os"
	"syscall"
)

// stopSignals ask the process to stop.
func stopSignals() []os.Signal { return []os.Signal{os.Interrupt, syscall.SIGTERM} }

func ignoreFileSizeSignal() {}
