package observables_test

import (
	"context"
	"fmt"

	"rundle/dmrg"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/observables"
)

// chain is the ground state of two fermions on a chain of six sites.
func chain() *mps.State {
	lad, err := ladder.New(6, ladder.Open, ladder.Leg("a", ladder.Fermion()))
	check(err)
	h, err := lad.Hamiltonian(nil, ladder.Term{Formula: "-c^+[a,j+1] c[a,j] + h.c."})
	check(err)
	res, err := dmrg.Ground(context.Background(), h, ladder.Sector{"N": 2}, dmrg.Options{})
	check(err)
	return res.State
}

// A formula means in a state what it means in a Hamiltonian: j runs over all places.
func ExampleEverywhere() {
	density, err := observables.Everywhere(context.Background(), chain(), "n[a,j]", nil)
	check(err)
	for i, at := range density.At {
		fmt.Printf("%v: %.4f\n", at[0], density.Values[i])
	}
	// Output:
	// j = 0: 0.2284
	// j = 1: 0.4462
	// j = 2: 0.3254
	// j = 3: 0.3254
	// j = 4: 0.4462
	// j = 5: 0.2284
}

// All pairs of places of two operators in one pass, with the fermion signs between them.
func ExampleAllPairs() {
	p, err := observables.AllPairs(context.Background(), chain(), ladder.Term{Formula: "c^+[a,j]"}, ladder.Term{Formula: "c[a,j]"})
	check(err)
	for _, v := range p.Values[0] {
		fmt.Printf("%.4f ", real(v))
	}
	fmt.Println()
	// Output:
	// 0.2284 0.3147 0.2178 0.0239 -0.1209 -0.1209
}

func check(err error) {
	if err != nil {
		panic(err)
	}
}
