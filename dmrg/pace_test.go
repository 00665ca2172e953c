package dmrg

import (
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
		{"far away", []settledStage{stage(24, 1e-2)}, 96},
		{"nearly there", []settledStage{stage(100, 0.6e-8)}, 125},
		{"the power law", []settledStage{stage(50, 0.5e-2), stage(100, 0.5e-5)}, 200}, // 1000 for each doubling
		{"a slow one", []settledStage{stage(50, 2e-8), stage(100, 1.8e-8)}, 189},      // by the square at the slowest
		{"few states", []settledStage{stage(4, 1e-9)}, 12},
		{"the cap", []settledStage{stage(400, 1)}, 1000},
		{"nothing known", []settledStage{{bond: 100}}, 160},
	} {
		s := &search[float64]{opt: settled{Options: Options{Precision: 1e-8, Bond: 1000}}, stages: row.stages}
		assert.InDelta(t, row.want, s.nextBond(row.stages[len(row.stages)-1].bond), 1, row.name)
	}
}
