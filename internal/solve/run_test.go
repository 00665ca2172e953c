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

	"rundle/dmrg"
	"rundle/internal/exact"
	"rundle/internal/modelfile"
	"rundle/internal/runfolder"
)

// hopping is an open chain of free fermions.
const hopping = `
title = "hopping"
[ladder]
rungs = %d
[[leg]]
name = "a"
site = "fermion"
[constants]
t = 1.0
[[term]]
formula = "-t c^+[a,j+1] c[a,j] + h.c."
[sector]
N = %d
[solve]
precision = %g
[[observe]]
name    = "density"
formula = "n[a,j]"
[[observe]]
name    = "current"
formula = "i*t*(c^+[a,j+1] c[a,j] - h.c.)"
[[observe]]
name = "coherence"
kind = "correlations"
of   = ["c^+[a,j]", "c[a,j]"]
[[observe]]
name = "charge"
kind = "correlations"
of   = ["n[a,j]", "n[a,j]"]
connected = true
`

func parse(t *testing.T, text string) *modelfile.Model {
	t.Helper()
	m, err := modelfile.Parse("model.toml", []byte(text))
	require.NoError(t, err)
	return m
}

func chain(t *testing.T, rungs, particles int, precision float64) *modelfile.Model {
	return parse(t, fmt.Sprintf(hopping, rungs, particles, precision))
}

// filled returns energy and one-body matrix <c^+_x c_y> of n free fermions on l open sites: E = -2 sum_k cos(pi k/(l+1)), orbitals
// sqrt(2/(l+1)) sin(pi k x/(l+1)), x from 1 (common practice).
func filled(l, n int) (energy float64, g [][]float64) {
	step := math.Pi / float64(l+1)
	g = make([][]float64, l)
	for x := range g {
		g[x] = make([]float64, l)
		for y := range g[x] {
			for k := 1; k <= n; k++ {
				g[x][y] += 2 / float64(l+1) * math.Sin(step*float64(k*(x+1))) * math.Sin(step*float64(k*(y+1)))
			}
		}
	}
	for k := 1; k <= n; k++ {
		energy -= 2 * math.Cos(step*float64(k))
	}
	return energy, g
}

func solved(t *testing.T, m *modelfile.Model, opt Options) *Outcome {
	t.Helper()
	out, err := Run(context.Background(), m, opt)
	require.NoError(t, err)
	require.NotNil(t, out.Result)
	return out
}

