//go:build !linux

package main

import "time"

// processSeconds is the time since the start: the machine should have nothing else to do.
func processSeconds() float64 { return time.Since(began).Seconds() }

// peakMemory is not known here.
func peakMemory() (float64, error) { return 0, nil }
