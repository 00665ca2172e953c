package calibration

import (
	"context"
	"math"

	"rundle/dmrg"
	"rundle/entanglement"
	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// tenfold makes a model whose answer is a search at ten times the largest cap.
func tenfold(name string, hard bool, l lattice, sector ladder.Sector, local []string, terms []exact.Term, caps ...int) Model {
	return Model{Name: name, Source: "tenfold bond dimension", Hard: hard, Sector: sector, Local: local, Finest: math.Inf(1), Caps: caps, lattice: l, terms: terms, answer: searched}
}

// searchedTo is the wish of the searches that give answers.
const searchedTo = 1e-8

func searched(m *Model) (Answer, error) {
	h, err := m.Hamiltonian()
	if err != nil {
		return Answer{}, err
	}
	r, err := dmrg.Ground(context.Background(), h, m.Sector, dmrg.Options{Precision: searchedTo, ObservablePrecision: 1e-5, Bond: 10 * m.Caps[len(m.Caps)-1], Threads: 1})
	if err != nil {
		return Answer{}, err
	}
	a := Answer{Energy: r.EnergyLimit, Loose: r.EnergyError, Entropies: entanglement.Cuts(r.State).Entropy}
	if a.Local, err = locals(r.State, m.Local); err == nil {
		a.Far, err = correlations(r.State, m.lattice)
	}
	return a, err
}

// searchedModels lie beyond all other means.
func searchedModels() []Model {
	two := lattice{exact.Spin(1), 2, 12}
	var strip []exact.Term
	for j := range 12 {
		strip = append(strip, dot(0.5, 1, 2*j, 2*j+1)...)
		if j+1 < 12 {
			strip = append(strip, join(dot(1, 1, 2*j, 2*j+2), dot(1, 1, 2*j+1, 2*j+3), dot(0.45, 1, 2*j, 2*j+3), dot(0.45, 1, 2*j+1, 2*j+2))...)
		}
	}
	hard := lattice{exact.Boson(1), 2, 12}
	flat := ladder.Sector{"Sz": 0}
	return []Model{
		tenfold("frustrated spin ladder, 24 spins", true, two, flat, []string{"S^z", "S^z"}, strip, 6, 12),
		tenfold("frustrated chain, 32 spins, J2 = 0.4", true, chain(exact.Spin(1), 32), flat, []string{"S^z", "S^z"}, join(bonds(32, 1, 1, 1), bonds(32, 2, 0.4, 1)), 6, 12),
		tenfold("hard-core bosons, flux ladder, 24 sites", true, hard, ladder.Sector{"N": 8}, []string{"n", "n"}, fluxLadder("b", hard, 0.8*math.Pi, 0.8, 0), 6, 12),
		tenfold("bosons, chain of 16", false, chain(exact.Boson(2), 16), ladder.Sector{"N": 16}, []string{"n", "n"}, fluxLadder("b", chain(exact.Boson(2), 16), 0, 0, 3), 6, 12),
	}
}

// Models lists the whole set.
func Models() []Model {
	var out []Model
	for _, list := range [][]Model{freeModels(), closedModels(), betheModels(), spinModels(), diagonalizedModels(), searchedModels(), heldBackModels()} {
		out = append(out, list...)
	}
	for i := range out {
		if m := &out[i]; m.Caps == nil {
			m.Caps = []int{8, 14, 24}
		}
	}
	return out
}
