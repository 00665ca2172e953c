package dmrg

import (
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// loneBoson is one boson on a ladder with a quarter flux, whose lowest levels are standing waves about two momenta; and the exact levels of a
// free particle.
func loneBoson(t *testing.T, rungs int, k float64) (*ladder.Hamiltonian, []float64) {
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
	lad, err := ladder.New(rungs, ladder.Open, ladder.Leg("a", ladder.Boson(1)), ladder.Leg("b", ladder.Boson(1)))
	require.NoError(t, err)
	h, err := lad.Hamiltonian(ladder.Constants{"K": k}, ladder.Term{Formula: "-exp(i*pi/4) b^+[a,j+1] b[a,j] + h.c."},
		ladder.Term{Formula: "-exp(-i*pi/4) b^+[b,j+1] b[b,j] + h.c."}, ladder.Term{Formula: "-K b^+[a,j] b[b,j] + h.c."})
	require.NoError(t, err)
	return h, levels
}

// TestLoneBoson: without other starts the first of these ends in a mixture near the first excited state, the second crawls on for hundreds of sweeps.
func TestLoneBoson(t *testing.T) {
	for _, k := range []float64{1.1, 0.7, 1.6} {
		h, levels := loneBoson(t, 20, k)
		r := ground1(t, h, ladder.Sector{"N": 1}, Options{Precision: 1e-5})
		t.Logf("K = %v: off by %.1e ± %.1e, %s, escapes %d, %d sweeps", k, r.EnergyLimit-levels[0], r.EnergyError, r.Verdict, r.Escapes, len(r.Sweeps))
		require.Equal(t, Converged, r.Verdict)
		requireHonest(t, r, levels[0])
	}
	h, levels := loneBoson(t, 20, 1.1)
	blind := ground1(t, h, ladder.Sector{"N": 1}, Options{Precision: 1e-5, Opening: Unperturbed, Unprobed: true})
	require.Greater(t, blind.Energy, levels[0]+1e-4, "the test would not see a probe that does nothing")
}

// TestWaypointsAcrossProbes goes on from waypoints before and after the state was exchanged.
func TestWaypointsAcrossProbes(t *testing.T) {
	h, _ := loneBoson(t, 12, 0.7)
	ground := func(o Options) *Result {
		o.Precision = 1e-5
		return ground1(t, h, ladder.Sector{"N": 1}, o)
	}
	var all []*Waypoint
	count := 0
	whole := ground(Options{WaypointEvery: 1, OnWaypoint: func(w *Waypoint) {
		if count++; count%400 == 0 {
			all = append(all, saved(t, w))
		}
	}})
	require.Equal(t, Converged, whole.Verdict)
	all = append(all, saved(t, whole.Waypoint))
	for i, w := range all {
		requireSameBits(t, whole, ground(Options{From: w}), "from waypoint %d of %d", i, len(all))
	}
	plain := ground(Options{Unprobed: true})
	require.NotEqual(t, plain.Energy, whole.Energy, "nothing was exchanged")
}
