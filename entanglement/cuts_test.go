package entanglement_test

import (
	"context"
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/dmrg"
	"rundle/entanglement"
	"rundle/internal/exact"
	"rundle/mpo/ladder"
	"rundle/mps"
)

func hamiltonian(t testing.TB, rungs int, parts []ladder.Part, formulas ...string) *ladder.Hamiltonian {
	t.Helper()
	lad, err := ladder.New(rungs, ladder.Open, parts...)
	require.NoError(t, err)
	var terms []ladder.Term
	for _, f := range formulas {
		terms = append(terms, ladder.Term{Formula: f})
	}
	h, err := lad.Hamiltonian(nil, terms...)
	require.NoError(t, err)
	return h
}

func ground(t testing.TB, h *ladder.Hamiltonian, sector ladder.Sector) *mps.State {
	t.Helper()
	r, err := dmrg.Ground(context.Background(), h, sector, dmrg.Options{Precision: 1e-12, ObservablePrecision: 1e-10})
	require.NoError(t, err)
	return r.State
}

// TestAgainstFullVectors compares entropies, levels and their charges at every cut with the full vector of exact diagonalization.
func TestAgainstFullVectors(t *testing.T) {
	electrons := slices.Repeat([]exact.Site{exact.Electron(true)}, 5)
	var terms []exact.Term
	for j := range 4 {
		for _, s := range []string{"up", "down"} {
			terms = append(terms, exact.WithAdjoints(exact.T(-1, "c_"+s+"^+", j+1, "c_"+s, j))...)
		}
	}
	for j := range 5 {
		terms = append(terms, exact.T(3, "n_up", j, "n_down", j), exact.T(complex(0.3*float64(j), 0), "n", j))
	}
	basis, err := exact.NewBasis(electrons, []exact.Number{exact.UpParticles(electrons), exact.DownParticles(electrons)}, []int{3, 2})
	require.NoError(t, err)
	m, err := basis.Matrix(terms...)
	require.NoError(t, err)
	g, gap, err := m.Ground()
	require.NoError(t, err)
	require.Greater(t, gap, 1e-2)

	h := hamiltonian(t, 5, []ladder.Part{ladder.Leg("a", ladder.Electron())}, "-c_up^+[a,j+1] c_up[a,j] + h.c.", "-c_down^+[a,j+1] c_down[a,j] + h.c.",
		"3 n_up[a,j] n_down[a,j]", "0.3*j n[a,j]")
	table := entanglement.Cuts(ground(t, h, ladder.Sector{"N": 5, "Sz": 0.5}))
	require.Equal(t, []int{0, 1, 2, 3}, table.AfterSite)
	require.Equal(t, []bool{true, true, true, true}, table.RungEdge)
	entropies, err := basis.Entropies(g.Vector)
	require.NoError(t, err)
	renyi, err := basis.Renyi2(g.Vector)
	require.NoError(t, err)
	require.InDeltaSlice(t, entropies, table.Entropy, 1e-8)
	require.InDeltaSlice(t, renyi, table.Renyi2, 1e-8)
	for b, levels := range table.Spectrum {
		want, err := basis.Schmidt(g.Vector, b)
		require.NoError(t, err)
		sum := 0.0
		for i, l := range levels {
			sum += math.Exp(-l.Xi)
			require.True(t, i == 0 || levels[i-1].Xi <= l.Xi)
			if l.Xi > 12 {
				continue
			}
			require.InDelta(t, -2*math.Log(want[i].Value), l.Xi, 1e-6, "cut %d, level %d", b, i)
			if i+1 < len(levels) && levels[i+1].Xi-l.Xi > 1e-4 && (i == 0 || l.Xi-levels[i-1].Xi > 1e-4) {
				up, down := float64(want[i].Left[0]), float64(want[i].Left[1])
				require.Equal(t, map[string]float64{"N": up + down, "Sz": (up - down) / 2}, l.Charge, "cut %d, level %d", b, i)
			}
		}
		require.InDelta(t, 1, sum, 1e-12)
	}
}

// TestKnownSpectra: states whose Schmidt values are known without a calculation.
func TestKnownSpectra(t *testing.T) {
	spin := func(legs string) (parts []ladder.Part) {
		for _, l := range legs {
			parts = append(parts, ladder.Leg(string(l), ladder.Spin(1)))
		}
		return parts
	}
	// Singlets on the rungs of a ladder: cut rungs carry ln 2, rung edges nothing.
	table := entanglement.Cuts(ground(t, hamiltonian(t, 4, spin("ab"), "S[a,j].S[b,j]"), ladder.Sector{"Sz": 0}))
	for b := range 7 {
		require.Equal(t, b%2 == 1, table.RungEdge[b])
		want := math.Ln2 * float64(1-b%2)
		require.InDelta(t, want, table.Entropy[b], 1e-10)
		require.InDelta(t, want, table.Renyi2[b], 1e-10)
	}
	// The edge spins of an open spin-one chain with the projectors of Affleck, Kennedy, Lieb and Tasaki (1987), polarized: two levels inside.
	chain := hamiltonian(t, 24, []ladder.Part{ladder.Leg("a", ladder.Spin(2))}, "S[a,j].S[a,j+1]", "(1/3) (S[a,j].S[a,j+1])^2")
	table = entanglement.Cuts(ground(t, chain, ladder.Sector{"Sz": 1}))
	require.InDelta(t, math.Ln2, table.Entropy[11], 1e-9)
	require.InDelta(t, math.Ln2, table.Spectrum[11][1].Xi, 1e-4)
	require.Len(t, table.Spectrum[11][0].Charge, 1)
}

