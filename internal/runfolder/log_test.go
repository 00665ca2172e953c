package runfolder

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

func TestLog(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "vortex.run")
	sweeps, err := ReadLog(dir)
	require.NoError(t, err)
	assert.Empty(t, sweeps)
	f, err := Open(dir, model, Options{})
	require.NoError(t, err)
	first := Sweep{Sector: Numbers{"N": 4}, Sweep: 1, Energy: -1.5, LargestBond: 10, Seconds: 0.1}
	second := Sweep{State: 1, Stage: 2, Sweep: 2, Energy: -1.6, DiscardedWeight: 1e-9, LargestBond: 20, Note: "grown"}
	require.NoError(t, f.Log(first))
	assert.ErrorContains(t, f.Log(Sweep{Energy: math.NaN()}), "energy is NaN")
	require.NoError(t, f.Close())

	// A kill in the midst of a line, and another run that goes on.
	path := filepath.Join(dir, LogFile)
	for _, half := range []string{`{"state":0,"swe`, strings.Repeat("x", 10000)} {
		file, err := os.OpenFile(path, os.O_APPEND|os.O_WRONLY, 0)
		require.NoError(t, err)
		_, err = file.WriteString(half)
		require.NoError(t, err)
		require.NoError(t, file.Close())
		sweeps, err = ReadLog(dir)
		require.NoError(t, err)
		assert.Equal(t, first, sweeps[0])
		f = open(t, dir, model, Options{})
		require.NoError(t, f.Log(second))
		require.NoError(t, f.Close())
	}
	sweeps, err = ReadLog(dir)
	require.NoError(t, err)
	assert.Equal(t, []Sweep{first, second, second}, sweeps)

	require.NoError(t, os.WriteFile(path, []byte("one\n{}\n"), 0o600))
	_, err = ReadLog(dir)
	assert.ErrorContains(t, err, "log.jsonl:1 is damaged")
}

func TestLogWithoutALine(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "vortex.run")
	f := open(t, dir, model, Options{})
	require.NoError(t, os.WriteFile(filepath.Join(dir, LogFile), []byte(strings.Repeat("half", 3000)), 0o600))
	require.NoError(t, f.Log(Sweep{Sweep: 1}))
	sweeps, err := ReadLog(dir)
	require.NoError(t, err)
	assert.Equal(t, []Sweep{{Sweep: 1}}, sweeps)
}

func TestStatus(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "vortex.run")
	f := open(t, dir, Origin{Text: model.Text, Hash: "4f2a", Settings: map[string]string{"start": "old.run"}}, Options{})
	energy := -3.25
	require.NoError(t, f.SetStatus(Status{Phase: Running, Sweep: 3, Energy: &energy, Sector: Numbers{"N": 4}, Hash: "ignored"}))
	s, err := ReadStatus(dir)
	require.NoError(t, err)
	assert.Equal(t, "4f2a", s.Hash)
	assert.Equal(t, map[string]string{"start": "old.run"}, s.Settings)
	assert.Equal(t, Running, s.Phase)
	assert.Equal(t, energy, *s.Energy)
	assert.False(t, s.Updated.Before(s.Started))
	energy = math.Inf(1)
	assert.ErrorContains(t, f.SetStatus(Status{Energy: &energy}), "energy is +Inf")
	again, err := ReadStatus(dir)
	require.NoError(t, err)
	assert.Equal(t, s, again)
}

// TestKeepLog: of a log the first sweeps stay, whatever follows them; what is appended afterwards comes after them.
func TestKeepLog(t *testing.T) {
	f := open(t, filepath.Join(t.TempDir(), "a.run"), model, Options{})
	require.NoError(t, f.KeepLog(3), "no log at all")
	for n := 1; n <= 5; n++ {
		require.NoError(t, f.Log(Sweep{Sweep: n}))
	}
	sweeps := func() (all []int) {
		lines, err := ReadLog(f.Dir())
		require.NoError(t, err)
		for _, s := range lines {
			all = append(all, s.Sweep)
		}
		return all
	}
	require.NoError(t, f.KeepLog(9))
	require.Equal(t, []int{1, 2, 3, 4, 5}, sweeps())
	require.NoError(t, f.KeepLog(3))
	require.NoError(t, f.Log(Sweep{Sweep: 4, Note: "again"}))
	require.Equal(t, []int{1, 2, 3, 4}, sweeps())
	file, err := os.OpenFile(filepath.Join(f.Dir(), LogFile), os.O_APPEND|os.O_WRONLY, 0)
	require.NoError(t, err)
	_, err = file.WriteString("no JSON\n{\"sweep\":2")
	require.NoError(t, err)
	require.NoError(t, file.Close())
	require.NoError(t, f.KeepLog(4))
	require.Equal(t, []int{1, 2, 3, 4}, sweeps())
}
