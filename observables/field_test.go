package observables_test

import (
	"context"
	"math/cmplx"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
	"rundle/observables"
)

func (s sample) site(t *testing.T, at []ladder.IndexValue) int {
	t.Helper()
	leg, rung := "a", -1
	for _, v := range at {
		if v.Leg != "" {
			leg = v.Leg
		} else {
			rung = int(v.Number)
		}
	}
	i, ok := s.lad.SiteIndex(leg, rung)
	require.True(t, ok, "%v", at)
	return i
}

// TestEverywhere: one value a place, in order, with the place.
func TestEverywhere(t *testing.T) {
	s := flux.sample(t, 11)
	each := ladder.Each{"l": "legs"}
	f, err := observables.Everywhere(context.Background(), s.state, "n[l,j]", each)
	require.NoError(t, err)
	require.Nil(t, f.Imag, "a Hermitian formula has real values")
	require.Len(t, f.Values, 6)
	seen := map[int]bool{}
	for i, at := range f.At {
		site := s.site(t, at)
		seen[site] = true
		require.InDelta(t, real(s.expect(exact.T(1, "n", site))), f.Values[i], 1e-13)
	}
	require.Len(t, seen, 6)

	// The current along leg a: two bonds where there are three rungs.
	f, err = observables.Observe(context.Background(), s.state, ladder.Term{Formula: "i*(exp(0.3*i) b^+[a,j+1] b[a,j] - h.c.)", Where: "j > 0"})
	require.NoError(t, err)
	require.Nil(t, f.Imag)
	require.Len(t, f.Values, 1)
	require.Equal(t, "j = 1", f.At[0][0].String())

	f, err = observables.Everywhere(context.Background(), s.state, "b^+[a,j+1] b[a,j]", nil)
	require.NoError(t, err)
	require.Len(t, f.Imag, 2)
	for j := range 2 {
		want := s.expect(exact.T(1, "b^+", 2*j+2, "b", 2*j))
		require.InDelta(t, 0, cmplx.Abs(complex(f.Values[j], f.Imag[j])-want), 1e-13)
	}
}

// TestAllPairs compares two-point functions of all kinds of sites at all pairs, equal places included.
func TestAllPairs(t *testing.T) {
	for _, row := range []struct {
		world         world
		first, second string
		hermitian     bool
	}{
		{fermions, "c^+", "c", false}, {fermions, "c", "c^+", false}, {fermions, "n", "n", true}, {fermions, "c", "c", false},
		{flux, "b^+", "b", false}, {flux, "n", "n", true},
		{paired, "c", "c", false}, {paired, "c^+", "c", false},
		{turned, "S^z", "S^z", false}, {turned, "S^+", "S^-", false}, {turned, "S^x", "S^z", false}, {turned, "S^y", "S^y", false},
		{spinsOne, "S^z", "S^z", true}, {spinsOne, "S^x", "S^x", false},
		{electrons, "c_up^+", "c_up", false}, {electrons, "n_up", "n_down", true},
		{clocks, "X^+", "X", false},
	} {
		t.Run(row.world.name+"/"+row.first+" "+row.second, func(t *testing.T) {
			s := row.world.sample(t, 13)
			each := ladder.Each{"l": "legs"}
			p, err := observables.AllPairs(context.Background(), s.state, ladder.Term{Formula: row.first + "[l,j]", Each: each}, ladder.Term{Formula: row.second + "[l,j]", Each: each})
			require.NoError(t, err)
			if row.hermitian {
				require.True(t, p.Hermitian)
			}
			want := s.basis.TwoPoint(s.vector, row.first, row.second)
			connected := p.Connected()
			require.Len(t, p.Values, s.lad.Sites())
			for x, list := range p.Values {
				require.Len(t, list, s.lad.Sites())
				i := s.site(t, p.AtFirst[x])
				a := s.expect(exact.T(1, row.first, i))
				require.InDelta(t, 0, cmplx.Abs(p.FirstMean[x]-a), 1e-13)
				for y, v := range list {
					k := s.site(t, p.AtSecond[y])
					require.InDelta(t, 0, cmplx.Abs(v-want[i][k]), 1e-13, "sites %d, %d: %v, full vector %v", i, k, v, want[i][k])
					b := s.expect(exact.T(1, row.second, k))
					require.InDelta(t, 0, cmplx.Abs(connected[x][y]-(want[i][k]-a*b)), 1e-13)
				}
			}
		})
	}
}

// TestPairsOfStrings: the two operators may be any formulas; here pairs and currents.
func TestPairsOfStrings(t *testing.T) {
	s := fermions.sample(t, 17)
	pair := ladder.Term{Formula: "c[b,j] c[a,j]"}
	p, err := observables.AllPairs(context.Background(), s.state, ladder.Term{Formula: "c^+[a,j] c^+[b,j]"}, pair)
	require.NoError(t, err)
	for x := range 3 {
		for y := range 3 {
			want := s.expect(exact.T(1, "c^+", 2*x, "c^+", 2*x+1, "c", 2*y+1, "c", 2*y))
			require.InDelta(t, 0, cmplx.Abs(p.Values[x][y]-want), 1e-13)
		}
	}
	current := ladder.Term{Formula: "i*(c^+[a,j+1] c[a,j] - h.c.)"}
	p, err = observables.AllPairs(context.Background(), s.state, current, current)
	require.NoError(t, err)
	require.Len(t, p.Values, 2)
	j := func(x int) []exact.Term {
		return []exact.Term{exact.T(1i, "c^+", 2*x+2, "c", 2*x), exact.T(-1i, "c^+", 2*x, "c", 2*x+2)}
	}
	for x := range 2 {
		for y := range 2 {
			var want complex128
			for _, a := range j(x) {
				for _, b := range j(y) {
					want += s.expect(exact.Term{Coef: a.Coef * b.Coef, Ops: append(append([]exact.Op(nil), a.Ops...), b.Ops...)})
				}
			}
			require.InDelta(t, 0, cmplx.Abs(p.Values[x][y]-want), 1e-13)
		}
	}
}

// TestOccupationsOfVectors: the probabilities are the squares of the amplitudes.
func TestOccupationsOfVectors(t *testing.T) {
	for _, w := range worlds {
		s := w.sample(t, 19)
		all, err := observables.Occupations(context.Background(), s.state)
		require.NoError(t, err)
		for site, got := range all {
			if w.turned {
				require.Nil(t, got)
				continue
			}
			want := make([]float64, s.lad.Site(site).Dim())
			for i, z := range s.vector {
				want[s.basis.State(i)[site]] += real(z)*real(z) + imag(z)*imag(z)
			}
			require.InDeltaSlice(t, want, got, 1e-13, "%s, site %d", w.name, site)
		}
	}
}

func BenchmarkCorrelationsOfElectrons(b *testing.B) {
	s := electrons.sample(b, 1)
	for b.Loop() {
		_, err := observables.AllPairs(context.Background(), s.state, ladder.Term{Formula: "c_up^+[a,j]"}, ladder.Term{Formula: "c_up[a,j]"})
		require.NoError(b, err)
	}
}
