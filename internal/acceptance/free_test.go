package acceptance

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/dmrg"
	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// freeCharge is a ladder in a chemical potential or a field whose sector leaves a charge open.
type freeCharge struct {
	name        string
	legs, rungs int
	site        ladder.Site
	exact       exact.Site
	fill        func(w *twice, rng *rand.Rand)
	sector      ladder.Sector
	charge      string // the open one
	unit        float64
	number      func(value int) func([]exact.Site) ([]exact.Number, []int)
	values      []int // of the number, all that the ladder can hold
}

func count(n int) []int {
	out := make([]int, n+1)
	for i := range out {
		out[i] = i
	}
	return out
}

func freeCharges() []freeCharge {
	number := func(v int) func([]exact.Site) ([]exact.Number, []int) { return oneNumber(particles, v) }
	neighbours := func(w *twice, do func(x, y int)) {
		n := len(w.legs)
		for x := range w.sites() {
			if x%n+1 < n {
				do(x, x+1)
			}
			if x+n < w.sites() {
				do(x, x+n)
			}
		}
	}
	hopping := func(op string, mu, v float64) func(w *twice, rng *rand.Rand) {
		return func(w *twice, rng *rand.Rand) {
			neighbours(w, func(x, y int) {
				w.add(cmplx.Rect(0.5+0.5*rng.Float64(), 6*rng.Float64()), op+"^+", x, op, y)
				w.add(complex(v*(0.5+rng.Float64()), 0), "n", x, "n", y)
			})
			for x := range w.sites() {
				w.add(complex(-mu+0.4*rng.Float64(), 0), "n", x)
			}
		}
	}
	return []freeCharge{
		{"few fermions", 2, 5, ladder.Fermion(), exact.Fermion(), hopping("c", 0.1, 0.8), nil, "N", 1, number, count(10)},
		{"many fermions", 2, 7, ladder.Fermion(), exact.Fermion(), hopping("c", 1.5, 0.7), nil, "N", 1, number, count(14)},
		{"attracted fermions", 1, 14, ladder.Fermion(), exact.Fermion(), hopping("c", -0.9, -1.2), nil, "N", 1, number, count(14)},
		{"bosons", 2, 3, ladder.Boson(3), exact.Boson(3), func(w *twice, rng *rand.Rand) {
			hopping("b", 2, 0.3)(w, rng)
			for x := range w.sites() {
				w.add(1, "n", x, "n", x)
			}
		}, nil, "N", 1, number, count(18)},
		{"paired bosons", 1, 8, ladder.Boson(2), exact.Boson(2), func(w *twice, rng *rand.Rand) {
			// Pairs pay in, single bosons do not: the energy goes up and down with every boson.
			neighbours(w, func(x, y int) {
				w.add(-0.9, "b^+", x, "b^+", x, "b", y, "b", y)
				w.add(0.05, "b^+", x, "b", y)
			})
			for x := range w.sites() {
				w.add(-4, "n", x, "n", x)
				w.add(8.6, "n", x)
			}
		}, nil, "N", 1, number, count(16)},
		{"spins in a field", 2, 6, ladder.Spin(1), exact.Spin(1), func(w *twice, rng *rand.Rand) {
			neighbours(w, func(x, y int) {
				w.add(0.5, "S^+", x, "S^-", y)
				w.add(1, "S^z", x, "S^z", y)
			})
			for x := range w.sites() {
				w.add(-1.7, "S^z", x)
			}
		}, nil, "Sz", 0.5, func(v int) func([]exact.Site) ([]exact.Number, []int) {
			return oneNumber(exact.TwiceSz, 2*v-12)
		}, count(12)},
		{"electrons, N named", 1, 6, ladder.Electron(), exact.Electron(true), func(w *twice, rng *rand.Rand) {
			neighbours(w, func(x, y int) {
				w.add(-1, "c_up^+", x, "c_up", y)
				w.add(-1, "c_down^+", x, "c_down", y)
			})
			for x := range w.sites() {
				w.add(4, "n_up", x, "n_down", x)
				w.add(-0.4, "n_up", x)
				w.add(0.4, "n_down", x)
			}
		}, ladder.Sector{"N": 5}, "Sz", 0.5, func(v int) func([]exact.Site) ([]exact.Number, []int) {
			return func(s []exact.Site) ([]exact.Number, []int) {
				return []exact.Number{exact.UpParticles(s), exact.DownParticles(s)}, []int{v, 5 - v}
			}
		}, count(5)},
	}
}

