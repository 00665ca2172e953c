package mpo_test

import (
	"fmt"
	"log"

	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
)

// Dipoles on a chain repel each other as 1/r³. A term stands between any two of 24 sites, up to 144 over a cut; ten strings carry them
// to thirteen digits, beside the two of hopping and the two that are always there.
func Example() {
	chain, err := ladder.New(24, ladder.Open, ladder.Leg("a", ladder.Fermion()))
	check(err)
	h, err := chain.Hamiltonian(ladder.Constants{"t": 1, "V": 4},
		ladder.Term{Formula: "-t c^+[a,j+1] c[a,j] + h.c."},
		ladder.Term{Formula: "V/r^3 n[a,j] n[a,j+r]", Each: ladder.Each{"r": "1..23"}})
	check(err)
	frames, err := h.Frames(ladder.FrameOptions{})
	check(err)
	strings, err := frames.Strings(h.Poly)
	check(err)
	o, err := mpo.Build[float64](strings, mpo.Options{})
	check(err)
	fmt.Println(o.BondDims())

	// Every second site filled: the energy is V times a sum over pairs; the variance is t² for each of the 23 hops that can happen.
	filled := make([]int, 24)
	for j := range filled {
		filled[j] = j % 2
	}
	psi, err := mps.Product[float64](o.Group, o.Phys, filled)
	check(err)
	variance, rounding := mpo.Variance(psi, o, nil)
	fmt.Printf("energy %.10f\n", mpo.Expectation(psi, o, nil))
	fmt.Printf("variance %.10f, rounding below 1e-10: %v\n", variance, rounding < 1e-10)
	// Output:
	// [1 4 6 7 8 9 10 11 12 13 14 14 14 14 14 13 12 11 10 9 8 7 6 4 1]
	// energy 6.4106837059
	// variance 23.0000000000, rounding below 1e-10: true
}

func check(err error) {
	if err != nil {
		log.Fatal(err)
	}
}
