package dmrg

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
)

// TestNextBond: the bond grows by what the gains ask for, within bounds and the cap.
func TestNextBond(t *testing.T) {
	stage := func(bond int, gain float64) settledStage {
		return settledStage{bond: bond, gain: gain, energies: []float64{-1, -1}}
	}
	for _, row := range []struct {
		name   string
		stages []settledStage
		want   int
	}{
		{"far away", []settledStage{stage(24, 1e-2)}, 484},
		{"nearly there", []settledStage{stage(100, 0.6e-8)}, 125},
		{"the power law", []settledStage{stage(50, 0.5e-2), stage(100, 0.5e-5)}, 210}, // 1000 for each doubling
		{"a slow one", []settledStage{stage(50, 2e-8), stage(100, 1.8e-8)}, 244},      // by the square at the slowest
		{"few states", []settledStage{stage(4, 1e-9)}, 12},
		{"the cap", []settledStage{stage(400, 1)}, 1000},
		{"nothing known", []settledStage{{bond: 100}}, 160},
	} {
		s := &search[float64]{opt: settled{Options: Options{Precision: 1e-8, Bond: 1000}}, stages: row.stages}
		assert.InDelta(t, row.want, s.nextBond(row.stages[len(row.stages)-1].bond), 1, row.name)
	}
}

// TestWayEnd: energies that lie on a power law tell where it comes down to the aim.
func TestWayEnd(t *testing.T) {
	law := func(decay float64, bonds ...int) (way []point) {
		for _, b := range bonds {
			way = append(way, point{b, -1 + 1e3*math.Pow(float64(b), -decay)})
		}
		return way
	}
	for _, row := range []struct {
		name string
		way  []point
		aim  float64
		want float64
	}{
		{"even steps", law(4, 24, 48, 96), 1e-7, math.Pow(1e10, 0.25)},
		{"a fast one", law(7, 24, 48, 96), 1e-12, math.Pow(1e15, 1.0/7)},
		{"uneven steps", law(4, 48, 96, 144), 1e-7, math.Pow(1e10, 0.25)},
		{"decay by guess", law(5, 24, 48), 1e-7, 100},
		{"no further than allowed", law(2, 24, 48, 96), 1e-10, 384},
		{"there already", law(4, 24, 48, 96), 1, 96},
		{"nothing gained", []point{{24, -2}, {48, -3}, {96, -3}}, 1e-9, 96},
	} {
		assert.InEpsilon(t, row.want, wayEnd(row.way, row.aim, 384), 0.12, row.name)
	}
}
