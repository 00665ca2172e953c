//go:build long

package main

import (
	"math"
	"testing"
)

// The program's own size: 15504 states.
func TestSolveFullSize(t *testing.T) {
	m := model{rungs: 10, bosons: 5, flux: math.Pi / 2}
	for _, k := range []float64{0.25, 0.75, 2} {
		compare(t, m, k)
	}
}
