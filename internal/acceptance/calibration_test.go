package acceptance

import (
	"context"
	"fmt"
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/dmrg"
	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// known is a model with a known ground energy.
type known struct {
	name   string
	h      *ladder.Hamiltonian
	sector ladder.Sector
	energy float64
}

func knownModels(t *testing.T) []known {
	var out []known
	for _, r := range [][2]int{{16, 8}, {32, 1}, {32, 4}} {
		e, err := exact.HeisenbergChain(r[0], r[1])
		require.NoError(t, err)
		out = append(out, known{fmt.Sprint("Heisenberg ", r), openChain(t, r[0], ladder.Spin(1), nil, "S[a,j].S[a,j+1]"),
			ladder.Sector{"Sz": float64(r[0]-2*r[1]) / 2}, e})
	}
	for _, c := range []hubbard{{8, 4, 4, 4}, {10, 3, 3, 6}, {12, 1, 1, 2}} {
		e, err := exact.HubbardChain(c.sites, c.up, c.down, 1, c.repulsion)
		require.NoError(t, err)
		out = append(out, known{c.String(), openChain(t, c.sites, ladder.Electron(), ladder.Constants{"U": c.repulsion},
			"-(c_up^+[a,j+1] c_up[a,j] + c_down^+[a,j+1] c_down[a,j]) + h.c.", "U n_up[a,j] n_down[a,j]"),
			ladder.Sector{"N": c.up + c.down, "Sz": 0}, e})
	}
	h, q := gaussian{rungs: 12, legs: 2}.build(t)
	g, err := q.Filled(12)
	require.NoError(t, err)
	return append(out,
		known{"Gaussian", h, ladder.Sector{"N": 12}, g.Energy},
		known{"Ising", openChain(t, 40, ladder.Spin(1), nil, isingWays[0].formulas...), ladder.Sector{"P": 0}, exact.IsingChain(40)},
		known{"XX", openChain(t, 24, ladder.Fermion(), nil, xxWays[2].formula), ladder.Sector{"N": 12}, exact.XXChain(24)},
		known{"Majumdar-Ghosh", openChain(t, 24, ladder.Spin(1), nil, "S[a,j].S[a,j+1]", "1/2 S[a,j].S[a,j+2]"), ladder.Sector{"Sz": 0},
			exact.MajumdarGhoshChain(24)},
		known{"AKLT", openChain(t, 12, ladder.Spin(2), nil, "S[a,j].S[a,j+1] + 1/3 (S[a,j].S[a,j+1])^2"), ladder.Sector{"Sz": 1}, exact.AKLTChain(12)},
	)
}

// TestErrorBars: over models with a known answer and wishes from coarse to fine, the quoted error covers the true one in at least 95
// of 100 cases, and is at most ten times it in the median.
func TestErrorBars(t *testing.T) {
	var ratios []float64
	missed := 0
	for _, m := range knownModels(t) {
		for _, precision := range []float64{1e-4, 1e-6, 1e-8} {
			for _, observables := range []float64{0, 1e-2, 1e-4} {
				res, err := dmrg.Ground(context.Background(), m.h, m.sector, dmrg.Options{Precision: precision, ObservablePrecision: observables})
				require.NoError(t, err)
				require.Equal(t, dmrg.Converged, res.Verdict, m.name)
				off := math.Abs(res.EnergyLimit - m.energy)
				ratios = append(ratios, res.EnergyError/off)
				if off > res.EnergyError+1e-14*math.Abs(m.energy) {
					missed++
					t.Logf("%s, precision %.0e, observables %.0e: off by %.1e, quoted %.1e", m.name, precision, observables, off, res.EnergyError)
				}
			}
		}
	}
	slices.Sort(ratios)
	median := ratios[len(ratios)/2]
	t.Logf("%d of %d missed, median of quoted to true %.1f", missed, len(ratios), median)
	require.LessOrEqual(t, 20*missed, len(ratios))
	require.LessOrEqual(t, median, 10.0)
}
