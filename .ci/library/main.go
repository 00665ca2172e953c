// Command library is what a user's program looks like: a two-leg flux ladder
// of bosons, its ground state, densities and entropies.
package main

import (
	"context"
	"fmt"
	"log"
	"math"

	"rundle/dmrg"
	"rundle/entanglement"
	"rundle/mpo/ladder"
	"rundle/observables"
)

func main() {
	ctx := context.Background()
	lad, err := ladder.New(4, ladder.Open, ladder.Leg("a", ladder.Boson(3)), ladder.Leg("b", ladder.Boson(3)))
	check(err)
	h, err := lad.Hamiltonian(ladder.Constants{"J": 1, "K": 1.3, "U": 4, "phi": 0.8 * math.Pi},
		ladder.Term{Formula: "-J*exp(i*phi/2) b^+[a,j+1] b[a,j] + h.c."},
		ladder.Term{Formula: "-J*exp(-i*phi/2) b^+[b,j+1] b[b,j] + h.c."},
		ladder.Term{Formula: "-K b^+[a,j] b[b,j] + h.c."},
		ladder.Term{Formula: "U/2 n[l,j] (n[l,j]-1)", Each: ladder.Each{"l": "legs"}})
	check(err)
	res, err := dmrg.Ground(ctx, h, ladder.Sector{"N": 4}, dmrg.Options{Precision: 1e-8})
	check(err)
	fmt.Println(res.Energy, "±", res.EnergyError, res.Verdict) // not converged is a verdict, not an error
	den, err := observables.Everywhere(ctx, res.State, "n[l,j]", ladder.Each{"l": "legs"})
	check(err)
	fmt.Println(den.Values, entanglement.Cuts(res.State).Entropy)
}

func check(err error) {
	if err != nil {
		log.Fatal(err)
	}
}
