package calibration

import (
	"fmt"
	"math"
	"math/rand/v2"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// heldBackModels are of the same kinds as the others with other sizes, couplings, fillings and disorder. No constant may be set by what comes out for them; once one was
// looked at to that end, write others.
func heldBackModels() []Model {
	var out []Model
	for _, list := range [][]Model{heldBackFree(), heldBackChains(), heldBackSpins(), heldBackParticles()} {
		out = append(out, list...)
	}
	for i := range out {
		out[i].HeldBack = true
	}
	return out
}

func heldBackFree() []Model {
	f := exact.Fermion()
	two, three := lattice{f, 2, 13}, lattice{f, 3, 7}
	const n = 24
	rng := rand.New(rand.NewPCG(21, 8))
	couplings := make([]float64, n-1)
	var exchange []exact.Term
	for j := range couplings {
		couplings[j] = 0.3 + rng.Float64()
		exchange = append(exchange, exact.WithAdjoints(exact.T(complex(couplings[j]/2, 0), "S^+", j, "S^-", j+1))...)
	}
	return []Model{
		free("free chain, 70 sites, 21 particles", false, chain(f, 70), 21, 1e-6, func(q *exact.Quadratic) { line(q, 70, 1, one) }),
		free("staggered chain, 80 sites", false, chain(f, 80), 40, 1e-8, func(q *exact.Quadratic) {
			line(q, 80, 1, one)
			for j := range 80 {
				q.Energy(j, 0.35*float64(1-2*(j%2)))
			}
		}),
		free("disordered chain, 48 sites", true, chain(f, 48), 20, 1e-8, func(q *exact.Quadratic) { line(q, 48, 1, one); disorder(q, 48, 0.8, 22) }),
		free("disordered ladder, 26 sites", true, two, 10, 1e-6, func(q *exact.Quadratic) { fluxRungs(q, two, 0, 1.1); disorder(q, 26, 1, 23) }),
		free("flux ladder, 26 sites", true, two, 9, 1e-6, func(q *exact.Quadratic) { fluxRungs(q, two, 2, 1.4) }),
		free("three legs, 21 sites", true, three, 8, 1e-6, func(q *exact.Quadratic) { fluxRungs(q, three, 1.5, 0.9) }),
		free("pairing chain, 50 sites", false, chain(f, 50), -1, 1e-8, func(q *exact.Quadratic) {
			line(q, 50, 1, one)
			for j := range 50 {
				q.Energy(j, -2.4)
				if j+1 < 50 {
					q.Pair(j, j+1, 1)
				}
			}
		}),
		asSpins("random exchange of x and y, 24 spins", true, n, n/2, 1e-7, func(q *exact.Quadratic) {
			for j, c := range couplings {
				q.Hop(j, j+1, complex(c/2, 0))
			}
		}, exchange),
	}
}

// heldBackChains are solved by their Bethe equations, see internal/exact.
func heldBackChains() []Model {
	half := func(n int) lattice { return chain(exact.Spin(1), n) }
	open := func(n, down int) Model {
		return known(fmt.Sprintf("Heisenberg chain, %d spins, %d down", n, down), "Bethe equations (Alcaraz et al. 1987)", half(n),
			ladder.Sector{"Sz": float64(n-2*down) / 2}, 1e-7, bonds(n, 1, 1, 1), func() (float64, error) { return exact.HeisenbergChain(n, down) })
	}
	ring := func(n int, delta, finest float64) Model {
		return known(fmt.Sprintf("anisotropic ring, %d spins, %g", n, delta), "Bethe equations (Yang, Yang 1966)", half(n), ladder.Sector{"Sz": 0}, finest,
			append(bonds(n, 1, 1, delta), dot(1, delta, 0, n-1)...), func() (float64, error) { return exact.AnisotropicRing(n, delta) })
	}
	return []Model{open(32, 16), open(36, 14), ring(12, 0.5, 1e-8), ring(16, -0.4, 1e-6), ring(20, 0.8, 1e-4)}
}

func heldBackSpins() []Model {
	s, unit := exact.Spin(1), exact.Spin(2)
	const n = 14
	two := lattice{s, 2, 6}
	var strip []exact.Term
	for j := range 6 {
		strip = append(strip, dot(1.8, 1, 2*j, 2*j+1)...)
		if j+1 < 6 {
			strip = append(strip, join(dot(1, 1, 2*j, 2*j+2), dot(0.6, 1, 2*j+1, 2*j+3), dot(0.5, 1, 2*j+1, 2*j+2))...)
		}
	}
	return []Model{
		spins("frustrated chain, J2 = 0.55, easy plane", true, chain(s, n), 0, join(bonds(n, 1, 1, 0.7), bonds(n, 2, 0.55, 0.7))),
		spins("frustrated spin ladder, unequal legs", true, two, 0, strip),
		spins("disordered Heisenberg chain, weak field", true, chain(s, n), 0, join(bonds(n, 1, 1, 1), randomField(n, 0.8, 24))),
		spins("spin-one chain, easy plane", false, chain(unit, 8), 0, bonds(8, 1, 1, 0.4)),
		spins("spin-one chain, next neighbours attract", false, chain(unit, 8), 0, join(bonds(8, 1, 1, 1), bonds(8, 2, -0.3, 1))),
	}
}

func heldBackParticles() []Model {
	f := exact.Fermion()
	at := func(s exact.Site, rungs int) lattice { return lattice{s, 2, rungs} }
	hard, soft := exact.Boson(1), exact.Boson(2)
	return []Model{
		particles("hard-core bosons, flux ladder, five of twelve", true, at(hard, 6), 5, fluxLadder("b", at(hard, 6), 0.3*math.Pi, 0.7, 0)),
		particles("bosons, flux ladder, strong repulsion", true, at(soft, 4), 4, fluxLadder("b", at(soft, 4), 1.7, 0.6, 8)),
		particles("bosons, chain of nine", false, chain(soft, 9), 5, fluxLadder("b", chain(soft, 9), 0, 0, 1.5)),
		particles("fermions that attract, disordered", true, chain(f, 14), 6, join(fluxLadder("c", chain(f, 14), 0, 0, 0), neighbours(14, -1), energies(14, 0.7, 26))),
		clocks("clock chain, five states", false, 5, 6, 0.7, 0),
		clocks("chiral clock chain, ordered side", true, 3, 7, 0.8, 0.6),
	}
}
