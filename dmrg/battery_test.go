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
	"rundle/mpo/ladder"
	"rundle/mps"
)

// trap is a Hamiltonian with its exact ground energy and product states that a search is likely to stay near.
type trap struct {
	name   string
	h      *ladder.Hamiltonian
	sector ladder.Sector
	energy float64
	starts [][]int // local states, site by site
}

// trapBuilder adds terms to the Hamiltonian and to that of the oracle.
type trapBuilder struct {
	formulas []string
	terms    []exact.Term
}

// add takes a formula and its terms, which stand for themselves and their adjoints where the formula adds h.c.
func (b *trapBuilder) add(formula string, terms ...exact.Term) {
	b.formulas, b.terms = append(b.formulas, formula), append(b.terms, terms...)
}

func (b *trapBuilder) hop(kind string, x float64, site func(int) string, i, j int) {
	b.add(fmt.Sprintf("%.17g %s^+%s %s%s + h.c.", x, kind, site(i), kind, site(j)),
		exact.WithAdjoints(exact.T(complex(x, 0), kind+"^+", i, kind, j))...)
}

// spins adds J S_i.S_j, with the part along z multiplied by delta.
func (b *trapBuilder) spins(coupling, delta float64, site func(int) string, i, j int) {
	b.add(fmt.Sprintf("%.17g (S^+%s S^-%s + S^-%s S^+%s)", coupling/2, site(i), site(j), site(i), site(j)),
		exact.WithAdjoints(exact.T(complex(coupling/2, 0), "S^+", i, "S^-", j))...)
	b.add(fmt.Sprintf("%.17g S^z%s S^z%s", coupling*delta, site(i), site(j)), exact.T(complex(coupling*delta, 0), "S^z", i, "S^z", j))
}

func chainSite(i int) string  { return fmt.Sprintf("[a,%d]", i) }
func ladderSite(i int) string { return fmt.Sprintf("[%c,%d]", 'a'+i%2, i/2) }

// traps are small enough to be diagonalized, or solved by their orbitals.
func traps(t *testing.T) []trap {
	return []trap{weakLink(t), domainWalls(t), clusters(t), spirals(t), disorder(t), rungSpins(t), classical(t), farHops(t)}
}

// weakLink is two free chains that share their fermions over a link of 1e-6: the split is as good as conserved.
func weakLink(t *testing.T) trap {
	const n, half = 14, 7
	var b trapBuilder
	q := exact.NewQuadratic(n)
	for j := range n - 1 {
		x := -1.0
		if j == half-1 {
			x = -1e-6
		}
		b.hop("c", x, chainSite, j+1, j)
		q.Hop(j+1, j, complex(x, 0))
	}
	g, err := q.Filled(6)
	require.NoError(t, err)
	return trap{"wrong split over a weak link", hamiltonian(t, n, ladder.Open, one(ladder.Fermion()), b.formulas...), ladder.Sector{"N": 6}, g.Energy,
		[][]int{{1, 0, 1, 0, 1, 0, 1, 0, 0, 1, 0, 1, 0, 0}, {1, 0, 1, 0, 0, 0, 0, 1, 0, 1, 0, 1, 0, 1}, {1, 1, 1, 1, 1, 1, 0, 0, 0, 0, 0, 0, 0, 0}}}
}

func (b *trapBuilder) trap(t *testing.T, name string, rungs int, legs []ladder.Site, sites []exact.Site, n exact.Number, value int, sector ladder.Sector, starts ...[]int) trap {
	return trap{name, hamiltonian(t, rungs, ladder.Open, legs, b.formulas...), sector, diagonalized(t, sites, []exact.Number{n}, []int{value}, b.terms), starts}
}

// domainWalls is an easy-axis ferromagnet: with S^z = 0 one wall is best, two or three hardly move.
func domainWalls(t *testing.T) trap {
	const n = 12
	var b trapBuilder
	for j := range n - 1 {
		b.spins(-1, 6, chainSite, j, j+1)
	}
	sites := slices.Repeat([]exact.Site{exact.Spin(1)}, n)
	return b.trap(t, "domain walls", n, one(ladder.Spin(1)), sites, exact.TwiceSz(sites), 0, ladder.Sector{"Sz": 0},
		[]int{0, 0, 0, 1, 1, 1, 1, 1, 1, 0, 0, 0}, []int{0, 0, 0, 1, 1, 1, 0, 0, 0, 1, 1, 1}, []int{0, 1, 0, 1, 0, 1, 0, 1, 0, 1, 0, 1})
}

