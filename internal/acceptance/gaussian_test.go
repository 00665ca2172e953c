package acceptance

import (
	"context"
	"fmt"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/dmrg"
	"rundle/internal/exact"
	"rundle/mpo/ladder"
	"rundle/observables"
)

// gaussian is a ladder of free fermions with a gap: complex hoppings (a flux through every plaquette that no gauge removes),
// an energy that alternates from site to site and some disorder; pairing adds complex pairs along the legs.
type gaussian struct {
	rungs, legs int
	pairing     bool
	odd         bool // with pairing: the sector of odd parity
}

// Couplings of the ladder. The staggered energy makes the gap; the phases are neither 0 nor pi in sum around a plaquette.
const (
	gaussianStagger  = 2.0
	gaussianDisorder = 0.3
)

var (
	gaussianLeg  = []complex128{0.8 * cmplx.Exp(0.7i), 0.6 * cmplx.Exp(-1.1i), 0.7 * cmplx.Exp(0.2i)}
	gaussianRung = []complex128{0.5 * cmplx.Exp(0.4i), 0.6 * cmplx.Exp(2.0i)}
	gaussianPair = []complex128{0.4 * cmplx.Exp(1.3i), 0.3 * cmplx.Exp(-0.6i), 0.35 * cmplx.Exp(0.9i)}
)

// build writes the ladder down twice, as formulas and for the oracle.
func (g gaussian) build(t *testing.T) (*ladder.Hamiltonian, *exact.Quadratic) {
	names := []string{"a", "b", "d"}[:g.legs]
	var parts []ladder.Part
	for _, n := range names {
		parts = append(parts, ladder.Leg(n, ladder.Fermion()))
	}
	lad, err := ladder.New(g.rungs, ladder.Open, parts...)
	require.NoError(t, err)
	rng := rand.New(rand.NewPCG(uint64(g.rungs), uint64(g.legs)))
	q := exact.NewQuadratic(lad.Sites())
	energies := make([]float64, lad.Sites())
	for i := range energies {
		leg, rung := i%g.legs, i/g.legs
		energies[i] = gaussianStagger*float64(1-2*((leg+rung)%2)) + gaussianDisorder*(2*rng.Float64()-1)
		q.Energy(i, energies[i])
	}
	scope, err := ladder.NewScope(lad, nil, ladder.Profile{Name: "h", Values: energies})
	require.NoError(t, err)
	out := []ladder.Term{{Formula: "h[l,j] n[l,j]", Each: ladder.Each{"l": "legs"}}}
	add := func(z complex128, format string, args ...any) {
		out = append(out, ladder.Term{Formula: formulaOf(z) + " " + fmt.Sprintf(format, args...) + " + h.c."})
	}
	for l, n := range names {
		add(gaussianLeg[l], "c^+[%s,j+1] c[%s,j]", n, n)
		if g.pairing {
			add(gaussianPair[l], "c^+[%s,j+1] c^+[%s,j]", n, n)
		}
		if l+1 < g.legs {
			add(gaussianRung[l], "c^+[%s,j] c[%s,j]", n, names[l+1])
		}
		for j := range g.rungs {
			i := j*g.legs + l
			if j+1 < g.rungs {
				q.Hop(i+g.legs, i, gaussianLeg[l])
				if g.pairing {
					q.Pair(i+g.legs, i, gaussianPair[l])
				}
			}
			if l+1 < g.legs {
				q.Hop(i, i+1, gaussianRung[l])
			}
		}
	}
	h, err := scope.Hamiltonian(out...)
	require.NoError(t, err)
	return h, q
}

// run compares energy, densities, two-point functions and entropies with the correlation matrix (Peschel 2003).
func (g gaussian) run(t *testing.T) {
	h, q := g.build(t)
	frames, err := h.Frames(ladder.FrameOptions{})
	require.NoError(t, err)
	require.False(t, frames.Real)
	n := h.Ladder().Sites()
	sector := ladder.Sector{"N": n / 2}
	var want *exact.Gaussian
	if g.pairing {
		parity := 0
		if g.odd {
			parity = 1
		}
		sector = ladder.Sector{"P": parity}
		want, err = q.Lowest(g.odd)
	} else {
		want, err = q.Filled(n / 2)
	}
	require.NoError(t, err)
	smallest := 1.0
	if g.odd {
		smallest = 1e-3 // one quasiparticle in a band
	}
	require.Greater(t, want.Gap, smallest)
	res := requireGround(t, h, sector, wish{relative: 1e-10, want: want.Energy, largest: gaussianStagger, observables: observableWish})

	for i, v := range values(t, res, "n[l,j]", ladder.Each{"l": "legs"}) {
		require.InDelta(t, want.Density(i), real(v), everythingElse, "density of site %d", i)
	}
	requireTwoPoint(t, want, res, "c^+", "c")
	requireTwoPoint(t, want, res, "n", "n")
	if g.pairing {
		requireTwoPoint(t, want, res, "c", "c")
	}
	entropies, err := want.Entropies(1)
	require.NoError(t, err)
	requireEntropies(t, entropies, res)
}

func requireTwoPoint(t *testing.T, want *exact.Gaussian, res *dmrg.Result, first, second string) {
	t.Helper()
	each := ladder.Each{"l": "legs"}
	p, err := observables.AllPairs(context.Background(), res.State,
		ladder.Term{Formula: first + "[l,j]", Each: each}, ladder.Term{Formula: second + "[l,j]", Each: each})
	require.NoError(t, err)
	lad := res.State.Scope().Ladder()
	require.Len(t, p.Values, lad.Sites())
	for x, row := range p.Values {
		require.Len(t, row, lad.Sites())
		i := siteOf(t, lad, p.AtFirst[x])
		for y, got := range row {
			k := siteOf(t, lad, p.AtSecond[y])
			if d := cmplx.Abs(got - want.TwoPoint(first, i, second, k)); !(d <= everythingElse) {
				require.InDelta(t, 0, d, everythingElse, "<%s_%d %s_%d>", first, i, second, k)
			}
		}
	}
}

// siteOf is the site of the indices l and j.
func siteOf(t *testing.T, lad *ladder.Ladder, place []ladder.IndexValue) int {
	t.Helper()
	var leg string
	var rung int
	for _, v := range place {
		if v.Name == "l" {
			leg = v.Leg
		} else {
			rung = int(v.Number)
		}
	}
	i, ok := lad.SiteIndex(leg, rung)
	require.True(t, ok)
	return i
}

func (g gaussian) String() string {
	return fmt.Sprintf("%dx%d/pairing=%t/odd=%t", g.legs, g.rungs, g.pairing, g.odd)
}

func TestGaussian(t *testing.T) {
	for _, g := range []gaussian{
		{rungs: 32, legs: 2},
		{rungs: 6, legs: 3},
		{rungs: 12, legs: 2, pairing: true},
		{rungs: 8, legs: 2, pairing: true, odd: true},
	} {
		t.Run(g.String(), g.run)
	}
}
