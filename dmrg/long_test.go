//go:build long

package dmrg

import (
	"context"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/mpo/ladder"
)

// TestErrorBarsAtMoreBonds leaves out bond 4: there free fermions on a ladder settle in a product of plaquettes, which no update of two sites
// leaves and no bar can know of.
func TestErrorBarsAtMoreBonds(t *testing.T) {
	testErrorBars(t, 5, 6, 8, 10, 14, 17, 20, 25, 35, 40, 60)
}

// TestTooManyTotals needs a quarter of a million totals.
func TestTooManyTotals(t *testing.T) {
	species := []ladder.Site{ladder.Fermion(), ladder.Fermion(), ladder.Fermion(), ladder.Fermion()}
	h := hamiltonian(t, 23, ladder.Open, species, "-c^+[a,j+1] c[a,j] + h.c.", "-c^+[b,j+1] c[b,j] + h.c.", "-c^+[c,j+1] c[c,j] + h.c.",
		"-c^+[d,j+1] c[d,j] + h.c.", "n[a,j] n[b,j] n[c,j] n[d,j]")
	_, err := Ground(context.Background(), h, nil, Options{})
	require.ErrorContains(t, err, "name some of")
	require.ErrorContains(t, err, "N_a")
}

func TestLevelsOfMoreRandomLadders(t *testing.T) { testLevelsOfRandomLadders(t, 24) }

func TestLargerTrapsFromMoreStarts(t *testing.T) { testLargerTraps(t, 12) }

func TestTrapsFromAllStarts(t *testing.T) { testTraps(t, 3) }
