package calibration

import (
	"math"
	"math/cmplx"
	"math/rand/v2"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// diagonal makes a model that is diagonalized in the sector of the given numbers.
func diagonal(name string, hard bool, l lattice, terms []exact.Term, local []string, numbers []exact.Number, values []int) Model {
	return Model{Name: name, Source: "exact diagonalization", Hard: hard, Local: local, Finest: 1e-9, lattice: l, terms: terms,
		answer: func(*Model) (Answer, error) { return diagonalized(l, terms, local, numbers, values) }}
}

func diagonalized(l lattice, terms []exact.Term, local []string, numbers []exact.Number, values []int) (Answer, error) {
	b, err := exact.NewBasis(l.all(), numbers, values)
	if err != nil {
		return Answer{}, err
	}
	h, err := b.Matrix(terms...)
	if err != nil {
		return Answer{}, err
	}
	ground, gap, err := h.Ground()
	if err != nil || gap < uniqueGap {
		return Answer{Energy: ground.Energy}, err
	}
	a := Answer{Energy: ground.Energy}
	for i := range l.sites() - l.legs*(len(local)-1) {
		t := exact.Term{Coef: 1}
		for k, op := range local {
			t.Ops = append(t.Ops, exact.Op{Name: op, Site: i + k*l.legs})
		}
		a.Local = append(a.Local, b.Expect(ground.Vector, t))
	}
	if first, second, norm := l.far(); norm > 0 {
		for _, j := range l.farSites() {
			a.Far = append(a.Far, b.Expect(ground.Vector, exact.T(1, first, l.at(0, l.origin()), second, j)))
		}
	}
	a.Entropies, err = b.Entropies(ground.Vector)
	return a, err
}

// particles makes a model with a number of particles.
func particles(name string, hard bool, l lattice, n int, terms []exact.Term) Model {
	sites := l.all()
	m := diagonal(name, hard, l, terms, []string{"n", "n"}, []exact.Number{exact.Particles(sites)}, []int{n})
	m.Sector = ladder.Sector{"N": n}
	return m
}

// hops lists -strength op^+_to op_from with their adjoints.
func hops(op string, strength complex128, to, from int) []exact.Term {
	return exact.WithAdjoints(exact.T(-strength, op+"^+", to, op, from))
}

// fluxLadder lists hoppings of one species on a ladder with a flux a plaquette and a rung hopping, and a repulsion u/2 n (n - 1) where there is one.
func fluxLadder(op string, l lattice, phi, k, u float64) []exact.Term {
	var out []exact.Term
	for j := range l.rungs {
		for leg := range l.legs {
			i := l.at(leg, j)
			if leg+1 < l.legs {
				out = append(out, hops(op, complex(k, 0), i, i+1)...)
			}
			if j+1 < l.rungs {
				angle := phi * (float64(leg) - float64(l.legs-1)/2)
				out = append(out, hops(op, cmplx.Exp(complex(0, angle)), l.at(leg, j+1), i)...)
			}
			if u != 0 {
				out = append(out, exact.T(complex(u/2, 0), "n", i, "n", i), exact.T(complex(-u/2, 0), "n", i))
			}
		}
	}
	return out
}

// neighbours adds v n n on neighbouring sites of a chain.
func neighbours(n int, v float64) []exact.Term {
	var out []exact.Term
	for j := range n - 1 {
		out = append(out, exact.T(complex(v, 0), "n", j, "n", j+1))
	}
	return out
}

// energies adds random energies between -w and w.
func energies(n int, w float64, seed uint64) []exact.Term {
	rng := rand.New(rand.NewPCG(seed, 10))
	var out []exact.Term
	for j := range n {
		out = append(out, exact.T(complex(w*(2*rng.Float64()-1), 0), "n", j))
	}
	return out
}

// diagonalizedModels are spins, bosons, fermions and clocks that are diagonalized.
func diagonalizedModels() []Model {
	hard, soft, f := exact.Boson(1), exact.Boson(2), exact.Fermion()
	at := func(s exact.Site, rungs int) lattice { return lattice{s, 2, rungs} }
	bosons := func(n int, u float64) []exact.Term { return fluxLadder("b", chain(soft, n), 0, 0, u) }
	out := []Model{
		particles("hard-core bosons, flux ladder, three of twelve", true, at(hard, 6), 3, fluxLadder("b", at(hard, 6), 0.8*math.Pi, 0.3, 0)),
		particles("hard-core bosons, flux ladder, half filled", true, at(hard, 6), 6, fluxLadder("b", at(hard, 6), 0.5*math.Pi, 1, 0)),
		particles("hard-core bosons, flux ladder, vortices", true, at(hard, 7), 4, fluxLadder("b", at(hard, 7), 0.9*math.Pi, 0.6, 0)),
		particles("bosons, flux ladder", true, at(soft, 4), 5, fluxLadder("b", at(soft, 4), 0.8, 1, 4)),
		particles("bosons, pi flux", true, at(soft, 4), 4, fluxLadder("b", at(soft, 4), math.Pi, 0.7, 2)),
		particles("bosons, chain", false, chain(soft, 8), 8, bosons(8, 3)),
		particles("bosons, disordered chain", true, chain(soft, 8), 7, join(bosons(8, 2), energies(8, 2, 5))),
		particles("fermions that repel, half filled", false, chain(f, 14), 7, join(fluxLadder("c", chain(f, 14), 0, 0, 0), neighbours(14, 1.5))),
		particles("fermions that attract", false, chain(f, 14), 5, join(fluxLadder("c", chain(f, 14), 0, 0, 0), neighbours(14, -1.8))),
		particles("fermions that repel, flux ladder, disordered", true, at(f, 6), 6,
			join(fluxLadder("c", at(f, 6), 1.9, 0.8, 0), energies(12, 1, 6), neighbours(12, 0.7))),
		electrons("electrons, flux ladder", true, at(exact.Electron(true), 3), 3, 2),
	}
	return append(out, clocks("clock chain, three states", false, 3, 7, 1, 0), clocks("chiral clock chain", true, 3, 7, 1.1, 0.4),
		clocks("clock chain, four states", false, 4, 6, 0.9, 0))
}

// electrons on a ladder with a flux, seen by both components.
func electrons(name string, hard bool, l lattice, up, down int) Model {
	terms := join(fluxLadder("c_up", l, 1.1, 0.9, 0), fluxLadder("c_down", l, 1.1, 0.9, 0))
	for i := range l.sites() {
		terms = append(terms, exact.T(3, "n_up", i, "n_down", i))
	}
	sites := l.all()
	m := diagonal(name, hard, l, terms, []string{"n"}, []exact.Number{exact.UpParticles(sites), exact.DownParticles(sites)}, []int{up, down})
	m.Sector = ladder.Sector{"N": up + down, "Sz": float64(up-down) / 2}
	return m
}

// clocks is -exp(i chi) X_j^+ X_{j+1} - h Z_j + h.c., with q states, in the sector Q = 0.
func clocks(name string, hard bool, q, n int, field, chi float64) Model {
	l := chain(exact.Clock(q), n)
	var terms []exact.Term
	for j := range n {
		terms = append(terms, exact.WithAdjoints(exact.T(complex(-field, 0), "Z", j))...)
		if j+1 < n {
			terms = append(terms, exact.WithAdjoints(exact.T(-cmplx.Exp(complex(0, chi)), "X^+", j, "X", j+1))...)
		}
	}
	m := diagonal(name, hard, l, terms, []string{"Z"}, []exact.Number{exact.ClockCharge(l.all(), q)}, []int{0})
	m.Sector = ladder.Sector{"Q": 0}
	return m
}
