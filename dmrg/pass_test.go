package dmrg

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// TestScheduleIsFollowed: each pass is done as it is written, with the wanted number of products at every bond.
func TestScheduleIsFollowed(t *testing.T) {
	const n = 12
	schedule := []Pass{{Bond: 8, Perturbation: 1e-4}, {Bond: 8, Vectors: 3}, {Bond: 16, Vectors: 2, Weight: 1e-3}, {Bond: 16, Vectors: 2}}
	var stages []int
	r := ground1(t, hubbard(t, n), ladder.Sector{"N": n, "Sz": 0}, Options{Schedule: schedule, OnStage: func(s Stage) { stages = append(stages, s.Bond) }})
	require.Len(t, r.Sweeps, len(schedule))
	for i, p := range schedule {
		s := r.Sweeps[i]
		assert.Equal(t, p.Bond, s.Bond)
		assert.Equal(t, p.Perturbation, s.Perturbation)
		assert.Positive(t, s.Flops)
		if i > 0 { // from the product state some spaces are exhausted sooner
			assert.Equal(t, 2*(n-1)*p.Vectors, s.Products, "pass %d", i)
		}
	}
	assert.Less(t, r.Sweeps[2].LargestBond, 16, "the weight was to bound the bond")
	assert.Equal(t, 16, r.Sweeps[3].LargestBond)
	assert.Equal(t, []int{8, 16}, stages)
	assert.Equal(t, SweepCap, r.Verdict)
	assert.Contains(t, r.Reason, "the 4 sweeps of the schedule are done")
	assert.Equal(t, 16, r.LargestBond)
}

// TestScheduleVerdict: a schedule that settles two bond dimensions beyond the precision is converged, by an energy that is the exact one.
func TestScheduleVerdict(t *testing.T) {
	const n = 12
	want, err := exact.HeisenbergChain(n, n/2)
	require.NoError(t, err)
	passes := []Pass{{Bond: 16, Perturbation: 1e-4}, {Bond: 16}, {Bond: 16}, {Bond: 64, Perturbation: 1e-6}, {Bond: 64}, {Bond: 64}, {Bond: 64}}
	r := ground1(t, heisenberg(t, n), ladder.Sector{"Sz": 0}, Options{Schedule: passes, Precision: 1e-6})
	require.Equal(t, Converged, r.Verdict, r.Reason)
	requireHonest(t, r, want)
	assert.InDelta(t, want, r.Energy, 1e-9)
	r = ground1(t, heisenberg(t, n), ladder.Sector{"Sz": 0}, Options{Schedule: passes[:3], Precision: 1e-6})
	assert.Equal(t, SweepCap, r.Verdict, "one bond dimension alone says nothing")
}

func TestScheduleCaps(t *testing.T) {
	h, sector := heisenberg(t, 24), ladder.Sector{"Sz": 0}
	passes := []Pass{{Bond: 8, Perturbation: 1e-4}, {Bond: 300}}
	r := ground1(t, h, sector, Options{Schedule: passes, Memory: 1 << 20})
	assert.Equal(t, MemoryCap, r.Verdict)
	assert.Contains(t, r.Reason, "pass 1 of the schedule, bond dimension 300")
	assert.Len(t, r.Sweeps, 1)
	r = ground1(t, h, sector, Options{Schedule: passes, Sweeps: 1})
	assert.Equal(t, SweepCap, r.Verdict)
	assert.Len(t, r.Sweeps, 1)
}

func TestScheduleRefusals(t *testing.T) {
	for _, row := range []struct {
		pass Pass
		want string
	}{
		{Pass{}, "Bond = 0: want a positive bond dimension"},
		{Pass{Bond: 20}, "Bond = 20: want no more than option Bond = 10"},
		{Pass{Bond: 4, Vectors: -1}, "Vectors = -1"},
		{Pass{Bond: 4, Weight: 1}, "Weight = 1"},
		{Pass{Bond: 4, Weight: math.NaN()}, "Weight = NaN"},
		{Pass{Bond: 4, Perturbation: math.Inf(1)}, "Perturbation = +Inf"},
		{Pass{Bond: 4, Gain: math.Inf(1)}, "Gain = +Inf"},
		{Pass{Bond: 4, Gain: -1}, "Gain = -1"},
		{Pass{Bond: 4, Update: 3}, "Update = 3"},
		{Pass{Bond: 4, Update: OneSite, Perturbation: 1e-3}, "density matrix of two sites"},
	} {
		_, err := Ground(context.Background(), heisenberg(t, 4), ladder.Sector{"Sz": 0}, Options{Bond: 10, Schedule: []Pass{{Bond: 4}, row.pass}})
		require.ErrorContains(t, err, "dmrg: option Schedule, pass 1: ")
		require.ErrorContains(t, err, row.want)
	}
}