// TestFreeFermions holds energies, values, forms and error bars against the exact ones.
func TestFreeFermions(t *testing.T) {
	covered, all := 0, 0
	var ratios []float64 // of the errors quoted to the true ones
	for _, c := range []struct {
		l, n      int
		precision float64
	}{{8, 4, 1e-8}, {12, 5, 1e-5}, {16, 8, 1e-4}, {20, 7, 1e-7}} {
		t.Run(fmt.Sprintf("sites=%d/particles=%d/precision=%g", c.l, c.n, c.precision), func(t *testing.T) {
			out := solved(t, chain(t, c.l, c.n, c.precision), Options{Dir: filepath.Join(t.TempDir(), "a.run"), Version: "test"})
			r := out.Result
			s := r.States[0]
			energy, g := filled(c.l, c.n)
			assert.Equal(t, runfolder.Converged, s.Verdict)
			assert.LessOrEqual(t, s.EnergyError, c.precision)
			assert.InDelta(t, energy, s.EnergyLimit, c.precision)
			assert.Equal(t, runfolder.Numbers{"N": float64(c.n)}, s.Sector)
			require.NotNil(t, s.Variance)
			assert.Less(t, *s.Variance, 100*c.precision)
			assert.Nil(t, s.TopOccupation)
			assert.Equal(t, runfolder.Real, r.Model.Arithmetic)
			assert.Equal(t, c.l, r.Model.Sites)
			assert.Len(t, r.Model.MPOBonds, c.l+1)
			require.Len(t, s.Entanglement.Cuts, c.l-1)
			held := entropiesHold(t, c.l, c.n, s.Entanglement)
			assert.GreaterOrEqual(t, held, 0.8, "part of the entropies whose error bar holds")

			check := func(o runfolder.Observation, want float64) {
				all++
				wrong := math.Abs(o.Value.Re - want)
				if wrong <= o.Error {
					covered++
				}
				ratios = append(ratios, o.Error/max(wrong, 1e-15))
				assert.InDelta(t, want, o.Value.Re, 0.1*math.Sqrt(c.precision), "%v", o.At)
				assert.Less(t, o.Error, math.Sqrt(c.precision), "%v", o.At)
			}
			require.Len(t, s.Observations["density"], c.l)
			for x, o := range s.Observations["density"] {
				assert.Equal(t, runfolder.At{"j": x}, o.At)
				check(o, g[x][x])
			}
			for _, o := range s.Observations["current"] {
				assert.False(t, o.Value.Complex)
				assert.Zero(t, o.Value.Re)
			}
			require.Len(t, s.Observations["coherence"], c.l*c.l)
			for i, o := range s.Observations["coherence"] {
				x, y := i/c.l, i%c.l
				assert.Equal(t, runfolder.At{"j": x, "j'": y}, o.At)
				assert.True(t, o.Value.Complex)
				check(o, g[x][y])
			}
			for i, o := range s.Observations["charge"] {
				x, y := i/c.l, i%c.l
				want := -g[x][y] * g[x][y]
				if x == y {
					want += g[x][x]
				}
				assert.False(t, o.Value.Complex)
				check(o, want)
			}
		})
	}
	assert.GreaterOrEqual(t, float64(covered), 0.95*float64(all), "of %d error bars %d cover the exact value", all, covered)
	slices.Sort(ratios)
	t.Logf("%d of %d error bars cover the exact value; the median error quoted is %.0f times the true one", covered, all, ratios[all/2])
}

// entropiesHold is the part of the cuts whose entropy is as near the exact one as it says, and says so to better than a per cent.
func entropiesHold(t *testing.T, l, n int, e *runfolder.Entanglement) float64 {
	q := exact.NewQuadratic(l)
	for j := range l - 1 {
		q.Hop(j+1, j, -1)
	}
	g, err := q.Filled(n)
	require.NoError(t, err)
	held := 0
	var modes []int
	for i, cut := range e.Cuts {
		modes = append(modes, i)
		want, err := g.Entropy(modes)
		require.NoError(t, err)
		if math.Abs(cut.Entropy-want) <= cut.EntropyError && cut.EntropyError < 0.01 {
			held++
		}
	}
	return float64(held) / float64(len(e.Cuts))
}

// TestReturned: a finished run is returned as it is.
func TestReturned(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "a.run")
	m := chain(t, 6, 3, 1e-8)
	first := solved(t, m, Options{Dir: dir})
	assert.False(t, first.Returned)
	before, err := os.ReadFile(filepath.Join(dir, runfolder.ResultFile))
	require.NoError(t, err)
	again := solved(t, parse(t, "# a comment changes nothing\n"+string(m.Source)), Options{Dir: dir})
	assert.True(t, again.Returned)
	assert.Equal(t, first.Result.States, again.Result.States)
	after, err := os.ReadFile(filepath.Join(dir, runfolder.ResultFile))
	require.NoError(t, err)
	assert.Equal(t, before, after)
	assert.NoDirExists(t, filepath.Join(dir, runfolder.CheckpointName))

	_, err = Run(context.Background(), chain(t, 7, 3, 1e-8), Options{Dir: dir})
	assert.True(t, isRefusal(err))
	assert.ErrorContains(t, err, "there rungs = 6, here rungs = 7")

	var notes []string
	fresh := solved(t, m, Options{Dir: dir, Fresh: true, OnNote: func(s string) { notes = append(notes, s) }})
	assert.False(t, fresh.Returned)
	assert.Equal(t, filepath.Join(filepath.Dir(dir), "a.old-1.run"), fresh.Moved)
	assert.Equal(t, []string{"the run that was there is now " + fresh.Moved}, notes)
}

