package main

import (
	"bytes"
	"fmt"
	"math"
	"math/cmplx"
	"regexp"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/dmrg"
	"rundle/internal/exact"
)

// diagonalized is the ground state of the same model by exact diagonalization: its energy and the current around each plaquette.
func diagonalized(t *testing.T, m model, k float64) (energy float64, around []float64) {
	t.Helper()
	site := func(leg, rung int) int { return 2*rung + leg }
	var sites []exact.Site
	for range 2 * m.rungs {
		sites = append(sites, exact.Boson(1))
	}
	basis, err := exact.NewBasis(sites, []exact.Number{exact.Particles(sites)}, []int{m.bosons})
	require.NoError(t, err)
	along := func(leg, j int, c complex128) []exact.Term {
		return exact.WithAdjoints(exact.T(c, "b^+", site(leg, j+1), "b", site(leg, j)))
	}
	var h []exact.Term
	phase := [2]complex128{cmplx.Exp(complex(0, m.flux/2)), cmplx.Exp(complex(0, -m.flux/2))}
	for j := range m.rungs {
		h = append(h, exact.WithAdjoints(exact.T(complex(-k, 0), "b^+", site(0, j), "b", site(1, j)))...)
		if j+1 < m.rungs {
			h = append(append(h, along(0, j, -phase[0])...), along(1, j, -phase[1])...)
		}
	}
	matrix, err := basis.Matrix(h...)
	require.NoError(t, err)
	ground, gap, err := matrix.Ground()
	require.NoError(t, err)
	require.Greater(t, gap, 1e-3, "the state of the test is not unique")
	for j := range m.rungs - 1 {
		a := real(basis.Expect(ground.Vector, along(0, j, 1i*phase[0])...))
		b := real(basis.Expect(ground.Vector, along(1, j, 1i*phase[1])...))
		around = append(around, (b-a)/2)
	}
	return ground.Energy, around
}

func compare(t *testing.T, m model, k float64) {
	t.Helper()
	energy, around := diagonalized(t, m, k)
	p, state, err := m.solve(t.Context(), k, nil)
	require.NoError(t, err)
	require.NotNil(t, state)
	require.Equal(t, dmrg.Converged, p.verdict)
	require.InDelta(t, energy, p.energy, precision)
	require.LessOrEqual(t, p.energyError, precision)
	mean, reversed := 0.0, 0
	for _, x := range around {
		mean += x / float64(len(around))
		if x < 0 {
			reversed++
		}
	}
	require.InDelta(t, mean, p.edge, 1e-4)
	require.Equal(t, reversed, p.reversed)
}

// The program against exact diagonalization, with vortices and without.
func TestSolve(t *testing.T) {
	for _, c := range []struct {
		name string
		m    model
		k    float64
	}{
		{"vortices", model{rungs: 6, bosons: 3, flux: 0.8 * math.Pi}, 0.3},
		{"screened", model{rungs: 6, bosons: 3, flux: math.Pi / 2}, 1.5},
		{"no flux", model{rungs: 5, bosons: 4, flux: 0}, 0.7},
	} {
		t.Run(c.name, func(t *testing.T) { compare(t, c.m, c.k) })
	}
}

// One boson alone is screened above K = 2J tan(phi/2) sin(phi/2) (Huegel, Paredes 2014) on a long ladder, and makes vortices below.
func TestMeissnerThreshold(t *testing.T) {
	m := model{rungs: 20, bosons: 1, flux: math.Pi / 2}
	threshold := exact.MeissnerThreshold(1, m.flux)
	below, _, err := m.solve(t.Context(), 0.8*threshold, nil)
	require.NoError(t, err)
	require.Positive(t, below.reversed)
	above, _, err := m.solve(t.Context(), 1.1*threshold, nil)
	require.NoError(t, err)
	require.Zero(t, above.reversed)
	require.Positive(t, above.edge)
}

// The table as README shows it: a line for each coupling, the second search begun from the first's state.
func TestFollow(t *testing.T) {
	var out bytes.Buffer
	m := model{rungs: 5, bosons: 2, flux: math.Pi / 2}
	require.NoError(t, m.follow(t.Context(), &out, []float64{0.5, 1}))
	lines := strings.Split(strings.TrimSuffix(out.String(), "\n"), "\n")
	require.Len(t, lines, 3)
	for _, line := range lines[1:] {
		require.Regexp(t, regexp.MustCompile(`^ +[\d.]+ +-\d+\.\d{5} ± \de-\d+ +-?0\.\d{5} +\d+  converged$`), line)
	}
	energy, _ := diagonalized(t, m, 1)
	require.Contains(t, lines[2], fmt.Sprintf(" %.5f ", energy))
}
