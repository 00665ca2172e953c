package examples

import (
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
)

// The figures of the bundled file. Energy and bonds were found by this program at precision 1e-11 and are good to the last digit shown; the sum
// rules below are exact, and the smaller ladders are checked against exact diagonalization.
func TestFrustratedLadder(t *testing.T) {
	s, r, _ := solve(t, "frustrated-ladder")
	require.Equal(t, "real", r.Model.Arithmetic)
	require.InDelta(t, -14.0974834748, s.EnergyLimit, 1e-8)
	require.LessOrEqual(t, s.EnergyError, 1e-8)
	rungs, diagonals, bonds := s.values(t, "rung singlets"), s.values(t, "diagonal singlets"), s.values(t, "leg bonds")
	require.InDelta(t, 0.7978511, rungs["7"], 2e-6)
	require.InDelta(t, 0.0801242, diagonals["7"], 2e-6)
	along := s.Observations["along leg a"]
	require.Len(t, along, 12)
	require.InDelta(t, 0.75, along[0].Value, 1e-12)

	// The Hamiltonian is a sum of what is observed.
	energy := 0.8*sum(bonds) + 1.0*(16*0.25-sum(rungs)) + 0.7*(15*0.25-sum(diagonals))
	require.InDelta(t, s.Energy, energy, 1e-9)
	// The ladder turned by half a turn about its middle is itself.
	for j := range 16 {
		require.InDelta(t, rungs[onRung(j)], rungs[onRung(15-j)], 1e-6)
	}
	for j := range 15 {
		require.InDelta(t, bonds[onLegs(j, "a")], bonds[onLegs(14-j, "b")], 1e-5)
	}
}

// At Jdiag = 2 Jleg, not above Jrung, the rung singlets are the exact ground state: -3/4 Jrung a rung (Shastry, Sutherland 1981, from memory).
// That they are an eigenstate is seen in a line: on a singlet S_b = -S_a, so the legs and the diagonal between two of them cancel.
func TestFrustratedLadderExactLine(t *testing.T) {
	s, _, _ := solve(t, "frustrated-ladder", "Jrung = 1.0", "Jrung = 1.7", "Jdiag = 0.7", "Jdiag = 1.6")
	require.InDelta(t, -0.75*1.7*16, s.EnergyLimit, 1e-8)
	for j, p := range s.values(t, "rung singlets") {
		require.InDelta(t, 1, p, 1e-7, j)
	}
	for j, p := range s.values(t, "diagonal singlets") {
		require.InDelta(t, 0.25, p, 1e-7, j)
	}
	for _, c := range s.Entanglement.Cuts {
		if c.RungEdge {
			require.InDelta(t, 0, c.Entropy, 1e-7, c.AfterSite)
		} else {
			require.InDelta(t, 0.6931471805599453, c.Entropy, 1e-7, c.AfterSite)
		}
	}
}

// spinLadder is the frustrated ladder by exact diagonalization, in the sector of the given 2 S^z.
func spinLadder(t *testing.T, rungs, twiceSz int) (*exact.Basis, exact.Level) {
	t.Helper()
	var sites []exact.Site
	for range 2 * rungs {
		sites = append(sites, exact.Spin(1))
	}
	basis, err := exact.NewBasis(sites, []exact.Number{exact.TwiceSz(sites)}, []int{twiceSz})
	require.NoError(t, err)
	var h []exact.Term
	for j := range rungs {
		h = append(h, heisenberg(1.0, 2*j, 2*j+1)...)
		if j+1 < rungs {
			h = append(h, heisenberg(0.8, 2*j, 2*j+2)...)
			h = append(h, heisenberg(0.8, 2*j+1, 2*j+3)...)
			h = append(h, heisenberg(0.7, 2*j, 2*j+3)...)
		}
	}
	matrix, err := basis.Matrix(h...)
	require.NoError(t, err)
	ground, _, err := matrix.Ground()
	require.NoError(t, err)
	return basis, ground
}

// heisenberg is c S_i.S_k.
func heisenberg(c complex128, i, k int) []exact.Term {
	return append(exact.WithAdjoints(exact.T(c/2, "S^+", i, "S^-", k)), exact.T(c, "S^z", i, "S^z", k))
}

func TestFrustratedLadderSmall(t *testing.T) {
	for _, sz := range []int{0, 1} {
		basis, ground := spinLadder(t, 6, 2*sz)
		s, _, _ := solve(t, "frustrated-ladder", "rungs    = 16", "rungs    = 6", "Sz = 0", "Sz = "+onRung(sz))
		require.InDelta(t, ground.Energy, s.EnergyLimit, 1e-8)
		bond := func(i, k int) float64 { return real(basis.Expect(ground.Vector, heisenberg(1, i, k)...)) }
		rungs, diagonals, bonds := s.values(t, "rung singlets"), s.values(t, "diagonal singlets"), s.values(t, "leg bonds")
		for j := range 6 {
			require.InDelta(t, 0.25-bond(2*j, 2*j+1), rungs[onRung(j)], 1e-5)
			if j < 5 {
				require.InDelta(t, 0.25-bond(2*j, 2*j+3), diagonals[onRung(j)], 1e-5)
				require.InDelta(t, bond(2*j, 2*j+2), bonds[onLegs(j, "a")], 1e-5)
				require.InDelta(t, bond(2*j+1, 2*j+3), bonds[onLegs(j, "b")], 1e-5)
			}
		}
		entropies, err := basis.Entropies(ground.Vector)
		require.NoError(t, err)
		for _, c := range s.Entanglement.Cuts {
			require.InDelta(t, entropies[c.AfterSite], c.Entropy, 1e-5)
		}
	}
}
