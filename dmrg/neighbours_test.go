package dmrg

import (
	"context"
	"fmt"
	"math"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
	"rundle/mps"
)

// TestNeighbours compares with sums of single-particle levels, and with searches that begin on their own.
func TestNeighbours(t *testing.T) {
	const n = 16
	q := exact.NewQuadratic(n)
	for j := range n - 1 {
		q.Hop(j+1, j, -1)
	}
	h := hamiltonian(t, n, ladder.Open, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c.")
	var sectors []ladder.Sector
	counts := []int{8, 9, 7, 10, 5}
	for _, particles := range counts {
		sectors = append(sectors, ladder.Sector{"N": particles})
	}
	all, err := Neighbours(context.Background(), h, sectors, Options{})
	require.NoError(t, err)
	require.Len(t, all, len(sectors))
	var warm, cold float64
	for i, r := range all {
		g, err := q.Filled(counts[i])
		require.NoError(t, err)
		require.Equal(t, Converged, r.Verdict)
		require.Equal(t, float64(counts[i]), r.Sector["N"])
		requireHonest(t, r, g.Energy)
		if i > 0 {
			warm += r.Flops
			cold += ground1(t, h, sectors[i], Options{}).Flops
		}
	}
	t.Logf("%.3g operations, %.3g from their own starts", warm, cold)
}

// TestSteps: a step changes the charge, on every kind of site, and where several legs carry charges of their own.
func TestSteps(t *testing.T) {
	for _, row := range []struct {
		name     string
		h        *ladder.Hamiltonian
		from, to ladder.Sector
	}{
		{"fermions", hamiltonian(t, 6, ladder.Open, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c."), ladder.Sector{"N": 3}, ladder.Sector{"N": 5}},
		{"spins", heisenberg(t, 6), ladder.Sector{"Sz": 0}, ladder.Sector{"Sz": 2}},
		{"electrons", hubbard(t, 4), ladder.Sector{"N": 4, "Sz": 0}, ladder.Sector{"N": 3, "Sz": "1/2"}},
		{"bosons on two legs", hamiltonian(t, 3, ladder.Open, []ladder.Site{ladder.Boson(2), ladder.Boson(2)}, "-b^+[a,j+1] b[a,j] + h.c.",
			"-b^+[b,j+1] b[b,j] + h.c.", "n[a,j] n[b,j]"), ladder.Sector{"N_a": 2, "N_b": 1}, ladder.Sector{"N_a": 1, "N_b": 2}},
		{"parity", hamiltonian(t, 6, ladder.Open, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c.", "-0.5 c^+[a,j+1] c^+[a,j] + h.c."), ladder.Sector{"P": 0}, ladder.Sector{"P": 1}},
	} {
		t.Run(row.name, func(t *testing.T) {
			here := ground1(t, row.h, row.from, Options{})
			p, err := newProblem(row.h, row.to, Options{})
			require.NoError(t, err)
			c, ok := here.State.Real()
			require.True(t, ok)
			start := warmStart(p, p.target.Charge, []*mps.Chain[float64]{c})
			require.NotNil(t, start)
			require.Equal(t, p.target.Charge, start.Charge())
			require.Positive(t, start.Norm())
			all, err := Neighbours(context.Background(), row.h, []ladder.Sector{row.from, row.to}, Options{})
			require.NoError(t, err)
			own := ground1(t, row.h, row.to, Options{})
			require.InDelta(t, own.EnergyLimit, all[1].EnergyLimit, own.EnergyError+all[1].EnergyError)
		})
	}
}

// TestSteppedState: one particle put on a product state is the sum over the free sites.
func TestSteppedState(t *testing.T) {
	h := hamiltonian(t, 4, ladder.Open, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c.")
	p, err := newProblem(h, ladder.Sector{"N": 2}, Options{})
	require.NoError(t, err)
	c, ok := product(t, h, nil, []int{0, 1, 0, 0}).Real()
	require.True(t, ok)
	start := warmStart(p, p.target.Charge, []*mps.Chain[float64]{c})
	require.NotNil(t, start)
	weight := 0.0
	for i := range 4 {
		if i == 1 {
			continue
		}
		states := []int{0, 1, 0, 0}
		states[i] = 1
		other, _ := product(t, h, nil, states).Real()
		x := mps.Overlap(other, start, nil) / start.Norm()
		require.Greater(t, math.Abs(x), 0.1, fmt.Sprint(states))
		weight += x * x
	}
	require.InDelta(t, 1, weight, 1e-12)
}