// clusters is phase separation: attracting fermions in one heap or in two.
func clusters(t *testing.T) trap {
	const n = 12
	var b trapBuilder
	for j := range n - 1 {
		b.hop("c", -0.15, chainSite, j+1, j)
		b.add(fmt.Sprintf("-n[a,%d] n[a,%d]", j, j+1), exact.T(-1, "n", j, "n", j+1))
	}
	sites := slices.Repeat([]exact.Site{exact.Fermion()}, n)
	return b.trap(t, "two heaps", n, one(ladder.Fermion()), sites, exact.Particles(sites), 6, ladder.Sector{"N": 6},
		[]int{1, 1, 1, 0, 0, 0, 0, 0, 0, 1, 1, 1}, []int{0, 1, 1, 1, 0, 0, 0, 1, 1, 1, 0, 0}, []int{1, 0, 1, 0, 1, 0, 1, 0, 1, 0, 1, 0})
}

// spirals is a frustrated chain whose correlations are incommensurate with every short period.
func spirals(t *testing.T) trap {
	const n = 12
	var b trapBuilder
	for j := range n - 1 {
		b.spins(-1, 1, chainSite, j, j+1)
		if j+2 < n {
			b.spins(0.6, 1, chainSite, j, j+2)
		}
	}
	sites := slices.Repeat([]exact.Site{exact.Spin(1)}, n)
	return b.trap(t, "spirals", n, one(ladder.Spin(1)), sites, exact.TwiceSz(sites), 0, ladder.Sector{"Sz": 0},
		[]int{0, 1, 0, 1, 0, 1, 0, 1, 0, 1, 0, 1}, []int{0, 0, 1, 1, 0, 0, 1, 1, 0, 0, 1, 1}, []int{0, 0, 0, 0, 0, 0, 1, 1, 1, 1, 1, 1})
}

// disorder is a ladder of interacting fermions whose potential varies by much more than they hop.
func disorder(t *testing.T) trap {
	const rungs = 6
	rng := rand.New(rand.NewPCG(5, 6))
	var b trapBuilder
	for i := range 2 * rungs {
		w := 8 * (rng.Float64() - 0.5)
		b.add(fmt.Sprintf("%.17g n%s", w, ladderSite(i)), exact.T(complex(w, 0), "n", i))
		if i%2 == 0 {
			b.hop("c", -0.3, ladderSite, i, i+1)
			b.add(fmt.Sprintf("2 n%s n%s", ladderSite(i), ladderSite(i+1)), exact.T(2, "n", i, "n", i+1))
		}
		if i+2 < 2*rungs {
			b.hop("c", -0.3, ladderSite, i+2, i)
		}
	}
	sites := slices.Repeat([]exact.Site{exact.Fermion()}, 2*rungs)
	legs := []ladder.Site{ladder.Fermion(), ladder.Fermion()}
	return b.trap(t, "strong disorder", rungs, legs, sites, exact.Particles(sites), 4, ladder.Sector{"N": 4},
		[]int{1, 1, 1, 1, 0, 0, 0, 0, 0, 0, 0, 0}, []int{0, 0, 0, 0, 0, 0, 0, 0, 1, 1, 1, 1}, []int{1, 0, 0, 1, 0, 0, 1, 0, 0, 0, 0, 1})
}

// rungSpins is a ladder whose rungs conserve their spin, for every spin couples to both of the next rung: pairs of triplets are exact eigenstates.
func rungSpins(t *testing.T) trap {
	const rungs = 6
	var b trapBuilder
	for j := range rungs {
		b.spins(1.6, 1, ladderSite, 2*j, 2*j+1)
		for l := 0; l < 4 && j+1 < rungs; l++ {
			b.spins(1, 1, ladderSite, 2*j+l%2, 2*j+2+l/2)
		}
	}
	sites := slices.Repeat([]exact.Site{exact.Spin(1)}, 2*rungs)
	legs := []ladder.Site{ladder.Spin(1), ladder.Spin(1)}
	return b.trap(t, "conserved triplets", rungs, legs, sites, exact.TwiceSz(sites), 0, ladder.Sector{"Sz": 0},
		[]int{0, 0, 1, 1, 0, 0, 1, 1, 0, 0, 1, 1}, []int{0, 0, 1, 1, 0, 1, 0, 1, 0, 0, 1, 1})
}

