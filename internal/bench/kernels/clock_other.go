//go:build !linux

package main

import "time"

var start = time.Now()

// threadSeconds is the time that has passed: the machine should have nothing else to do.
func threadSeconds() float64 { return time.Since(start).Seconds() }
