package dmrg

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// productEngine stands on the product state that a search begins with.
func productEngine[T dense.Scalar](t *testing.T, h *ladder.Hamiltonian, sector ladder.Sector, threads int) *engine[T] {
	t.Helper()
	p, err := newProblem(h, sector, Options{Complex: dense.IsComplex[T](), Threads: threads})
	require.NoError(t, err)
	op, err := mpo.Build[T](p.strings, mpo.Options{})
	require.NoError(t, err)
	psi, err := productChain[T](p, p.target.Charge)
	require.NoError(t, err)
	e := newEngine(op, psi, p.opt, func() error { return nil })
	require.NoError(t, e.prepare())
	return e
}

// TestOneSiteSweeps goes from a product state to the energy that two-site sweeps reach, at a bond that holds all of the sector, and checks
// on the way what each kind of sweep promises.
func TestOneSiteSweeps(t *testing.T) {
	t.Run("spins", func(t *testing.T) { testOneSiteSweeps[float64](t, heisenberg(t, 10), ladder.Sector{"Sz": 0}) })
	t.Run("bosons in a flux", func(t *testing.T) {
		h := hamiltonian(t, 4, ladder.Open, []ladder.Site{ladder.Boson(2), ladder.Boson(2)}, fluxTerms...)
		testOneSiteSweeps[complex128](t, h, ladder.Sector{"N": 4})
	})
	t.Run("electrons", func(t *testing.T) {
		h := hamiltonian(t, 6, ladder.Open, one(ladder.Electron()), "-(c_up^+[a,j] c_up[a,j+1] + c_down^+[a,j] c_down[a,j+1]) + h.c.", "4 n_up[a,j] n_down[a,j]")
		testOneSiteSweeps[float64](t, h, ladder.Sector{"N": 6, "Sz": 0})
	})
}

func testOneSiteSweeps[T dense.Scalar](t *testing.T, h *ladder.Hamiltonian, sector ladder.Sector) {
	const enough = 300
	two := productEngine[T](t, h, sector, 1)
	var want outcome
	for range 12 {
		out, err := two.sweep(setting{bond: enough, weight: 1e-28, perturbation: 1e-4, vectors: 12, tolerance: 1e-11})
		require.NoError(t, err)
		want = out
	}

	e, again := productEngine[T](t, h, sector, 1), productEngine[T](t, h, sector, 2)
	energies := func(s setting, sweeps int) (last float64) {
		before := math.Inf(1)
		e.onBond = func(p Position) {
			require.InDelta(t, energyOf(t, e), dense.Real(mpo.Expectation(e.psi, e.op, nil)), 1e-11, "bond %d: environments", p.Bond)
			require.InDelta(t, 1, e.psi.Norm(), 1e-12)
			if s.update == OneSite {
				require.LessOrEqual(t, p.Energy, before+1e-11, "bond %d", p.Bond)
				before = p.Energy
			}
		}
		for range sweeps {
			out, err := e.sweep(s)
			require.NoError(t, err)
			same, err := again.sweep(s)
			require.NoError(t, err)
			require.Equal(t, out.energy, same.energy, "two threads")
			require.LessOrEqual(t, out.largest, s.bond)
			require.Equal(t, isometries(e.psi), 0)
			last = out.energy
		}
		return last
	}
	s := setting{bond: 6, weight: 1e-28, vectors: 12, tolerance: 1e-11, update: Expanding}
	rough := energies(s, 3)
	s.update = OneSite
	require.LessOrEqual(t, energies(s, 2), rough+1e-11)
	s.bond, s.update = enough, Expanding
	require.InDelta(t, want.energy, energies(s, 8), 1e-10)
}

// isometries counts the sites that break the promise of the centre.
func isometries[T dense.Scalar](c *mps.Chain[T]) (broken int) {
	for i, a := range c.Sites {
		if i == c.Center {
			continue
		}
		overlap := block.Contract(a, a.Conj(), []int{1, 2}, []int{1, 2})
		if i < c.Center {
			overlap = block.Contract(a.Conj(), a, []int{0, 1}, []int{0, 1})
		}
		overlap.Axpy(dense.FromFloat[T](-1), block.Identity[T](a.Group, overlap.Axes[0]))
		if overlap.Norm() > 1e-11 {
			broken++
		}
	}
	return broken
}