// TestFreeCharge: of the values of a charge that the sector does not name, the search finds the one of lowest energy, and reports it.
func TestFreeCharge(t *testing.T) {
	for i, f := range freeCharges() {
		t.Run(f.name, func(t *testing.T) {
			w := newTwice(f.legs, f.rungs)
			f.fill(w, rand.New(rand.NewPCG(uint64(i), 0xf4ee)))
			best, low, second := 0, math.Inf(1), math.Inf(1)
			var all []string
			for _, v := range f.values {
				_, ground, _ := w.ground(t, f.exact, f.number(v))
				all = append(all, fmt.Sprintf("%.3f", ground.Energy))
				if ground.Energy < low {
					best, low, second = v, ground.Energy, low
				} else {
					second = min(second, ground.Energy)
				}
			}
			t.Log(all)
			require.Greater(t, second-low, 1e-3, "two values of nearly the same energy")
			require.Greater(t, best, f.values[0])
			require.Less(t, best, f.values[len(f.values)-1], "an empty or full ladder tells little")
			res := requireGround(t, w.hamiltonian(t, f.site), f.sector, wish{relative: 1e-10, want: low, largest: w.top})
			_, ground, _ := w.ground(t, f.exact, f.number(best))
			require.InDelta(t, low, ground.Energy, 1e-12)
			got, ok := res.Sector[f.charge]
			require.True(t, ok, "%v", res.Sector)
			want := float64(best)
			switch {
			case f.name == "spins in a field":
				want = float64(best) - 6
			case f.charge == "Sz":
				want = float64(2*best-5) / 2
			}
			require.Equal(t, want, got)
		})
	}
}

// TestFreeChargeOfGaussians: on a longer ladder of free fermions the number is that of the negative levels.
func TestFreeChargeOfGaussians(t *testing.T) {
	for _, mu := range []float64{-0.6, 0.3, 1.1} {
		t.Run(fmt.Sprintf("mu=%v", mu), func(t *testing.T) {
			rng := rand.New(rand.NewPCG(4, 4))
			w, q := newTwice(2, 8), exact.NewQuadratic(16)
			for x := range 16 {
				e := rng.Float64() - 0.5 - mu
				w.add(complex(e, 0), "n", x)
				q.Energy(x, e)
				for _, y := range []int{x + 1, x + 2} {
					if y < 16 && (y == x+2 || x%2 == 0) {
						z := cmplx.Rect(0.5+0.5*rng.Float64(), 6*rng.Float64())
						w.add(z, "c^+", x, "c", y)
						q.Hop(x, y, z)
					}
				}
			}
			levels, err := q.Levels()
			require.NoError(t, err)
			n, energy, gap := 0, 0.0, math.Inf(1)
			for _, e := range levels {
				gap = min(gap, math.Abs(e))
				if e < 0 {
					n++
					energy += e
				}
			}
			require.Greater(t, gap, 1e-3)
			h := w.hamiltonian(t, ladder.Fermion())
			res := requireGround(t, h, nil, wish{relative: 1e-10, want: energy, largest: w.top})
			require.Equal(t, float64(n), res.Sector["N"])

			named, err := dmrg.Ground(context.Background(), h, ladder.Sector{"N": n}, dmrg.Options{Precision: 1e-8})
			require.NoError(t, err)
			require.InDelta(t, energy, named.Energy, 1e-7)
		})
	}
}
