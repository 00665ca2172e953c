package dmrg

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// TestLargerTraps are traps beyond diagonalization, with energies known by other means, begun in random product states as well.
func TestLargerTraps(t *testing.T) { testLargerTraps(t, 3) }

func testLargerTraps(t *testing.T, starts int) {
	good, suspect := 0, 0
	rng := rand.New(rand.NewPCG(9, 10))
	for _, trap := range []trap{longWeakLink(t), manySinglets(t), disorderedLadder(t)} {
		t.Run(trap.name, func(t *testing.T) {
			for i := range starts {
				opt := Options{Precision: 1e-7}
				if i > 0 {
					states := slices.Clone(trap.starts[0])
					if i > 1 {
						rng.Shuffle(len(states), func(a, b int) { states[a], states[b] = states[b], states[a] })
					}
					opt.Start = product(t, trap.h, nil, states)
				}
				r := ground1(t, trap.h, trap.sector, opt)
				off := r.EnergyLimit - trap.energy
				t.Logf("start %d: off by %.1e ± %.1e, %s %s, escapes %d, %d sweeps", i, off, r.EnergyError, r.Verdict, r.Reason, r.Escapes, len(r.Sweeps))
				if r.Verdict == Converged {
					good++
					require.LessOrEqual(t, off, max(r.EnergyError, opt.Precision), "a wrong state is called converged")
				} else {
					suspect++
				}
			}
		})
	}
	require.LessOrEqual(t, 20*suspect, good+suspect)
}

// longWeakLink is two free chains of twenty sites; the first start has the wrong split.
func longWeakLink(t *testing.T) trap {
	const n = 40
	var b trapBuilder
	q := exact.NewQuadratic(n)
	for j := range n - 1 {
		x := -1.0
		if j == n/2-1 {
			x = -1e-6
		}
		b.hop("c", x, chainSite, j+1, j)
		q.Hop(j+1, j, complex(x, 0))
	}
	g, err := q.Filled(20)
	require.NoError(t, err)
	start := make([]int, n)
	for j := range 20 {
		start[j] = 1
	}
	return trap{"wrong split, long", hamiltonian(t, n, ladder.Open, one(ladder.Fermion()), b.formulas...), ladder.Sector{"N": 20}, g.Energy, [][]int{start}}
}

// manySinglets is a ladder of conserved rung spins in its phase of rung singlets, -3/4 of the rung coupling each; the start has triplets.
func manySinglets(t *testing.T) trap {
	const rungs, rung = 16, 2.2
	var b trapBuilder
	start := make([]int, 2*rungs)
	for j := range rungs {
		b.spins(rung, 1, ladderSite, 2*j, 2*j+1)
		for l := 0; l < 4 && j+1 < rungs; l++ {
			b.spins(1, 1, ladderSite, 2*j+l%2, 2*j+2+l/2)
		}
		start[2*j], start[2*j+1] = j%2, j%2
	}
	legs := []ladder.Site{ladder.Spin(1), ladder.Spin(1)}
	return trap{"triplets, long", hamiltonian(t, rungs, ladder.Open, legs, b.formulas...), ladder.Sector{"Sz": 0}, -0.75 * rung * rungs, [][]int{start}}
}

// disorderedLadder is free fermions on a ladder whose potential varies by much more than they hop.
func disorderedLadder(t *testing.T) trap {
	const rungs = 16
	rng := rand.New(rand.NewPCG(7, 8))
	var b trapBuilder
	q := exact.NewQuadratic(2 * rungs)
	start := make([]int, 2*rungs)
	for i := range 2 * rungs {
		w := 8 * (rng.Float64() - 0.5)
		b.add(fmt.Sprintf("%.17g n%s", w, ladderSite(i)))
		q.Energy(i, w)
		if i%2 == 0 {
			b.hop("c", -0.2, ladderSite, i, i+1)
			q.Hop(i, i+1, -0.2)
		}
		if i+2 < 2*rungs {
			b.hop("c", -0.2, ladderSite, i+2, i)
			q.Hop(i+2, i, -0.2)
		}
		if i < rungs {
			start[i] = 1
		}
	}
	g, err := q.Filled(rungs)
	require.NoError(t, err)
	legs := []ladder.Site{ladder.Fermion(), ladder.Fermion()}
	return trap{"strong disorder, long", hamiltonian(t, rungs, ladder.Open, legs, b.formulas...), ladder.Sector{"N": rungs}, g.Energy, [][]int{start}}
}
