package observables_test

import (
	"context"
	"testing"

	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/observables"
)

// randomState is a state of a fermion chain at half filling.
func randomState(t testing.TB, sites, bond int) *mps.State {
	t.Helper()
	lad, err := ladder.New(sites, ladder.Open, ladder.Leg("a", ladder.Fermion()))
	if err != nil {
		t.Fatal(err)
	}
	h, err := lad.Hamiltonian(nil, ladder.Term{Formula: "-c^+[a,j+1] c[a,j] + h.c."})
	if err != nil {
		t.Fatal(err)
	}
	f, err := h.Frames(ladder.FrameOptions{})
	if err != nil {
		t.Fatal(err)
	}
	target, err := f.Target(ladder.Sector{"N": sites / 2})
	if err != nil {
		t.Fatal(err)
	}
	s, err := mps.RandomState(f, h.Scope, target.Charge, bond, 1)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func BenchmarkAllPairs(b *testing.B) {
	s := randomState(b, 64, 100)
	for b.Loop() {
		_, err := observables.AllPairs(context.Background(), s, ladder.Term{Formula: "c^+[a,j]"}, ladder.Term{Formula: "c[a,j]"})
		if err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkEverywhere(b *testing.B) {
	s := randomState(b, 64, 100)
	for b.Loop() {
		if _, err := observables.Everywhere(context.Background(), s, "n[a,j]", nil); err != nil {
			b.Fatal(err)
		}
	}
}
