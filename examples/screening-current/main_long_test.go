//go:build long

package main

import "testing"

// The program's own size: 15504 states.
func TestSolveFullSize(t *testing.T) {
	for _, k := range []float64{0.25, 0.75, 2} {
		compare(t, shownModel, k)
	}
}
