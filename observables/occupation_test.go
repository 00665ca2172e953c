package observables_test

import (
	"context"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/observables"
)

// TestOccupations compares with the expectation values of formulas that are the projectors on the local states.
func TestOccupations(t *testing.T) {
	ctx := context.Background()
	lad, err := ladder.New(4, ladder.Open, ladder.Leg("a", ladder.Boson(2)), ladder.Leg("d", ladder.Electron()))
	require.NoError(t, err)
	h, err := lad.Hamiltonian(ladder.Constants{"phi": 0.3},
		ladder.Term{Formula: "exp(i*phi) b^+[a,j+1] b[a,j] + h.c."},
		ladder.Term{Formula: "c_up^+[d,j+1] c_up[d,j] + exp(i*phi) c_down^+[d,j+1] c_down[d,j] + h.c."})
	require.NoError(t, err)
	for _, c := range []struct {
		name    string
		complex bool
	}{{"real", false}, {"complex", true}} {
		t.Run(c.name, func(t *testing.T) {
			f, err := h.Frames(ladder.FrameOptions{Complex: c.complex})
			require.NoError(t, err)
			require.Equal(t, !c.complex, f.Real)
			target, err := f.Target(ladder.Sector{"N_a": 3, "Sz": 0.5, "N_d": 3})
			require.NoError(t, err)
			s, err := mps.RandomState(f, h.Scope, target.Charge, 12, 5)
			require.NoError(t, err)
			all, err := observables.Occupations(ctx, s)
			require.NoError(t, err)
			for _, p := range []struct {
				leg, formula string
				state        int
			}{
				{"a", "(n[a,j]-1)*(n[a,j]-2)/2", 0}, {"a", "n[a,j]*(2-n[a,j])", 1}, {"a", "n[a,j]*(n[a,j]-1)/2", 2},
				{"d", "(1-n_up[d,j])*(1-n_down[d,j])", 0}, {"d", "n_up[d,j]*(1-n_down[d,j])", 1},
				{"d", "n_down[d,j]*(1-n_up[d,j])", 2}, {"d", "n_up[d,j]*n_down[d,j]", 3},
			} {
				want, err := observables.Everywhere(ctx, s, p.formula, nil)
				require.NoError(t, err)
				for j, v := range want.Values {
					site, ok := lad.SiteIndex(p.leg, j)
					require.True(t, ok)
					assert.InDelta(t, v, all[site][p.state], 1e-12, "%s at %d", p.formula, j)
				}
			}
		})
	}
}

// TestOccupationsOfTurnedSites: where the stored axis is another than the user's there is nothing to tell.
func TestOccupationsOfTurnedSites(t *testing.T) {
	lad, err := ladder.New(3, ladder.Open, ladder.Leg("a", ladder.Spin(1)))
	require.NoError(t, err)
	h, err := lad.Hamiltonian(nil, ladder.Term{Formula: "-S^z[a,j] S^z[a,j+1]"}, ladder.Term{Formula: "-0.4*S^x[a,j]"})
	require.NoError(t, err)
	f, err := h.Frames(ladder.FrameOptions{})
	require.NoError(t, err)
	s, err := mps.ProductState(f, h.Scope, []int{0, 1, 0})
	require.NoError(t, err)
	all, err := observables.Occupations(context.Background(), s)
	require.NoError(t, err)
	for i, p := range all {
		require.NotZero(t, f.Sites[i].Rotation)
		assert.Nil(t, p)
	}

	ctx, stop := context.WithCancel(context.Background())
	stop()
	_, err = observables.Occupations(ctx, s)
	assert.ErrorIs(t, err, context.Canceled)
}