// TestResume stops a run again and again after a few sweeps; the last call ends with what an undisturbed run finds.
func TestResume(t *testing.T) {
	m := chain(t, 12, 5, 1e-7)
	dir := filepath.Join(t.TempDir(), "a.run")
	calls, sweeps := 0, 0
	var out *Outcome
	for {
		calls++
		require.Less(t, calls, 50)
		ctx, stop := context.WithCancel(context.Background())
		first := 0
		var notes []string
		var err error
		out, err = Run(ctx, m, Options{Dir: dir, OnNote: func(s string) { notes = append(notes, s) }, OnProgress: func(p Progress) {
			if p.Phase == Sweeping && first == 0 {
				first = p.Sweep
				assert.Equal(t, sweeps+1, p.Sweep, "numbers of sweeps go on")
			}
			if calls < 4 && p.Phase == Sweeping && p.Sweep == first+calls && p.Done == 3 {
				stop()
			}
		}})
		stop()
		require.NoError(t, err)
		assert.Equal(t, calls > 1, out.Resumed)
		if out.Resumed {
			assert.Equal(t, []string{fmt.Sprintf("going on from the checkpoint after %d sweeps", sweeps)}, notes)
		}
		status, err := runfolder.ReadStatus(dir)
		require.NoError(t, err)
		if !out.Stopped {
			assert.Equal(t, runfolder.Done, status.Phase)
			break
		}
		assert.Equal(t, runfolder.Stopped, status.Phase)
		assert.FileExists(t, filepath.Join(dir, runfolder.CheckpointName, fmt.Sprintf(pointName, calls)))
		assert.NoFileExists(t, filepath.Join(dir, runfolder.ResultFile))
		assert.Equal(t, sweeps+calls, status.Sweep)
		sweeps = status.Sweep
	}
	assert.Equal(t, 4, calls)
	energy, _ := filled(12, 5)
	s := out.Result.States[0]
	assert.Equal(t, runfolder.Converged, s.Verdict)
	assert.InDelta(t, energy, s.EnergyLimit, 1e-7)
	assert.Greater(t, s.Sweeps, sweeps)
	log, err := runfolder.ReadLog(dir)
	require.NoError(t, err)
	for i, line := range log {
		assert.Equal(t, i+1, line.Sweep)
	}
	assert.Len(t, log, s.Sweeps)
	whole := solved(t, m, Options{Dir: filepath.Join(t.TempDir(), "b.run")}).Result.States
	whole[0].Seconds, out.Result.States[0].Seconds = 0, 0
	assert.Equal(t, whole, out.Result.States, "the same bits as an undisturbed run's, error bars included")
}

// TestStoppedEarly: a context that ended before the search leaves nothing to go on from, and nothing broken.
func TestStoppedEarly(t *testing.T) {
	m := chain(t, 6, 3, 1e-8)
	dir := filepath.Join(t.TempDir(), "a.run")
	ctx, stop := context.WithCancel(context.Background())
	stop()
	out, err := Run(ctx, m, Options{Dir: dir})
	require.NoError(t, err)
	assert.True(t, out.Stopped)
	assert.False(t, solved(t, m, Options{Dir: dir}).Resumed)
}

// TestStoppedObserving: a signal during the observations costs no more than them.
func TestStoppedObserving(t *testing.T) {
	m := chain(t, 8, 4, 1e-8)
	dir := filepath.Join(t.TempDir(), "a.run")
	ctx, stop := context.WithCancel(context.Background())
	defer stop()
	out, err := Run(ctx, m, Options{Dir: dir, OnProgress: func(p Progress) {
		if p.Phase == Observing {
			stop()
		}
	}})
	require.NoError(t, err)
	assert.True(t, out.Stopped)
	assert.NoFileExists(t, filepath.Join(dir, runfolder.ResultFile))
	again := solved(t, m, Options{Dir: dir})
	assert.True(t, again.Resumed)
	energy, _ := filled(8, 4)
	assert.InDelta(t, energy, again.Result.States[0].Energy, 1e-8)
}

