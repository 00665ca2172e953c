package acceptance

import (
	"fmt"
	"testing"

	"rundle/dmrg"
	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// reaching is a ladder on which particles move only in a way that two-site updates of a product state do not see: too far, in
// pairs, or where a third one stands.
type reaching struct {
	name        string
	legs, rungs int
	particles   int
	fill        func(w *twice, up, down string)
}

var reachings = []reaching{
	{"third neighbours on a chain", 1, 12, 4, func(w *twice, up, down string) {
		for j := 0; j+3 < w.rungs; j++ {
			w.add(-1, up, j+3, down, j)
		}
	}},
	{"third neighbours", 2, 6, 4, func(w *twice, up, down string) {
		for j := 0; j+3 < w.rungs; j++ {
			w.add(-1, up, 2*(j+3), down, 2*j)
			w.add(-0.8, up, 2*(j+3)+1, down, 2*j+1)
			w.add(0.5, up, 2*(j+3)+1, down, 2*j)
		}
	}},
	{"pairs on a chain", 1, 12, 4, func(w *twice, up, down string) {
		for j := 0; j+3 < w.rungs; j++ {
			w.add(-1, up, j+3, up, j+2, down, j+1, down, j)
		}
	}},
	{"pairs of a rung", 2, 6, 4, func(w *twice, up, down string) {
		for j := 0; j+1 < w.rungs; j++ {
			w.add(-1, up, 2*j+2, up, 2*j+3, down, 2*j+1, down, 2*j)
		}
	}},
	{"assisted on a chain", 1, 12, 5, func(w *twice, up, down string) {
		for j := 0; j+2 < w.rungs; j++ {
			w.add(-1, up, j+2, "n", j+1, down, j)
		}
	}},
	{"assisted by the other leg", 2, 6, 5, func(w *twice, up, down string) {
		for j := 0; j+1 < w.rungs; j++ {
			w.add(-1, up, 2*j+2, "n", 2*j+1, down, 2*j)
			w.add(-0.7, up, 2*j+3, "n", 2*j+2, down, 2*j+1)
		}
	}},
}

// TestReach starts from one product state, with all conserved charges that are found and with the particle number alone.
func TestReach(t *testing.T) {
	kinds := []struct {
		name     string
		up, down string
		site     ladder.Site
		exact    exact.Site
	}{
		{"fermions", "c^+", "c", ladder.Fermion(), exact.Fermion()},
		{"bosons", "b^+", "b", ladder.Boson(2), exact.Boson(2)},
	}
	for _, r := range reachings {
		for _, k := range kinds {
			w := newTwice(r.legs, r.rungs)
			r.fill(w, k.up, k.down)
			_, ground, _ := w.ground(t, k.exact, oneNumber(particles, r.particles))
			for _, charges := range [][]string{nil, {"N"}} {
				t.Run(fmt.Sprintf("%s/%s/charges=%v", r.name, k.name, charges), func(t *testing.T) {
					requireGround(t, w.hamiltonian(t, k.site), ladder.Sector{"N": r.particles},
						wish{relative: 1e-10, want: ground.Energy, largest: w.top, options: dmrg.Options{Charges: charges}})
				})
			}
		}
	}
}