// classical has no term that moves anything: every product state is an exact eigenstate of no variance.
func classical(t *testing.T) trap {
	const n = 12
	h := hamiltonian(t, n, ladder.Open, one(ladder.Spin(1)), "S^z[a,j] S^z[a,j+1]")
	return trap{"nothing moves", h, ladder.Sector{"Sz": 0}, -0.25 * (n - 1),
		[][]int{{0, 1, 0, 1, 0, 0, 1, 0, 1, 1, 0, 1}, {0, 0, 1, 1, 0, 0, 1, 1, 0, 0, 1, 1}, {0, 1, 0, 1, 1, 0, 1, 0, 0, 1, 0, 1}}}
}

// farHops is three chains that neighbouring sites know nothing of; two of them are filled wrongly.
func farHops(t *testing.T) trap {
	h := hamiltonian(t, 12, ladder.Open, one(ladder.Fermion()), "-c^+[a,j+3] c[a,j] + h.c.")
	return trap{"far hops", h, ladder.Sector{"N": 6}, -3 * math.Sqrt(5), // levels 2 cos(k pi/5) of four sites, two of each chain filled
		[][]int{{1, 1, 0, 1, 1, 0, 1, 0, 0, 1, 0, 0}, {1, 0, 0, 1, 1, 0, 1, 0, 0, 1, 1, 0}}}
}

// product makes a start.
func product(t *testing.T, h *ladder.Hamiltonian, charges []string, states []int) *mps.State {
	frames, err := h.Frames(ladder.FrameOptions{Charges: charges})
	require.NoError(t, err)
	s, err := mps.ProductState(frames, h.Scope, states)
	require.NoError(t, err)
	return s
}

// TestTraps: a search that begins in a trap, or in an exact excited eigenstate, gets out or says that it is suspect; and those that begin nowhere in
// particular converge.
func TestTraps(t *testing.T) { testTraps(t, 1) }

func testTraps(t *testing.T, products int) {
	good, suspect, escaped := 0, 0, 0
	for _, trap := range traps(t) {
		t.Run(trap.name, func(t *testing.T) {
			var charges []string // those of the sector: what else is conserved must not be what keeps the start apart
			for name := range trap.sector {
				charges = append(charges, name)
			}
			starts := []*mps.State{nil}
			for _, s := range trap.starts[:min(products, len(trap.starts))] {
				starts = append(starts, product(t, trap.h, charges, s))
			}
			spectrum, err := Lowest(context.Background(), trap.h, trap.sector, 2, Options{Precision: 1e-8, Charges: charges})
			require.NoError(t, err)
			require.InDelta(t, trap.energy, spectrum.Levels[0].EnergyLimit, spectrum.Levels[0].EnergyError)
			if top := spectrum.Levels[len(spectrum.Levels)-1]; top.Gap > 1e-6 {
				starts = append(starts, top.State)
			}
			for i, start := range starts {
				// Perturbed sweeps leave these traps by themselves; without them every other search is left to the probes.
				opening := []Opening{PerturbedDensity, Unperturbed}[i%2]
				r := ground1(t, trap.h, trap.sector, Options{Precision: 1e-8, Start: start, Charges: charges, Opening: opening})
				off := r.EnergyLimit - trap.energy
				t.Logf("start %d: off by %.1e ± %.1e, %s %s, escapes %d, %d sweeps", i, off, r.EnergyError, r.Verdict, r.Reason, r.Escapes, len(r.Sweeps))
				if r.Verdict == Converged {
					require.LessOrEqual(t, math.Abs(off), max(r.EnergyError, 1e-12*math.Abs(trap.energy)), "start %d: a wrong state is called converged", i)
					good++
				} else {
					suspect++
				}
				escaped += r.Escapes
			}
		})
	}
	t.Logf("%d searches converged, %d did not, after %d escapes", good, suspect, escaped)
	require.LessOrEqual(t, 20*suspect, good+suspect)
}
