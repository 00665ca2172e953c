package entanglement_test

import (
	"context"
	"fmt"

	"rundle/dmrg"
	"rundle/entanglement"
	"rundle/mpo/ladder"
)

// Two spins a rung in singlets: cutting a singlet in two leaves ln 2, cutting between rungs nothing.
func Example() {
	lad, err := ladder.New(3, ladder.Open, ladder.Leg("a", ladder.Spin(1)), ladder.Leg("b", ladder.Spin(1)))
	check(err)
	h, err := lad.Hamiltonian(nil, ladder.Term{Formula: "S[a,j].S[b,j]"})
	check(err)
	res, err := dmrg.Ground(context.Background(), h, ladder.Sector{"Sz": 0}, dmrg.Options{})
	check(err)
	cuts := entanglement.Cuts(res.State)
	for b, entropy := range cuts.Entropy {
		fmt.Printf("after site %d (rung edge: %v): entropy %.4f\n", cuts.AfterSite[b], cuts.RungEdge[b], entropy)
	}
	for _, level := range cuts.Spectrum[2] {
		if level.Xi < 40 { // beyond, rounding
			fmt.Printf("xi %.4f, Sz %v\n", level.Xi, level.Charge["Sz"])
		}
	}
	// Unordered output:
	// after site 0 (rung edge: false): entropy 0.6931
	// after site 1 (rung edge: true): entropy 0.0000
	// after site 2 (rung edge: false): entropy 0.6931
	// after site 3 (rung edge: true): entropy 0.0000
	// after site 4 (rung edge: false): entropy 0.6931
	// xi 0.6931, Sz -0.5
	// xi 0.6931, Sz 0.5
}

func check(err error) {
	if err != nil {
		panic(err)
	}
}