// TestDamagedCheckpoint: of checkpoints that cannot be read the one before serves, and it is told; foreign ones are refused.
func TestDamagedCheckpoint(t *testing.T) {
	m := chain(t, 10, 5, 1e-7)
	whole := solved(t, m, Options{Dir: filepath.Join(t.TempDir(), "a.run")}).Result.States[0]
	stopped := func(t *testing.T) string {
		dir := filepath.Join(t.TempDir(), "a.run")
		ctx, stop := context.WithCancel(context.Background())
		defer stop()
		out, err := Run(ctx, m, Options{Dir: dir, CheckpointEvery: 1, OnProgress: func(p Progress) {
			if p.Sweep == 6 {
				stop()
			}
		}})
		require.NoError(t, err)
		require.True(t, out.Stopped)
		return dir
	}
	points := func(t *testing.T, dir string) []string {
		paths, err := filepath.Glob(filepath.Join(dir, runfolder.CheckpointName, "point-*.npz"))
		require.NoError(t, err)
		require.Len(t, paths, keptPoints)
		slices.SortStableFunc(paths, func(a, b string) int { return len(a) - len(b) }) // 99 comes before 100
		return paths
	}
	spoil := func(t *testing.T, paths ...string) {
		for _, path := range paths {
			text, err := os.ReadFile(path)
			require.NoError(t, err)
			for i := range 256 { // more than what may lie unused between two arrays
				text[len(text)/2+i] ^= 1
			}
			require.NoError(t, os.WriteFile(path, text, 0o600))
		}
	}
	again := func(t *testing.T, dir string, resumed bool, note string) {
		var notes []string
		out := solved(t, m, Options{Dir: dir, OnNote: func(s string) { notes = append(notes, s) }})
		assert.Equal(t, resumed, out.Resumed)
		assert.Contains(t, strings.Join(notes, "\n"), note)
		assert.Equal(t, whole.Energy, out.Result.States[0].Energy)
		log, err := runfolder.ReadLog(dir)
		require.NoError(t, err)
		assert.Len(t, log, whole.Sweeps)
	}
	t.Run("the newest", func(t *testing.T) {
		dir := stopped(t)
		paths := points(t, dir)
		spoil(t, paths[1])
		again(t, dir, true, filepath.Base(paths[1]))
	})
	t.Run("a half", func(t *testing.T) {
		dir := stopped(t)
		paths := points(t, dir)
		require.NoError(t, os.Truncate(paths[1], 1000))
		again(t, dir, true, filepath.Base(paths[1]))
	})
	t.Run("all", func(t *testing.T) {
		dir := stopped(t)
		spoil(t, points(t, dir)...)
		again(t, dir, false, "the search begins anew")
	})
	refusal := func(t *testing.T, dir, want string) {
		_, err := Run(context.Background(), m, Options{Dir: dir})
		assert.True(t, isRefusal(err), "%v", err)
		assert.ErrorContains(t, err, want)
		assert.ErrorContains(t, err, "--fresh")
	}
	t.Run("of another format", func(t *testing.T) {
		dir := stopped(t)
		paths := points(t, dir)
		require.NoError(t, os.Remove(paths[0]))
		w, note, err := dmrg.LoadWaypoint(paths[1])
		require.NoError(t, err)
		require.NoError(t, w.Save(paths[1], strings.Replace(note, progressFormat, "rundle-checkpoint/7", 1)))
		refusal(t, dir, `"rundle-checkpoint/7"`)
	})
	t.Run("of another model", func(t *testing.T) {
		dir := stopped(t)
		paths := points(t, dir)
		w, note, err := dmrg.LoadWaypoint(paths[1])
		require.NoError(t, err)
		require.NoError(t, w.Save(paths[1], strings.Replace(note, m.Hash, strings.Repeat("0", len(m.Hash)), 1)))
		refusal(t, dir, "of the model 000000")
	})
	t.Run("of the format before", func(t *testing.T) {
		dir := stopped(t)
		for _, path := range points(t, dir) {
			require.NoError(t, os.Remove(path))
		}
		require.NoError(t, os.WriteFile(filepath.Join(dir, runfolder.CheckpointName, oldProgressFile), []byte("{}"), 0o600))
		refusal(t, dir, "format before")
	})
}

