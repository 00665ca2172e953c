package solve

import (
	"context"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/internal/modelfile"
	"rundle/internal/runfolder"
	"rundle/mps"
)

// hoppingLevels are energies of n free fermions on an open chain: sums of -2 cos(pi k/(sites+1)) (common practice).
func hoppingLevels(sites, n int) (all []float64) {
	var fill func(from, left int, sum float64)
	fill = func(from, left int, sum float64) {
		if left == 0 {
			all = append(all, sum)
			return
		}
		for k := from; k <= sites; k++ {
			fill(k+1, left-1, sum-2*math.Cos(math.Pi*float64(k)/float64(sites+1)))
		}
	}
	fill(1, n, 0)
	slices.Sort(all)
	return all
}

func severalStates(t *testing.T, states int) *modelfile.Model {
	return parse(t, strings.Replace(fmt.Sprintf(hopping, 8, 4, 1e-8), "[solve]", fmt.Sprintf("[solve]\nstates = %d", states), 1))
}

// TestSeveralStates: energies, gaps and multiplets in the result, a saved and observed state each.
func TestSeveralStates(t *testing.T) {
	m := severalStates(t, 3)
	dir := filepath.Join(t.TempDir(), "a.run")
	r := solved(t, m, Options{Dir: dir}).Result
	want := hoppingLevels(8, 4)
	require.GreaterOrEqual(t, len(r.States), 3)
	require.Greater(t, want[len(r.States)]-want[len(r.States)-1], 1e-6, "the last multiplet is whole")
	for k, s := range r.States {
		assert.Equal(t, k, s.Index)
		assert.Equal(t, runfolder.Converged, s.Verdict, s.Reason)
		assert.LessOrEqual(t, math.Abs(s.EnergyLimit-want[k]), s.EnergyError)
		assert.LessOrEqual(t, math.Abs(*s.Gap-(want[k]-want[0])), *s.GapError+1e-14)
		psi, err := mps.Load(runfolder.StatePath(dir, k))
		require.NoError(t, err)
		assert.InDelta(t, 1, psi.Norm(), 1e-12)
		total := 0.0
		for _, o := range s.Observations["density"] {
			total += o.Value.Re
		}
		assert.InDelta(t, 4, total, 1e-9)
		assert.NotNil(t, s.Entanglement)
	}
	count := 0
	for i, p := range r.Multiplets {
		assert.Equal(t, count, p.First)
		count += p.Count
		assert.Equal(t, p.Count > 1, p.Observations != nil)
		for _, s := range r.States[p.First : p.First+p.Count] {
			assert.Equal(t, i, s.Multiplet)
		}
	}
	assert.Equal(t, len(r.States), count)
	assert.NoDirExists(t, filepath.Join(dir, runfolder.CheckpointName))
	assert.True(t, solved(t, m, Options{Dir: dir}).Returned)
	again, _, err := Read(context.Background(), dir, ReadOptions{})
	require.NoError(t, err)
	assert.Len(t, again.States, len(r.States))
	text, err := os.ReadFile(filepath.Join(dir, runfolder.LogFile))
	require.NoError(t, err)
	for k := range r.States {
		assert.Contains(t, string(text), fmt.Sprintf(`"state":%d,`, k), "sweeps of level %d in the log", k)
	}
}

// TestSeveralStatesGoOn: a run that is stopped between levels, or within one, goes on from the states it had.
func TestSeveralStatesGoOn(t *testing.T) {
	m := severalStates(t, 3)
	dir := filepath.Join(t.TempDir(), "a.run")
	ctx, stop := context.WithCancel(context.Background())
	defer stop()
	out, err := Run(ctx, m, Options{Dir: dir, OnProgress: func(p Progress) {
		if p.Sweep == 14 {
			stop()
		}
	}})
	require.NoError(t, err)
	require.True(t, out.Stopped)
	require.FileExists(t, filepath.Join(dir, runfolder.CheckpointName, "level-0.npz"))
	again := solved(t, m, Options{Dir: dir})
	assert.True(t, again.Resumed)
	want := hoppingLevels(8, 4)
	for k, s := range again.Result.States {
		assert.LessOrEqual(t, math.Abs(s.EnergyLimit-want[k]), s.EnergyError)
	}
	log, err := runfolder.ReadLog(dir)
	require.NoError(t, err)
	for i, line := range log {
		if line.Note == "" {
			assert.Equal(t, i+1, line.Sweep)
		}
	}
}
