package acceptance

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/dmrg"
	"rundle/entanglement"
	"rundle/mpo/ladder"
	"rundle/observables"
)

// terms makes a term of every formula.
func terms(formulas ...string) []ladder.Term {
	var out []ladder.Term
	for _, f := range formulas {
		out = append(out, ladder.Term{Formula: f})
	}
	return out
}

// openChain is a Hamiltonian on one open leg, named a.
func openChain(t *testing.T, n int, site ladder.Site, c ladder.Constants, formulas ...string) *ladder.Hamiltonian {
	t.Helper()
	lad, err := ladder.New(n, ladder.Open, ladder.Leg("a", site))
	require.NoError(t, err)
	h, err := lad.Hamiltonian(c, terms(formulas...)...)
	require.NoError(t, err)
	return h
}

// wish is what a search is asked for and judged by: an energy right to relative × max(|E|, largest coupling).
type wish struct {
	relative    float64
	want        float64 // the exact energy
	largest     float64 // coupling
	observables float64 // wanted precision of observables; 0: what the energy's entails
	options     dmrg.Options
}

// requireGround searches the ground state and holds its energy against the exact one: the energy of the state within the wish,
// the extrapolated one within its own error bar. The figures are logged.
func requireGround(t *testing.T, h *ladder.Hamiltonian, sector ladder.Sector, w wish) *dmrg.Result {
	t.Helper()
	scale := max(math.Abs(w.want), w.largest)
	opt := w.options
	opt.Precision, opt.ObservablePrecision = 0.5*w.relative*scale, w.observables
	res, err := dmrg.Ground(context.Background(), h, sector, opt)
	require.NoError(t, err)
	seconds := 0.0
	for _, s := range res.Sweeps {
		seconds += s.Seconds
	}
	t.Logf("%v: off by %.1e, limit off by %.1e, quoted %.1e, wish %.1e; bond %d, %d sweeps, %.1f s", res.Verdict,
		res.Energy-w.want, math.Abs(res.EnergyLimit-w.want), res.EnergyError, w.relative*scale, res.LargestBond, len(res.Sweeps), seconds)
	require.Equal(t, dmrg.Converged, res.Verdict, res.Reason)
	require.InDelta(t, w.want, res.Energy, w.relative*scale)
	require.LessOrEqual(t, math.Abs(res.EnergyLimit-w.want), res.EnergyError+oracleRounding*scale, "error estimate")
	return res
}

// observableWish is what searches are asked for where everythingElse judges. The margin is for observables that add up small
// changes of many sites.
const observableWish = everythingElse / 4

// oracleRounding is the relative size to which the exact energies are known.
const oracleRounding = 1e-13

// requireEntropies compares the von Neumann entropies of all cuts.
func requireEntropies(t *testing.T, want []float64, res *dmrg.Result) {
	t.Helper()
	cuts := entanglement.Cuts(res.State)
	require.Len(t, cuts.Entropy, len(want))
	for b := range want {
		require.InDelta(t, want[b], cuts.Entropy[b], everythingElse, "entropy of cut %d", b)
	}
}

// values reads a formula at all its places, complex.
func values(t *testing.T, res *dmrg.Result, formula string, each ladder.Each) []complex128 {
	t.Helper()
	f, err := observables.Everywhere(context.Background(), res.State, formula, each)
	require.NoError(t, err)
	out := make([]complex128, len(f.Values))
	for i, x := range f.Values {
		out[i] = complex(x, 0)
		if f.Imag != nil {
			out[i] = complex(x, f.Imag[i])
		}
	}
	return out
}