// TestLogOfAKilledRun: sweeps after the checkpoint are done again, and the log tells each of them once.
func TestLogOfAKilledRun(t *testing.T) {
	m := chain(t, 10, 5, 1e-7)
	dir := filepath.Join(t.TempDir(), "a.run")
	ctx, stop := context.WithCancel(context.Background())
	defer stop()
	_, err := Run(ctx, m, Options{Dir: dir, OnProgress: func(p Progress) {
		if p.Sweep == 6 {
			stop()
		}
	}})
	require.NoError(t, err)
	log := filepath.Join(dir, runfolder.LogFile)
	text, err := os.ReadFile(log)
	require.NoError(t, err)
	text = append(text, strings.Replace(string(text[:strings.IndexByte(string(text), '\n')+1]), `"sweep":1,`, `"sweep":6,`, 1)+`{"state":0,"swe`...)
	require.NoError(t, os.WriteFile(log, text, 0o600))
	out := solved(t, m, Options{Dir: dir})
	lines, err := runfolder.ReadLog(dir)
	require.NoError(t, err)
	for i, line := range lines {
		assert.Equal(t, i+1, line.Sweep)
	}
	assert.Len(t, lines, out.Result.States[0].Sweeps)
}

// TestLimits: a run that met its cap on time goes on; one that met its cap on memory goes on when it is given more.
func TestLimits(t *testing.T) {
	m := chain(t, 10, 5, 1e-9)
	m.Solve.Time = 1
	dir := filepath.Join(t.TempDir(), "a.run")
	first := solved(t, m, Options{Dir: dir})
	assert.True(t, first.Limited())
	s := first.Result.States[0]
	energy, g := filled(10, 5)
	assert.GreaterOrEqual(t, s.EnergyError, math.Abs(s.EnergyLimit-energy), "nothing is known but the norm of the Hamiltonian")
	for x, o := range s.Observations["density"] {
		assert.LessOrEqual(t, math.Abs(o.Value.Re-g[x][x]), o.Error)
	}
	again := solved(t, m, Options{Dir: dir})
	assert.True(t, again.Resumed)
	assert.GreaterOrEqual(t, again.Result.States[0].Sweeps, s.Sweeps)

	m.Solve.Time = 0
	free := solved(t, m, Options{Dir: dir})
	assert.Equal(t, runfolder.Converged, free.Result.States[0].Verdict)
	assert.InDelta(t, energy, free.Result.States[0].Energy, 1e-9)
	assert.NoDirExists(t, filepath.Join(dir, runfolder.CheckpointName))

	wide := chain(t, 16, 8, 1e-9)
	dir = filepath.Join(t.TempDir(), "b.run")
	capped := solved(t, wide, Options{Dir: dir, Memory: 200_000})
	assert.Equal(t, runfolder.MemoryCap, capped.Result.States[0].Verdict)
	assert.True(t, solved(t, wide, Options{Dir: dir, Memory: 200_000}).Returned)
	assert.True(t, solved(t, wide, Options{Dir: dir, Memory: 100_000}).Returned)
	more := solved(t, wide, Options{Dir: dir})
	assert.True(t, more.Resumed)
	assert.Equal(t, runfolder.Converged, more.Result.States[0].Verdict)
}

func TestSweepCap(t *testing.T) {
	m := parse(t, strings.Replace(fmt.Sprintf(hopping, 8, 4, 1e-9), "[solve]", "[solve]\nsweeps = 1", 1))
	s := solved(t, m, Options{Dir: filepath.Join(t.TempDir(), "a.run")}).Result.States[0]
	assert.Equal(t, runfolder.SweepCap, s.Verdict)
	assert.Equal(t, 1, s.Sweeps)
	energy, _ := filled(8, 4)
	assert.GreaterOrEqual(t, s.EnergyError, math.Abs(s.EnergyLimit-energy))
}

