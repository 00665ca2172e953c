package dmrg_test

import (
	"context"
	"fmt"
	"math"

	"rundle/dmrg"
	"rundle/mpo/ladder"
)

// A two-leg ladder of bosons with a flux of 0.8 pi a plaquette: the symbolic Hamiltonian, a sector, a wanted precision.
func Example() {
	lad, err := ladder.New(6, ladder.Open, ladder.Leg("a", ladder.Boson(2)), ladder.Leg("b", ladder.Boson(2)))
	check(err)
	h, err := lad.Hamiltonian(ladder.Constants{"J": 1, "K": 1.3, "U": 4, "phi": 0.8 * math.Pi},
		ladder.Term{Formula: "-J*exp(i*phi/2) b^+[a,j+1] b[a,j] + h.c."},
		ladder.Term{Formula: "-J*exp(-i*phi/2) b^+[b,j+1] b[b,j] + h.c."},
		ladder.Term{Formula: "-K b^+[a,j] b[b,j] + h.c."},
		ladder.Term{Formula: "U/2 n[l,j] (n[l,j]-1)", Each: ladder.Each{"l": "legs"}})
	check(err)
	res, err := dmrg.Ground(context.Background(), h, ladder.Sector{"N": 6}, dmrg.Options{Precision: 1e-7})
	check(err)
	_, complex := res.State.Complex()
	fmt.Printf("energy %.6f, %s to %v\n", res.EnergyLimit, res.Verdict, res.EnergyError < 1e-7)
	fmt.Printf("sector %v, complex arithmetic: %v\n", res.Sector, complex)
	// Output:
	// energy -10.639998, converged to true
	// sector map[N:6], complex arithmetic: true
}

// A charge that the sector does not name is left free: here the number of fermions, which the potential sets.
func ExampleGround_freeCharge() {
	lad, err := ladder.New(10, ladder.Open, ladder.Leg("a", ladder.Fermion()))
	check(err)
	h, err := lad.Hamiltonian(nil, ladder.Term{Formula: "-c^+[a,j+1] c[a,j] + h.c."}, ladder.Term{Formula: "-1.2 n[a,j]"})
	check(err)
	res, err := dmrg.Ground(context.Background(), h, nil, dmrg.Options{})
	check(err)
	fmt.Printf("%v fermions, energy %.6f\n", res.Sector["N"], res.Energy)
	// Output:
	// 7 fermions, energy -13.311214
}

// Not converged is a verdict, not an error. The hook sees every settled bond dimension.
func ExampleOptions() {
	lad, err := ladder.New(40, ladder.Open, ladder.Leg("a", ladder.Spin(1)))
	check(err)
	h, err := lad.Hamiltonian(nil, ladder.Term{Formula: "S[a,j].S[a,j+1]"})
	check(err)
	res, err := dmrg.Ground(context.Background(), h, ladder.Sector{"Sz": 0}, dmrg.Options{
		Bond:    16,
		OnStage: func(s dmrg.Stage) { fmt.Printf("bond %d: energy %.3f\n", s.Bond, s.Energy) },
	})
	check(err)
	fmt.Println(res.Verdict)
	// Output:
	// bond 16: energy -17.541
	// bond 16: energy -17.541
	// bond cap
}

func check(err error) {
	if err != nil {
		panic(err)
	}
}
