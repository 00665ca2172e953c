package examples

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
)

// cages is the rhombic chain with one fermion in each cage, by exact diagonalization. In the modes even, odd = (top ± bottom)/sqrt 2 the hub j hops
// to even j on its right and to odd j-1 on its left alone, with sqrt 2 t, and n_top + n_bottom = n_even + n_odd: cage j is {odd j-1, hub j, even j},
// its number is conserved, and its fermion is left of the hub, on it, or right of it. That is a spin 1 with the energy -2t S^x, at an end a spin 1/2
// with -2 sqrt 2 t S^x. Neighbours repel where one sits on its hub and the other on the side between them.
type cages struct {
	basis  *exact.Basis
	ground exact.Level
}

// at projects cage j on its fermion left of the hub (-1), on it (0) or right of it (1).
func (c cages) at(j, where int) exact.Op {
	first := -1
	if j == 0 {
		first = 0
	}
	return exact.Op{Site: j, Diagonal: func(state int) complex128 {
		if state == where-first {
			return 1
		}
		return 0
	}}
}

func (c cages) probability(j, where int) float64 {
	return real(c.basis.Expect(c.ground.Vector, exact.Term{Coef: 1, Ops: []exact.Op{c.at(j, where)}}))
}

func solveCages(t *testing.T, hubs int, v float64) cages {
	t.Helper()
	var c cages
	var sites []exact.Site
	var h []exact.Term
	for j := range hubs {
		twoS, field := 2, -2.0
		if j == 0 || j == hubs-1 {
			twoS, field = 1, -2*math.Sqrt2
		}
		sites = append(sites, exact.Spin(twoS))
		h = append(h, exact.T(complex(field, 0), "S^x", j))
		if j+1 < hubs {
			h = append(h, exact.Term{Coef: complex(v, 0), Ops: []exact.Op{c.at(j, 0), c.at(j+1, -1)}},
				exact.Term{Coef: complex(v, 0), Ops: []exact.Op{c.at(j, 1), c.at(j+1, 0)}})
		}
	}
	var err error
	c.basis, err = exact.NewBasis(sites, nil, nil)
	require.NoError(t, err)
	matrix, err := c.basis.Matrix(h...)
	require.NoError(t, err)
	c.ground, _, err = matrix.Ground()
	require.NoError(t, err)
	return c
}

// The bundled file at its full size: one fermion in each of nine cages, 8748 states.
func TestRhombicChain(t *testing.T) {
	s, r, _ := solve(t, "rhombic-chain")
	require.Equal(t, "real", r.Model.Arithmetic)
	c := solveCages(t, 9, 1.5)
	require.Equal(t, 8748, c.basis.Dim())
	require.InDelta(t, -13.85688284343, c.ground.Energy, 1e-10)
	require.InDelta(t, c.ground.Energy, s.EnergyLimit, 1e-9)
	hub, side := s.values(t, "hub density"), s.values(t, "side density")
	for j := range 9 {
		require.InDelta(t, c.probability(j, 0), hub[onRung(j)], 1e-6)
		if j < 8 {
			half := (c.probability(j, 1) + c.probability(j+1, -1)) / 2
			require.InDelta(t, half, side[onLegs(j, "top")], 1e-6)
			require.InDelta(t, half, side[onLegs(j, "bottom")], 1e-6)
		}
	}
	require.InDelta(t, 9, sum(hub)+sum(side), 1e-9)
	for j, n := range s.values(t, "fermions in a cage") {
		require.InDelta(t, 1, n, 1e-9, "cage %s", j)
	}
	for place, z := range s.values(t, "coherence") {
		var j, k int
		scan(t, place, &j, &k)
		if j != k {
			require.InDelta(t, 0, z, 1e-6, "no fermion leaves its cage: %s", place)
		}
	}
}

// Without repulsion each cage holds its fermion in its lowest level: -2t, at an end -sqrt(2) t.
func TestRhombicChainFree(t *testing.T) {
	s, _, _ := solve(t, "rhombic-chain", "V = 1.5", "V = 0.0")
	require.InDelta(t, -2*7-2*math.Sqrt2, s.EnergyLimit, 1e-9)
}

// The same ladder in its own sites, all distributions over the cages: the lowest has one fermion in each.
func TestRhombicChainSmall(t *testing.T) {
	const hubs = 4
	sites := make([]exact.Site, 3*hubs-2)
	for i := range sites {
		sites[i] = exact.Fermion()
	}
	basis, err := exact.NewBasis(sites, []exact.Number{exact.Particles(sites)}, []int{hubs})
	require.NoError(t, err)
	var h []exact.Term
	for j := range hubs - 1 {
		hub, top, bottom, next := 3*j, 3*j+1, 3*j+2, 3*j+3
		h = append(h, exact.WithAdjoints(
			exact.T(-1, "c^+", top, "c", hub), exact.T(-1, "c^+", bottom, "c", hub),
			exact.T(-1, "c^+", next, "c", top), exact.T(1, "c^+", next, "c", bottom))...)
		for _, i := range []int{hub, next} {
			h = append(h, exact.T(1.5, "n", i, "n", top), exact.T(1.5, "n", i, "n", bottom))
		}
	}
	matrix, err := basis.Matrix(h...)
	require.NoError(t, err)
	ground, _, err := matrix.Ground()
	require.NoError(t, err)
	require.InDelta(t, solveCages(t, hubs, 1.5).ground.Energy, ground.Energy, 1e-10)
	s, _, _ := solve(t, "rhombic-chain", "rungs    = 9", "rungs    = 4")
	require.InDelta(t, ground.Energy, s.EnergyLimit, 1e-9)
}
