package dmrg

import (
	"context"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
)

// The same search in complex arithmetic is the check: energies agree within both error bars, and the states, each in the user's own
// sites, overlap and give the same currents.
func TestRewritten(t *testing.T) {
	for _, c := range []struct {
		name   string
		site   ladder.Site
		rungs  int
		sector ladder.Sector
		terms  []string
	}{
		{"spinless", ladder.Fermion(), 8, ladder.Sector{"N": 7}, []string{
			"-exp(0.4*i) c^+[a,j+1] c[a,j] - exp(-0.4*i) c^+[b,j+1] c[b,j] + h.c.", "-0.7 c^+[a,j] c[b,j] + h.c.",
			"1.5 (n[a,j] n[a,j+1] + n[b,j] n[b,j+1])"}},
		{"flux on the rungs", ladder.Fermion(), 8, ladder.Sector{"N": 6}, []string{
			"-c^+[a,j+1] c[a,j] - c^+[b,j+1] c[b,j] + h.c.", "-0.7*exp(0.8*i*j) c^+[a,j] c[b,j] + h.c.", "n[a,j] n[b,j]"}},
		{"free charge", ladder.Fermion(), 4, nil, []string{
			"-exp(0.4*i) c^+[a,j+1] c[a,j] - exp(-0.4*i) c^+[b,j+1] c[b,j] + h.c.", "-0.7 c^+[a,j] c[b,j] + h.c.", "0.3 (n[a,j] + n[b,j])"}},
		{"two components", ladder.Electron(), 3, ladder.Sector{"N": 5, "Sz": 0.5}, []string{
			"-exp(0.4*i) c_up^+[a,j+1] c_up[a,j] - exp(-0.4*i) c_up^+[b,j+1] c_up[b,j] + h.c.",
			"-exp(0.4*i) c_down^+[a,j+1] c_down[a,j] - exp(-0.4*i) c_down^+[b,j+1] c_down[b,j] + h.c.",
			"-0.7 c_up^+[a,j] c_up[b,j] - 0.7 c_down^+[a,j] c_down[b,j] + h.c.", "2 n_up[a,j] n_down[a,j] + 2 n_up[b,j] n_down[b,j]"}},
		{"hard-core bosons", ladder.Boson(1), 8, ladder.Sector{"N": 5}, []string{
			"-exp(0.4*i) b^+[a,j+1] b[a,j] - exp(-0.4*i) b^+[b,j+1] b[b,j] + h.c.", "-0.7 b^+[a,j] b[b,j] + h.c.", "n[a,j] n[a,j+1] + n[b,j] n[b,j+1]"}},
		{"spins, free charge", ladder.Spin(1), 5, nil, []string{
			"exp(0.7*i) S^+[a,j+1] S^-[a,j]/2 + exp(-0.7*i) S^+[b,j+1] S^-[b,j]/2 + h.c.", "S[a,j].S[b,j]"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			h := hamiltonian(t, c.rungs, ladder.Open, []ladder.Site{c.site, c.site}, c.terms...)
			here := ground1(t, h, c.sector, Options{Precision: 1e-10})
			there := ground1(t, h, c.sector, Options{Precision: 1e-10, Complex: true})
			assert.True(t, here.Real)
			assert.False(t, there.Real)
			assert.Equal(t, Converged, here.Verdict, here.Reason)
			assert.Less(t, here.Flops, there.Flops)
			assert.Equal(t, there.Sector, here.Sector)
			require.InDelta(t, there.EnergyLimit, here.EnergyLimit, here.EnergyError+there.EnergyError+1e-11)
			z, err := here.State.Overlap(there.State)
			require.NoError(t, err)
			require.InDelta(t, 1, dense.Abs(z), 1e-7)

			s, err := here.State.Frames().Strings(h.Poly)
			require.NoError(t, err)
			op, err := mpo.Build[complex128](s, mpo.Options{})
			require.NoError(t, err)
			chain, err := mps.ChainOf[complex128](here.State)
			require.NoError(t, err)
			require.InDelta(t, here.Energy, real(mpo.Expectation(chain, op, nil)), 1e-11)
		})
	}
}

func TestRewritingIsDeclined(t *testing.T) {
	h := hamiltonian(t, 4, ladder.Open, []ladder.Site{ladder.Fermion(), ladder.Fermion()},
		"-exp(0.4*i) c^+[a,j+1] c[a,j] - exp(-0.4*i) c^+[b,j+1] c[b,j] - 0.7 c^+[a,j] c[b,j] + h.c.")
	first := ground1(t, h, ladder.Sector{"N": 3}, Options{})
	require.True(t, first.Real)
	for name, opt := range map[string]Options{"complex asked for": {Complex: true}, "a start": {Start: first.State}} {
		r, err := Ground(context.Background(), h, ladder.Sector{"N": 3}, opt)
		require.NoError(t, err, name)
		assert.False(t, r.Real, name)
		assert.InDelta(t, first.EnergyLimit, r.EnergyLimit, first.EnergyError+r.EnergyError, name)
	}
}
