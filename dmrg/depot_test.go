package dmrg

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/mpo/ladder"
	"rundle/mps/block"
)

// filesIn counts the files below a folder.
func filesIn(t *testing.T, dir string) (n int) {
	t.Helper()
	require.NoError(t, filepath.WalkDir(dir, func(_ string, d os.DirEntry, err error) error {
		if err == nil && !d.IsDir() {
			n++
		}
		if errors.Is(err, fs.ErrNotExist) {
			return nil // not made yet, or gone already
		}
		return err
	}))
	return n
}

// TestDiskChangesNothing: with a cap that sends environments to disk a search ends with the same bits, also where it goes on from a waypoint; the
// disk is free afterwards.
func TestDiskChangesNothing(t *testing.T) {
	h, sector := disturbed(t)
	passes := []Pass{{Bond: 24, Perturbation: 1e-3}, {Bond: 48, Perturbation: 1e-4}, {Bond: 48}, {Bond: 48}}
	scratch := filepath.Join(t.TempDir(), "scratch")
	search := func(memory int64, from *Waypoint, o Options) *Result {
		o.Schedule, o.Memory, o.Scratch, o.Threads, o.From = passes, memory, scratch, 2, from
		return ground1(t, h, sector, o)
	}
	free := search(0, nil, Options{})
	need := leastMemory(t, h, sector, 48)
	files := 0
	var w *Waypoint
	capped := search(need, nil, Options{OnBond: func(Position) { files = max(files, filesIn(t, scratch)) }, WaypointEvery: 1, OnWaypoint: func(v *Waypoint) {
		if w == nil && v.Sweeps == 2 {
			w = saved(t, v)
		}
	}})
	require.Greater(t, files, 4, "environments went to disk")
	requireSameBits(t, free, capped, "with a cap")
	require.Zero(t, filesIn(t, scratch))
	requireSameBits(t, free, search(need, w, Options{}), "from a waypoint, with a cap")
}

// disturbed is a ladder that has no real form.
func disturbed(t *testing.T) (*ladder.Hamiltonian, ladder.Sector) {
	return hamiltonian(t, 12, ladder.Open, []ladder.Site{ladder.Fermion(), ladder.Fermion()},
		"-exp(0.3i) c^+[a,j+1] c[a,j] + h.c.", "-c^+[b,j+1] c[b,j] + h.c.", "-exp(0.1i*j) c^+[a,j] c[b,j] + h.c.", "n[a,j] n[b,j]", "0.4 n[a,j] n[a,j+1]"), ladder.Sector{"N": 12}
}

// leastMemory is a cap that just lets a search reach a bond dimension.
func leastMemory(t *testing.T, h *ladder.Hamiltonian, sector ladder.Sector, bond int) int64 {
	t.Helper()
	low, high := int64(1), int64(1<<30)
	passes := []Pass{{Bond: bond, Vectors: 1}}
	for high-low > high/20 {
		mid := (low + high) / 2
		if ground1(t, h, sector, Options{Schedule: passes, Memory: mid}).Verdict == MemoryCap {
			low = mid
		} else {
			high = mid
		}
	}
	return high
}

// TestCapOnMemoryIsKept counts, after every update, what an engine holds: environments, site tensors, and the work of the update.
func TestCapOnMemoryIsKept(t *testing.T) {
	h, sector := heisenberg(t, 60), ladder.Sector{"Sz": 0}
	set := setting{bond: 40, vectors: 2, tolerance: 1}
	e := randomEngine[float64](t, h, sector, 40)
	for range 2 {
		_, err := e.sweep(set)
		require.NoError(t, err)
	}
	free := e.psi
	f := (&search[float64]{engine: e}).present()
	for _, share := range []float64{0, 0.4, 0.8} {
		memory := f.least() + share*(f.whole()-f.least())
		e := randomEngine[float64](t, h, sector, 40)
		e.memory, e.envs.depot = int64(memory), &depot{parent: t.TempDir()}
		peak := 0.0
		e.onBond = func(p Position) {
			a, b := e.psi.Sites[p.Bond], e.psi.Sites[p.Bond+1]
			theta := block.NewStructure(a.Group, []block.Axis{a.Axes[0], a.Axes[1], b.Axes[1], b.Axes[2]}, block.Charge{}).Size
			held := e.envs.held() - spareOf(e) + theta*workspaces(e.op, p.Bond)
			for _, a := range e.psi.Sites {
				held += len(a.Data)
			}
			if p.Sweep > 1 { // the engine was made without a cap
				peak = max(peak, 8*float64(held))
			}
		}
		for range 2 {
			_, err := e.sweep(set)
			require.NoError(t, err)
		}
		for i, a := range free.Sites {
			require.Equal(t, a.Data, e.psi.Sites[i].Data, "the disk changes nothing")
		}
		require.LessOrEqual(t, peak, memory)
		require.Greater(t, peak, 0.6*memory, "a cap that leaves much unused reads and writes too much")
		require.Greater(t, e.envs.depot.files, 10)
		t.Logf("a cap of %.2f of the whole, %.2f MiB: peak %.2f of the cap, %d files written", memory/f.whole(), f.whole()/(1<<20), peak/memory, e.envs.depot.files)
		e.envs.depot.remove()
	}
}

// spareOf counts the elements of free slabs, which an update takes or gives up.
func spareOf[T dense.Scalar](e *engine[T]) (n int) {
	for _, slab := range e.envs.spare {
		n += cap(slab)
	}
	return n
}

// TestDiskTrouble: a disk that does not take environments, or gives others back, ends the search with an error that says where and what to do.
func TestDiskTrouble(t *testing.T) {
	h, sector := disturbed(t)
	passes := []Pass{{Bond: 48, Perturbation: 1e-3}, {Bond: 48}}
	memory := leastMemory(t, h, sector, 48)
	occupied := filepath.Join(t.TempDir(), "file")
	require.NoError(t, os.WriteFile(occupied, nil, 0o600))
	_, err := Ground(t.Context(), h, sector, Options{Schedule: passes, Memory: memory, Scratch: occupied})
	require.ErrorContains(t, err, occupied)
	require.ErrorContains(t, err, "make room there")

	for name, spoil := range map[string]func(path string) error{
		"other bytes": func(path string) error { return os.WriteFile(path, make([]byte, 1<<16), 0o600) },
		"EOF":         func(path string) error { return os.Truncate(path, 0) },
		"no such":     os.Remove,
	} {
		scratch := t.TempDir()
		_, err = Ground(t.Context(), h, sector, Options{Schedule: passes, Memory: memory, Scratch: scratch, OnBond: func(p Position) {
			if p.Sweep == 2 && p.Done == 16 {
				require.Greater(t, filesIn(t, scratch), 3)
				require.NoError(t, filepath.WalkDir(scratch, func(path string, d os.DirEntry, err error) error {
					if err == nil && !d.IsDir() {
						err = spoil(path)
					}
					return err
				}))
			}
		}})
		require.ErrorContains(t, err, "environments beyond the cap on memory", name)
		require.ErrorContains(t, err, scratch)
		require.Zero(t, filesIn(t, scratch))
	}
}
