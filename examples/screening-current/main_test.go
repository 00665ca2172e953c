package main

import (
	"bytes"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
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

// One boson alone is screened above K = 2J tan(phi/2) sin(phi/2) on a long ladder (Huegel, Paredes 2014), and makes vortices below.
func TestMeissnerThreshold(t *testing.T) {
	m := model{rungs: 12, bosons: 1, flux: math.Pi / 2}
	threshold := exact.MeissnerThreshold(1, m.flux)
	for _, c := range []struct {
		factor   float64
		vortices bool
	}{{0.6, true}, {1.2, false}} {
		compare(t, m, c.factor*threshold)
		p, _, err := m.solve(t.Context(), c.factor*threshold, nil)
		require.NoError(t, err)
		require.Equal(t, c.vortices, p.reversed > 0)
	}
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

// The line of README's table at K = J is what the program gives.
func TestReadme(t *testing.T) {
	text, err := os.ReadFile(filepath.Join("..", "..", "README.md"))
	require.NoError(t, err)
	_, table, found := strings.Cut(string(text), "$ go run ./examples/screening-current\n")
	require.True(t, found)
	shown := regexp.MustCompile(`(?m)^ 1\.00 +(\S+) ± \S+ +(\S+) +(\d+)  converged$`).FindStringSubmatch(table)
	require.Len(t, shown, 4)
	p, _, err := shownModel.solve(t.Context(), 1, nil)
	require.NoError(t, err)
	energy, err := strconv.ParseFloat(shown[1], 64)
	require.NoError(t, err)
	edge, err := strconv.ParseFloat(shown[2], 64)
	require.NoError(t, err)
	require.InDelta(t, p.energy, energy, precision)
	require.InDelta(t, p.edge, edge, 1e-4)
	require.Equal(t, strconv.Itoa(p.reversed), shown[3])
}
