package main

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/dmrg"
	"rundle/internal/exact"
)

// TestModels holds the models to exact diagonalizations: the golden energies are those of the baseline's check.py, which works on bit strings (to
// 1e-12); ours is written with internal/exact.
func TestModels(t *testing.T) {
	for _, row := range []struct {
		name  string
		rungs int
		want  float64
		ours  func(rungs int) ([]exact.Site, []exact.Number, []int, []exact.Term)
	}{
		{"ladder", 6, -6.603472475387, exactSpins(true)},
		{"chain", 12, -5.142090632841, exactSpins(false)},
		{"hubbard", 6, -3.092565319505, exactHubbard},
		{"flux", 6, -5.225790688760, exactFlux(2)},
		{"pi-flux", 6, -5.408525977394, exactFlux(math.Pi)},
		{"boson", 4, -7.861000778588, exactBosons},
	} {
		t.Run(row.name, func(t *testing.T) {
			sites, numbers, values, terms := row.ours(row.rungs)
			basis, err := exact.NewBasis(sites, numbers, values)
			require.NoError(t, err)
			matrix, err := basis.Matrix(terms...)
			require.NoError(t, err)
			levels, err := matrix.Lowest(1)
			require.NoError(t, err)
			require.InDelta(t, row.want, levels[0].Energy, 1e-10)
			m, err := find(row.name)
			require.NoError(t, err)
			m.rungs = row.rungs
			h, sector, err := m.build()
			require.NoError(t, err)
			found, err := dmrg.Ground(context.Background(), h, sector, dmrg.Options{Precision: 1e-10})
			require.NoError(t, err)
			require.InDelta(t, row.want, found.Energy, 1e-9)
		})
	}
	_, err := find("triangle")
	require.ErrorContains(t, err, `"triangle"`)
}

func equal(n int, s exact.Site) []exact.Site {
	sites := make([]exact.Site, n)
	for i := range sites {
		sites[i] = s
	}
	return sites
}

// pairs lists the bonds of a chain or of a ladder of sites 2 rung + leg, those of rungs first.
func pairs(rungs int, twoLegs bool) (rung, leg [][2]int) {
	if !twoLegs {
		for i := range rungs - 1 {
			leg = append(leg, [2]int{i, i + 1})
		}
		return nil, leg
	}
	for r := range rungs {
		rung = append(rung, [2]int{2 * r, 2*r + 1})
		if r+1 < rungs {
			leg = append(leg, [2]int{2 * r, 2*r + 2}, [2]int{2*r + 1, 2*r + 3})
		}
	}
	return rung, leg
}

func exactSpins(twoLegs bool) func(int) ([]exact.Site, []exact.Number, []int, []exact.Term) {
	return func(rungs int) ([]exact.Site, []exact.Number, []int, []exact.Term) {
		n := rungs
		if twoLegs {
			n *= 2
		}
		sites := equal(n, exact.Spin(1))
		rung, leg := pairs(rungs, twoLegs)
		var terms []exact.Term
		for _, b := range append(rung, leg...) {
			terms = append(terms, exact.T(1, "S^z", b[0], "S^z", b[1]), exact.T(0.5, "S^+", b[0], "S^-", b[1]), exact.T(0.5, "S^-", b[0], "S^+", b[1]))
		}
		return sites, []exact.Number{exact.TwiceSz(sites)}, []int{0}, terms
	}
}

func exactHubbard(rungs int) ([]exact.Site, []exact.Number, []int, []exact.Term) {
	sites := equal(rungs, exact.Electron(true))
	var terms []exact.Term
	for i := range rungs {
		terms = append(terms, exact.T(4, "n_up", i, "n_down", i))
		if i+1 < rungs {
			terms = append(terms, exact.WithAdjoints(exact.T(-1, "c_up^+", i, "c_up", i+1), exact.T(-1, "c_down^+", i, "c_down", i+1))...)
		}
	}
	return sites, []exact.Number{exact.UpParticles(sites), exact.DownParticles(sites)}, []int{rungs / 2, rungs / 2}, terms
}

// legPhases are the amplitudes of a hop against the direction of the legs, by leg: exp(i phi/2) and its conjugate.
func legPhases(flux float64) [2]complex128 {
	sin, cos := math.Sincos(flux / 2)
	return [2]complex128{complex(cos, sin), complex(cos, -sin)}
}

func exactFlux(flux float64) func(int) ([]exact.Site, []exact.Number, []int, []exact.Term) {
	return func(rungs int) ([]exact.Site, []exact.Number, []int, []exact.Term) {
		sites := equal(2*rungs, exact.Fermion())
		rung, leg := pairs(rungs, true)
		phase := legPhases(flux)
		var terms []exact.Term
		for _, b := range rung {
			terms = append(terms, exact.WithAdjoints(exact.T(-0.7, "c^+", b[0], "c", b[1]))...)
			terms = append(terms, exact.T(0.25, "n", b[0]), exact.T(-0.25, "n", b[1]))
		}
		for _, b := range leg {
			terms = append(terms, exact.WithAdjoints(exact.T(-phase[b[0]%2], "c^+", b[0], "c", b[1]))...)
			terms = append(terms, exact.T(3, "n", b[0], "n", b[1]))
		}
		return sites, []exact.Number{exact.Particles(sites)}, []int{rungs}, terms
	}
}

func exactBosons(rungs int) ([]exact.Site, []exact.Number, []int, []exact.Term) {
	sites := equal(2*rungs, exact.Boson(3))
	rung, leg := pairs(rungs, true)
	phase := legPhases(math.Pi / 2)
	var terms []exact.Term
	for _, b := range rung {
		terms = append(terms, exact.WithAdjoints(exact.T(-1, "b^+", b[0], "b", b[1]))...)
	}
	for _, b := range leg {
		terms = append(terms, exact.WithAdjoints(exact.T(-phase[b[0]%2], "b^+", b[0], "b", b[1]))...)
	}
	for i := range sites {
		terms = append(terms, exact.T(1, "n", i, "n", i), exact.T(-1, "n", i))
	}
	return sites, []exact.Number{exact.Particles(sites)}, []int{rungs}, terms
}
