package dmrg

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// freeLevels returns the k lowest energies of n free fermions with the given single-particle levels, by all choices of the lowest modes.
func freeLevels(single []float64, n, k int) []float64 {
	slices.Sort(single)
	var all []float64
	var fill func(from, left int, sum float64)
	fill = func(from, left int, sum float64) {
		if left == 0 {
			all = append(all, sum)
			return
		}
		for i := from; i+left <= len(single); i++ {
			fill(i+1, left-1, sum+single[i])
		}
	}
	fill(0, n, 0)
	slices.Sort(all)
	return all[:min(k, len(all))]
}

// TestLevelsOfFreeFermions compares with sums of single-particle levels.
func TestLevelsOfFreeFermions(t *testing.T) {
	for _, row := range []struct {
		name     string
		sites, n int
		boundary ladder.Boundary
		k        int
	}{
		{"chain", 12, 6, ladder.Open, 4},
		{"ring with open shells", 12, 4, ladder.Periodic, 4},
		{"whole small sector", 4, 2, ladder.Open, 6},
		{"more than the sector holds", 4, 1, ladder.Open, 9},
	} {
		t.Run(row.name, func(t *testing.T) {
			q := exact.NewQuadratic(row.sites)
			for j := range row.sites - 1 {
				q.Hop(j+1, j, -1)
			}
			if row.boundary == ladder.Periodic {
				q.Hop(0, row.sites-1, -1)
			}
			single, err := q.Levels()
			require.NoError(t, err)
			h := hamiltonian(t, row.sites, row.boundary, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c.")
			s, err := Lowest(context.Background(), h, ladder.Sector{"N": float64(row.n)}, row.k, Options{Precision: 1e-9})
			require.NoError(t, err)
			requireLevels(t, s, freeLevels(single, row.n, row.k+extraLevels), row.k)
			for _, l := range s.Levels {
				require.Equal(t, Converged, l.Verdict, l.Reason)
				require.InDelta(t, l.EnergyLimit, l.Energy, 1e-9)
			}
		})
	}
}

// requireLevels compares a spectrum with the exact levels, of which there are more than asked for where there are more.
func requireLevels(t testing.TB, s *Spectrum, want []float64, k int) {
	t.Helper()
	require.GreaterOrEqual(t, len(s.Levels), min(k, len(want)))
	var bad string
	for i, l := range s.Levels {
		t.Logf("level %d of multiplet %d: %.10f ± %.1e (<H> %.10f), exact %.10f, off by %.1e, %s %s escapes %d sweeps %d", i, l.Multiplet, l.EnergyLimit, l.EnergyError, l.Energy, want[i], l.EnergyLimit-want[i], l.Verdict, l.Reason, l.Escapes, len(l.Sweeps))
		if math.Abs(l.EnergyLimit-want[i]) > l.EnergyError {
			bad += fmt.Sprintf("level %d: %v ± %.1e, exact %v\n", i, l.EnergyLimit, l.EnergyError, want[i])
		}
	}
	require.Empty(t, bad)
	// The last multiplet is whole: the next exact level is apart.
	if n := len(s.Levels); s.Whole && n < len(want) {
		last := s.Levels[n-1]
		require.Greater(t, want[n], last.EnergyLimit-last.EnergyError, "a level is missing")
		require.Greater(t, want[n]-want[n-1], 1e-9, "the last multiplet is not whole")
	}
	count := 0
	for _, m := range s.Multiplets {
		require.Equal(t, count, m.First)
		count += m.Count
		exactSplitting := want[m.First+m.Count-1] - want[m.First]
		require.LessOrEqual(t, exactSplitting, m.SplittingBound)
	}
	require.Equal(t, len(s.Levels), count)
}

// TestLevelsOfRandomLadders diagonalizes ladders of random couplings.
func TestLevelsOfRandomLadders(t *testing.T) { testLevelsOfRandomLadders(t, 2) }

func testLevelsOfRandomLadders(t *testing.T, cases int) {
	rng := rand.New(rand.NewPCG(71, 72))
	for n := range cases {
		const rungs = 4
		sites := slices.Repeat([]exact.Site{exact.Boson(2)}, 2*rungs)
		var terms []exact.Term
		var formulas []string
		hop := func(name string, x complex128, a, b int) {
			formulas = append(formulas, fmt.Sprintf("(%.17g %+.17g*i) %s + h.c.", real(x), imag(x), name))
			terms = append(terms, exact.WithAdjoints(exact.T(x, "b^+", a, "b", b))...)
		}
		random := func() complex128 { return complex(rng.NormFloat64(), rng.NormFloat64()) }
		for j := range rungs {
			hop(fmt.Sprintf("b^+[a,%d] b[b,%d]", j, j), random(), 2*j, 2*j+1)
			if j+1 < rungs {
				hop(fmt.Sprintf("b^+[a,%d] b[a,%d]", j+1, j), random(), 2*j+2, 2*j)
				hop(fmt.Sprintf("b^+[b,%d] b[b,%d]", j+1, j), random(), 2*j+3, 2*j+1)
				hop(fmt.Sprintf("b^+[b,%d] b[a,%d]", j+1, j), random(), 2*j+3, 2*j)
			}
		}
		legs := []ladder.Site{ladder.Boson(2), ladder.Boson(2)}
		h := hamiltonian(t, rungs, ladder.Open, legs, formulas...)
		b, err := exact.NewBasis(sites, []exact.Number{exact.Particles(sites)}, []int{4})
		require.NoError(t, err)
		m, err := b.Matrix(terms...)
		require.NoError(t, err)
		levels, err := m.Lowest(6)
		require.NoError(t, err)
		var want []float64
		for _, l := range levels {
			want = append(want, l.Energy)
		}
		t.Run(fmt.Sprint(n), func(t *testing.T) {
			s, err := Lowest(context.Background(), h, ladder.Sector{"N": 4}, 4, Options{Precision: 1e-9})
			require.NoError(t, err)
			requireLevels(t, s, want, 4)
		})
	}
}

// TestLevelsOverFreeCharges: the pairing chain at its sweet spot has one ground state of each parity, and L-1 pair-breaking levels 2t above (Kitaev 2001).
func TestLevelsOverFreeCharges(t *testing.T) {
	const n = 8
	h := hamiltonian(t, n, ladder.Open, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c.", "-c^+[a,j+1] c^+[a,j] + h.c.")
	s, err := Lowest(context.Background(), h, nil, 1, Options{})
	require.NoError(t, err)
	requireLevels(t, s, []float64{1 - n, 1 - n, 3 - n}, 1)
	require.True(t, s.Whole)
	require.Len(t, s.Levels, 2, "the doublet is completed")
	require.NotEqual(t, s.Levels[0].Sector["P"], s.Levels[1].Sector["P"])
	require.Equal(t, []Multiplet{{First: 0, Count: 2, Energy: s.Multiplets[0].Energy, EnergyError: s.Multiplets[0].EnergyError,
		Splitting: s.Multiplets[0].Splitting, SplittingBound: s.Multiplets[0].SplittingBound}}, s.Multiplets)
	require.InDelta(t, 1-n, s.Multiplets[0].Energy, 1e-9)
}

// TestLevelsAtACap: at a bond dimension that truncates, the states are orthogonal up to that, and the bars hold.
func TestLevelsAtACap(t *testing.T) {
	q := exact.NewQuadratic(24)
	for j := range 23 {
		q.Hop(j+1, j, -1)
	}
	single, err := q.Levels()
	require.NoError(t, err)
	h := hamiltonian(t, 24, ladder.Open, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c.")
	s, err := Lowest(context.Background(), h, ladder.Sector{"N": 12}, 3, Options{Precision: 1e-9, Bond: 16})
	require.NoError(t, err)
	want := make([]float64, 0, 8)
	for e := range lowestFillings(single, 12) {
		want = append(want, e)
	}
	requireLevels(t, s, want, 3)
	for i, a := range s.Levels {
		require.Equal(t, BondCap, a.Verdict)
		for _, b := range s.Levels[:i] {
			o, err := a.State.Overlap(b.State)
			require.NoError(t, err)
			require.LessOrEqual(t, math.Hypot(real(o), imag(o)), 10*math.Sqrt(a.DiscardedWeight+b.DiscardedWeight))
		}
	}
}

// lowestFillings yields the lowest energies of n free fermions: up to two moved across the Fermi level, by up to five levels.
func lowestFillings(single []float64, n int) func(func(float64) bool) {
	slices.Sort(single)
	ground := 0.0
	for _, e := range single[:n] {
		ground += e
	}
	all := []float64{ground}
	const reach = 5
	for a := n - reach; a < n; a++ {
		for b := n; b < n+reach; b++ {
			one := ground - single[a] + single[b]
			all = append(all, one)
			for c := a + 1; c < n; c++ {
				for d := b + 1; d < n+reach; d++ {
					all = append(all, one-single[c]+single[d])
				}
			}
		}
	}
	slices.Sort(all)
	return slices.Values(all[:8])
}

func TestLowestRefuses(t *testing.T) {
	h := heisenberg(t, 6)
	_, err := Lowest(context.Background(), h, ladder.Sector{"Sz": 0}, 0, Options{})
	require.ErrorContains(t, err, "0 states asked for")
	_, err = Lowest(context.Background(), h, ladder.Sector{"Sz": 0}, 2, Options{Bond: -1})
	require.ErrorContains(t, err, "Bond = -1")
	_, err = Lowest(context.Background(), heisenberg(t, 20), nil, 2, Options{})
	require.ErrorContains(t, err, "name some of [Sz]")
	_, err = Lowest(context.Background(), h, ladder.Sector{"Sz": 9}, 2, Options{})
	require.ErrorContains(t, err, "Sz = 9")
}

// TestLowestStops: the levels found before the context ends are kept.
func TestLowestStops(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	stages := 0
	s, err := Lowest(ctx, heisenberg(t, 10), ladder.Sector{"Sz": 0}, 3, Options{OnStage: func(Stage) {
		if stages++; stages == 3 {
			cancel()
		}
	}})
	require.ErrorIs(t, err, context.Canceled)
	require.Len(t, s.Levels, 2)
	require.Equal(t, Converged, s.Levels[0].Verdict)
	require.Empty(t, s.Levels[1].Verdict)
	require.False(t, s.Whole)
	require.NotEmpty(t, s.Reason)
	next, err := Lowest(context.Background(), heisenberg(t, 10), ladder.Sector{"Sz": 0}, 3,
		Options{Levels: []*mps.State{s.Levels[0].State, s.Levels[1].State}})
	require.NoError(t, err)
	whole, err := Lowest(context.Background(), heisenberg(t, 10), ladder.Sector{"Sz": 0}, 3, Options{})
	require.NoError(t, err)
	for i, l := range whole.Levels {
		require.InDelta(t, l.EnergyLimit, next.Levels[i].EnergyLimit, l.EnergyError+next.Levels[i].EnergyError)
	}
}

// TestLowestIsRepeatable: bitwise the same at any number of threads.
func TestLowestIsRepeatable(t *testing.T) {
	h := hamiltonian(t, 5, ladder.Open, []ladder.Site{ladder.Boson(2), ladder.Boson(2)}, fluxTerms...)
	var all []*Spectrum
	for _, threads := range []int{1, 3} {
		s, err := Lowest(context.Background(), h, ladder.Sector{"N": 5}, 2, Options{Precision: 1e-6, Threads: threads})
		require.NoError(t, err)
		all = append(all, s)
	}
	require.Len(t, all[1].Levels, len(all[0].Levels))
	for i, l := range all[0].Levels {
		require.Equal(t, l.EnergyLimit, all[1].Levels[i].EnergyLimit)
		require.Equal(t, l.EnergyError, all[1].Levels[i].EnergyError)
	}
}

// TestEndModes: a dimerized chain with weak end links holds a fermion at either end, in levels that split exponentially little in its length (Su, Schrieffer,
// Heeger 1979): by less than the precision here. The pair comes whole, its splitting is bounded, and the states are those of the levels, not of the ends.
func TestEndModes(t *testing.T) {
	const n = 16
	q := exact.NewQuadratic(n)
	var formulas []string
	for j := range n - 1 {
		x := -1.0
		if j%2 == 0 {
			x = -0.1
		}
		q.Hop(j+1, j, complex(x, 0))
		formulas = append(formulas, fmt.Sprintf("%g c^+[a,%d] c[a,%d] + h.c.", x, j+1, j))
	}
	single, err := q.Levels()
	require.NoError(t, err)
	want := freeLevels(single, n/2, 6)
	split := want[1] - want[0]
	require.Less(t, split, 1e-7)
	require.Greater(t, split, 1e-9)
	h := hamiltonian(t, n, ladder.Open, one(ladder.Fermion()), formulas...)
	for _, precision := range []float64{1e-3, 1e-10} {
		s, err := Lowest(context.Background(), h, ladder.Sector{"N": n / 2}, 1, Options{Precision: precision})
		require.NoError(t, err)
		requireLevels(t, s, want, 1)
		if precision < split {
			require.Len(t, s.Levels, 1, "the splitting is resolved")
			continue
		}
		require.Len(t, s.Levels, 2, "the pair comes whole")
		t.Logf("split by %.2e, at most %.2e", s.Multiplets[0].Splitting, s.Multiplets[0].SplittingBound)
	}
}

// TestBundle begins from two states that mix the lowest levels, and one that is far from any: it finds them in order.
func TestBundle(t *testing.T) {
	h, levels := loneBoson(t, 12, 0.7)
	p, err := newProblem(h, ladder.Sector{"N": 1}, Options{Complex: true})
	require.NoError(t, err)
	p.halt = func() error { return nil }
	op, err := mpo.Build[complex128](p.strings, mpo.Options{})
	require.NoError(t, err)
	starts, err := otherStarts[complex128](p, block.Charge{1}, 3, 1)
	require.NoError(t, err)
	q := newBundleSearch(op, starts, p.opt, p.scale, p.halt)
	require.NoError(t, q.prepare())
	for range 2 {
		require.NoError(t, q.stage(16))
	}
	for k := range 3 {
		est := q.estimate(k)
		require.InDelta(t, levels[k], est.limit, est.err+1e-9, "level %d", k)
	}
	for i, a := range q.chains() {
		for j, b := range q.chains() {
			o := mps.Overlap(a, b, nil)
			require.InDelta(t, map[bool]float64{true: 1}[i == j], real(o), 1e-9)
			require.InDelta(t, 0, imag(o), 1e-9)
		}
	}
}