func TestWithoutEntanglement(t *testing.T) {
	h := hamiltonian(t, 5, []ladder.Part{ladder.Leg("a", ladder.Boson(2))}, "n[a,j]")
	f, err := h.Frames(ladder.FrameOptions{})
	require.NoError(t, err)
	s, err := mps.ProductState(f, h.Scope, []int{0, 2, 1, 1, 0})
	require.NoError(t, err)
	table := entanglement.Cuts(s)
	require.Equal(t, make([]float64, 4), table.Entropy)
	require.Equal(t, make([]float64, 4), table.Renyi2)
	for b, levels := range table.Spectrum {
		require.Len(t, levels, 1)
		require.Zero(t, levels[0].Xi)
		require.NotEmpty(t, levels[0].Charge, "cut %d", b)
	}
	c, _ := s.Real()
	c.Scale(-1e-200)
	require.Equal(t, table, entanglement.Cuts(s), "norm and sign do not matter")
	c.Scale(0)
	zero := entanglement.Cuts(s)
	require.Equal(t, make([]float64, 4), zero.Entropy)
	require.Empty(t, zero.Spectrum[2])

	one := hamiltonian(t, 1, []ladder.Part{ladder.Leg("a", ladder.Boson(2))}, "n[a,j]")
	f, err = one.Frames(ladder.FrameOptions{})
	require.NoError(t, err)
	s, err = mps.ProductState(f, one.Scope, []int{1})
	require.NoError(t, err)
	require.Empty(t, entanglement.Cuts(s).Entropy)
}

func TestEntropies(t *testing.T) {
	for _, row := range []struct {
		name string
		p    []float64
		n    float64
		want float64
	}{
		{"one weight", []float64{1}, 2, 0},
		{"two halves, n = 2", []float64{0.5, 0.5}, 2, math.Ln2},
		{"two halves, n = 1", []float64{0.5, 0.5}, 1, math.Ln2},
		{"two halves, n = 1/2", []float64{0.5, 0.5}, 0.5, math.Ln2},
		{"two halves, n = 0", []float64{0.5, 0.5, 0}, 0, math.Ln2},
		{"two halves, n = infinity", []float64{0.5, 0.5}, math.Inf(1), math.Ln2},
		{"n = 3", []float64{0.7, 0.2, 0.1}, 3, -math.Log(0.343+0.008+0.001) / 2},
		{"n = infinity", []float64{0.7, 0.2, 0.1}, math.Inf(1), -math.Log(0.7)},
		{"a power that underflows", []float64{0.5, 0.5}, 5000, 5000 * math.Ln2 / 4999 * (1 - 1.0/5000)},
		{"nothing", nil, 2, 0},
		{"zeros", []float64{0, 0}, 2, 0},
		{"negative n", []float64{0.5, 0.5}, -1, math.NaN()},
		{"undefined n", []float64{0.5, 0.5}, math.NaN(), math.NaN()},
		{"zeros are left out", []float64{0.5, 0, 0.5, 0}, 1, math.Ln2},
	} {
		t.Run(row.name, func(t *testing.T) {
			got := entanglement.Renyi(row.p, row.n)
			if math.IsNaN(row.want) {
				require.True(t, math.IsNaN(got))
				return
			}
			require.InDelta(t, row.want, got, 1e-14)
		})
	}
}

// TestRenyiDecreases: entropies fall with their index, and lie between zero and the logarithm of the number of weights.
func TestRenyiDecreases(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		p := rapid.SliceOfN(rapid.Float64Range(1e-12, 1), 1, 12).Draw(rt, "weights")
		sum := 0.0
		for _, x := range p {
			sum += x
		}
		for i := range p {
			p[i] /= sum
		}
		before := slices.Clone(p)
		last := math.Log(float64(len(p))) + 1e-12
		for _, n := range []float64{0, 0.3, 0.9, 1, 1.1, 2, 7, 300, math.Inf(1)} {
			s := entanglement.Renyi(p, n)
			require.LessOrEqual(rt, s, last+1e-12, "n = %v", n)
			require.GreaterOrEqual(rt, s, 0.0)
			last = s
		}
		require.Equal(rt, before, p, "the weights belong to the caller")
	})
}