// TestFreeCharge: a charge that the sector leaves free is found, reported, and kept when the run goes on.
func TestFreeCharge(t *testing.T) {
	m := parse(t, strings.Replace(fmt.Sprintf(hopping, 6, 3, 1e-8), "N = 3", "", 1))
	s := solved(t, m, Options{Dir: filepath.Join(t.TempDir(), "a.run")}).Result.States[0]
	assert.Equal(t, runfolder.Numbers{"N": 3}, s.Sector)
}

func TestStart(t *testing.T) {
	folder := t.TempDir()
	a, b := filepath.Join(folder, "a.run"), filepath.Join(folder, "b.run")
	solved(t, chain(t, 8, 4, 1e-8), Options{Dir: a})
	next := parse(t, strings.Replace(fmt.Sprintf(hopping, 8, 4, 1e-8), "t = 1.0", "t = 2.0", 1))
	out := solved(t, next, Options{Dir: b, StartDir: a})
	energy, _ := filled(8, 4)
	assert.InDelta(t, 2*energy, out.Result.States[0].Energy, 1e-8)
	assert.NotEqual(t, next.Hash, out.Result.Model.Hash)
	assert.True(t, solved(t, next, Options{Dir: b, StartDir: a}).Returned)

	for _, c := range []struct {
		name string
		m    *modelfile.Model
		opt  Options
		want string
	}{
		{"other start", next, Options{Dir: b}, `start: there "`},
		{"absent", next, Options{Dir: filepath.Join(folder, "c.run"), StartDir: folder}, "no state-0.npz in it"},
		{"other ladder", chain(t, 9, 4, 1e-8), Options{Dir: filepath.Join(folder, "d.run"), StartDir: a}, "8 sites"},
		{"other sector", chain(t, 8, 3, 1e-8), Options{Dir: filepath.Join(folder, "e.run"), StartDir: a}, "start state"},
		{"threads", next, Options{Threads: -1}, "threads -1"},
		{"memory", next, Options{Memory: -1}, "memory of -1 bytes"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := Run(context.Background(), c.m, c.opt)
			assert.True(t, isRefusal(err), "%v", err)
			assert.ErrorContains(t, err, c.want)
		})
	}
}

// TestThreads: the results are bitwise the same at any number of threads.
func TestThreads(t *testing.T) {
	m := chain(t, 12, 6, 1e-7)
	one := solved(t, m, Options{Dir: filepath.Join(t.TempDir(), "1.run"), Threads: 1}).Result.States
	three := solved(t, m, Options{Dir: filepath.Join(t.TempDir(), "3.run"), Threads: 3}).Result.States
	one[0].Seconds, three[0].Seconds = 0, 0
	assert.Equal(t, one, three)
}

// TestUnwritable: a folder that stops taking files ends the search with a Refusal, not with a wrong result.
func TestUnwritable(t *testing.T) {
	m := chain(t, 10, 5, 1e-8)
	dir := filepath.Join(t.TempDir(), "a.run")
	_, err := Run(context.Background(), m, Options{Dir: dir, OnProgress: func(p Progress) {
		if p.Sweep == 2 && p.Done == 1 {
			// Something else stands where the checkpoint should be.
			require.NoError(t, os.WriteFile(filepath.Join(dir, runfolder.CheckpointName), nil, 0o600))
		}
	}})
	assert.True(t, isRefusal(err), "%v", err)
	assert.ErrorContains(t, err, dir)
	assert.ErrorContains(t, err, "intact")
	assert.NoFileExists(t, filepath.Join(dir, runfolder.ResultFile))
	status, err := runfolder.ReadStatus(dir)
	require.NoError(t, err)
	assert.Equal(t, runfolder.Failed, status.Phase)
}
