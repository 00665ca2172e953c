package dmrg

import (
	"context"
	"math"
	"testing"
	"time"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

func TestCancelledBefore(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	r, err := Ground(ctx, heisenberg(t, 8), ladder.Sector{"Sz": 0}, Options{})
	require.ErrorIs(t, err, context.Canceled)
	require.Nil(t, r)
}

// TestCancelledWithin ends a search at an update in the middle of a sweep: the result holds a valid state from which another goes on.
func TestCancelledWithin(t *testing.T) {
	h := heisenberg(t, 20)
	want, err := exact.HeisenbergChain(20, 10)
	require.NoError(t, err)
	for _, at := range []int{1, 19, 25, 100} {
		ctx, cancel := context.WithCancel(context.Background())
		updates := 0
		r, err := Ground(ctx, h, ladder.Sector{"Sz": 0}, Options{OnBond: func(Position) {
			if updates++; updates == at {
				cancel()
			}
		}})
		cancel()
		require.ErrorIs(t, err, context.Canceled)
		require.Equal(t, at, updates, "no update after the end")
		require.Empty(t, r.Verdict)
		require.True(t, math.IsNaN(r.Energy))
		require.Len(t, r.Sweeps, at/38, "whole sweeps alone")
		require.InDelta(t, 1, r.State.Norm(), 1e-12)
		next := ground1(t, h, nil, Options{Start: r.State, Precision: 1e-6})
		require.Equal(t, Converged, next.Verdict)
		requireHonest(t, next, want)
	}
}

// TestStopsWithinASecond: the deadline falls into updates that take long; those are given up. (The bound is that of the conventions.)
func TestStopsWithinASecond(t *testing.T) {
	h := hamiltonian(t, 20, ladder.Open, []ladder.Site{ladder.Boson(2), ladder.Boson(2)}, fluxTerms...)
	ctx, cancel := context.WithTimeout(context.Background(), 300*time.Millisecond)
	defer cancel()
	begin := time.Now()
	r, err := Ground(ctx, h, ladder.Sector{"N": 20}, Options{Precision: 1e-12})
	require.ErrorIs(t, err, context.DeadlineExceeded)
	require.Less(t, time.Since(begin), 1300*time.Millisecond)
	require.InDelta(t, 1, r.State.Norm(), 1e-12)
}

// TestHaltGivesUpTheUpdate stops the eigensolver between two products: neither chain nor environments may have changed.
func TestHaltGivesUpTheUpdate(t *testing.T) {
	p, err := newProblem(heisenberg(t, 10), ladder.Sector{"Sz": 0}, Options{})
	require.NoError(t, err)
	calls, stopAt := 0, math.MaxInt
	p.halt = func() error {
		if calls++; calls >= stopAt {
			return context.Canceled
		}
		return nil
	}
	e := newTestEngine(t, p)
	few := 9
	if kernels, _ := dense.Kernels(); kernels == "netlib" {
		few = 1 // LAPACK does not ask
	}
	for _, perturbation := range []float64{1e-4, 0} { // both ways to split
		stopAt = math.MaxInt
		set := setting{bond: 16, vectors: 8, tolerance: 1e-12, perturbation: perturbation}
		_, err = e.sweep(set)
		require.NoError(t, err)
		before := e.psi.Clone()
		energy := energyOf(t, e)
		for more := 1; ; more++ {
			calls, stopAt = 0, more
			_, _, _, err = e.update(0, true, set)
			if err == nil {
				require.Greater(t, more, few, "the decompositions do not ask")
				break
			}
			require.ErrorIs(t, err, context.Canceled)
			for i, a := range before.Sites {
				require.Equal(t, a.Data, e.psi.Sites[i].Data)
			}
			require.Equal(t, energy, energyOf(t, e))
		}
		stopAt = math.MaxInt
		_, _, _, err = e.update(0, false, set) // the centre goes back
		require.NoError(t, err)
	}
}

func newTestEngine(t *testing.T, p *problem) *engine[float64] {
	t.Helper()
	op := build(t, p)
	total, err := pickTotal(p, op)
	require.NoError(t, err)
	psi, err := startChain[float64](p, total)
	require.NoError(t, err)
	e := newEngine(op, psi, p.opt, p.halt)
	require.NoError(t, e.prepare())
	return e
}

func TestHooks(t *testing.T) {
	const n = 12
	h := heisenberg(t, n)
	var sweeps []Sweep
	var stages []Stage
	var energies []float64
	bond, inSweep := -1, 0
	r := ground1(t, h, ladder.Sector{"Sz": 0}, Options{Precision: 1e-9,
		OnBond: func(p Position) {
			require.Equal(t, len(sweeps)+1, p.Sweep)
			require.Equal(t, n-1, p.Bonds)
			want := bond + 1
			if inSweep >= n-1 {
				want = 2*(n-1) - 1 - inSweep
			}
			require.Equal(t, want, p.Bond)
			bond = p.Bond
			inSweep++
		},
		OnSweep: func(s Sweep) {
			require.Equal(t, 2*(n-1), inSweep)
			require.Equal(t, len(sweeps)+1, s.Number)
			require.LessOrEqual(t, s.LargestBond, s.Bond)
			bond, inSweep = -1, 0
			sweeps = append(sweeps, s)
		},
		OnStage: func(s Stage) {
			require.Zero(t, sweeps[len(sweeps)-1].Perturbation)
			require.LessOrEqual(t, s.State.MaxBond(), s.Bond)
			require.Equal(t, ladderCharges{"Sz": 0}, ladderCharges(s.State.Charges()))
			energies = append(energies, s.Energy)
			s.State = nil
			stages = append(stages, s)
		}})
	require.Equal(t, sweeps, r.Sweeps)
	require.Equal(t, stages, r.Stages)
	require.GreaterOrEqual(t, len(stages), 2)
	require.IsNonIncreasing(t, energies)
	require.Positive(t, r.Flops)
	require.Equal(t, []int{1, 4, 5, 5, 5, 5, 5, 5, 5, 5, 5, 4, 1}, r.OperatorBonds)
}

type ladderCharges map[string]float64

// TestCaps meets each cap: the verdict and its reason must name it, the bars hold all the same, and the cap must have been kept.
func TestCaps(t *testing.T) {
	const n = 24
	h := heisenberg(t, n)
	want, err := exact.HeisenbergChain(n, n/2)
	require.NoError(t, err)
	for _, row := range []struct {
		name    string
		opt     Options
		verdict Verdict
		says    string
		blind   bool // no stage settled: the error is unknown
		bond    int
	}{
		{"bond 1", Options{Bond: 1}, BondCap, "bond dimension 1 reached", false, 1},
		{"bond 2", Options{Bond: 2}, BondCap, "bond dimension 2 reached", false, 2},
		{"bond 30", Options{Bond: 30}, BondCap, "bond dimension 30 reached", false, 30},
		{"one sweep", Options{Sweeps: 1}, SweepCap, "1 sweeps done", true, 24},
		{"three sweeps: one clean", Options{Sweeps: 3}, SweepCap, "3 sweeps done", true, 24},
		{"four sweeps", Options{Sweeps: 4}, SweepCap, "4 sweeps done", false, 24},
		{"in the second perturbation", Options{Sweeps: 5}, SweepCap, "5 sweeps done", false, 48},
		{"in the second stage", Options{Sweeps: 6}, SweepCap, "6 sweeps done", false, 96},
		{"a nanosecond", Options{Time: 1}, TimeCap, "1ns have passed", true, 1},
		{"a little memory", Options{Memory: 1}, MemoryCap, "bond dimension 1 fits", false, 1},
		{"some memory", Options{Memory: 1 << 19}, MemoryCap, "fits the memory", false, 60},
		{"a bond that does", Options{Precision: 1e-2, Bond: 24}, Converged, "", false, 24},
	} {
		t.Run(row.name, func(t *testing.T) {
			var largest int
			row.opt.OnSweep = func(s Sweep) { largest = max(largest, s.LargestBond) }
			r := ground1(t, h, ladder.Sector{"Sz": 0}, row.opt)
			require.Equal(t, row.verdict, r.Verdict)
			require.Contains(t, r.Reason, row.says)
			requireHonest(t, r, want)
			require.Equal(t, row.blind, math.IsInf(r.EnergyError, 1))
			require.LessOrEqual(t, max(largest, r.LargestBond), row.bond)
			if row.opt.Sweeps > 0 {
				require.Len(t, r.Sweeps, row.opt.Sweeps)
			}
			require.False(t, math.IsNaN(r.EnergyLimit))
		})
	}
}

// TestOneStageIsNotConverged: a search that is cut after one settled stage may sit in a product state, whatever its error bar.
func TestOneStageIsNotConverged(t *testing.T) {
	h := hamiltonian(t, 8, ladder.Open, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c.")
	sweeps := len(ground1(t, h, ladder.Sector{"N": 4}, Options{}).Sweeps)
	for cap := 1; cap < sweeps; cap++ {
		r := ground1(t, h, ladder.Sector{"N": 4}, Options{Sweeps: cap})
		if len(r.Stages) < 2 {
			require.Equal(t, SweepCap, r.Verdict, "after %d sweeps and %d stages", cap, len(r.Stages))
		}
	}
}

// TestMemoryIsKept compares the forecast with what a search really holds.
func TestMemoryIsKept(t *testing.T) {
	h := hubbard(t, 12)
	for _, memory := range []int64{1 << 20, 2 << 20} {
		r := ground1(t, h, ladder.Sector{"N": 12, "Sz": 0}, Options{Precision: 1e-10, Memory: memory})
		require.Equal(t, MemoryCap, r.Verdict)
		c, ok := r.State.Real()
		require.True(t, ok)
		p, err := newProblem(h, ladder.Sector{"N": 12, "Sz": 0}, Options{})
		require.NoError(t, err)
		e := newEngine(build(t, p), c, p.opt, func() error { return nil })
		require.NoError(t, e.prepare())
		_, err = e.sweep(setting{bond: r.LargestBond, vectors: 2, tolerance: 1})
		require.NoError(t, err)
		held := e.envs.held()
		for i := range c.Sites {
			held += len(c.Sites[i].Data)
		}
		require.LessOrEqual(t, int64(8*held), memory)
		require.Greater(t, int64(8*held), memory/20, "a cap that leaves nearly all unused is no forecast")
	}
}
