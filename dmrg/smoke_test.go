package dmrg_test

import (
	"context"
	"fmt"
	"math"
	"testing"
	"time"

	"rundle/dmrg"
	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

func TestSmoke(t *testing.T) {
	for _, n := range []int{8, 16, 32} {
		lad, err := ladder.New(n, ladder.Open, ladder.Leg("a", ladder.Spin(1)))
		if err != nil {
			t.Fatal(err)
		}
		h, err := lad.Hamiltonian(nil, ladder.Term{Formula: "S[a,j].S[a,j+1]"})
		if err != nil {
			t.Fatal(err)
		}
		begin := time.Now()
		res, err := dmrg.Ground(context.Background(), h, ladder.Sector{"Sz": 0}, dmrg.Options{Precision: 1e-10, OnSweep: func(s dmrg.Sweep) { fmt.Printf("%+v\n", s) }})
		if err != nil {
			t.Fatal(err)
		}
		e, err := exact.HeisenbergChain(n, n/2)
		fmt.Println(n, res.Energy, res.EnergyLimit, res.EnergyError, res.Verdict, res.Reason, "true error", math.Abs(res.EnergyLimit-e), err, res.LargestBond, time.Since(begin))
	}
}
