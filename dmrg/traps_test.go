package dmrg

import (
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// TestLoneParticle: one boson on a flux ladder, whose lowest levels are two kinds of standing waves. The exact levels are those of one free particle.
func TestLoneParticle(t *testing.T) {
	const rungs = 20
	for _, k := range []float64{1.1, 1.6, 0.7} {
		q := exact.NewQuadratic(2 * rungs)
		for j := range rungs {
			q.Hop(2*j, 2*j+1, complex(-k, 0))
			if j+1 < rungs {
				q.Hop(2*j+2, 2*j, complex(-math.Cos(math.Pi/4), -math.Sin(math.Pi/4)))
				q.Hop(2*j+3, 2*j+1, complex(-math.Cos(math.Pi/4), math.Sin(math.Pi/4)))
			}
		}
		levels, err := q.Levels()
		require.NoError(t, err)
		slices.Sort(levels)
		legs := []ladder.Site{ladder.Boson(1), ladder.Boson(1)}
		lad, err := ladder.New(rungs, ladder.Open, ladder.Leg("a", legs[0]), ladder.Leg("b", legs[1]))
		require.NoError(t, err)
		h, err := lad.Hamiltonian(ladder.Constants{"K": k}, ladder.Term{Formula: "-exp(i*pi/4) b^+[a,j+1] b[a,j] + h.c."},
			ladder.Term{Formula: "-exp(-i*pi/4) b^+[b,j+1] b[b,j] + h.c."}, ladder.Term{Formula: "-K b^+[a,j] b[b,j] + h.c."})
		require.NoError(t, err)
		for _, unprobed := range []bool{true, false} {
			r := ground1(t, h, ladder.Sector{"N": 1}, Options{Precision: 1e-5, Unprobed: unprobed})
			t.Logf("K=%v %v: %.8f ± %.1e, exact %.8f %.8f, %s, escapes %d, %d sweeps %.2g flops", k, unprobed, r.EnergyLimit, r.EnergyError, levels[0], levels[1], r.Verdict, r.Escapes, len(r.Sweeps), r.Flops)
			if !unprobed {
				require.LessOrEqual(t, math.Abs(r.EnergyLimit-levels[0]), r.EnergyError)
			}
		}
	}
}
