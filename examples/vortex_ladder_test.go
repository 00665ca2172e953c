package examples

import (
	"math"
	"math/cmplx"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
)

// The figures of the bundled file. Energy and currents were found by this program at precision 1e-8 and are good to the last digit shown; conservation and
// symmetry below are exact, and the smaller ladders are checked against exact diagonalization.
func TestVortexLadder(t *testing.T) {
	s, r, _ := solve(t, "vortex-ladder")
	require.Equal(t, "complex", r.Model.Arithmetic)
	require.InDelta(t, -14.612304, s.EnergyLimit, 1e-5)
	require.LessOrEqual(t, s.EnergyError, 1e-5)
	density, a, b, rung := s.values(t, "density"), s.values(t, "current a"), s.values(t, "current b"), s.values(t, "rung current")
	require.InDelta(t, 8, sum(density), 1e-9)
	continuity(t, 12, a, b, rung, 1e-3)
	for j := range 12 {
		require.InDelta(t, density[onLegs(j, "a")], density[onLegs(11-j, "a")], 1e-3)
		// Legs exchanged and rungs counted backwards.
		require.InDelta(t, rung[onRung(j)], -rung[onRung(11-j)], 1e-3)
	}
	// A vortex sits on every third plaquette: there the leg current runs against the screening direction.
	for j, want := range []float64{-0.21244, -0.05690, 0.06515, -0.17616, -0.11315, 0.05944, -0.11315, -0.17616, 0.06515, -0.05690, -0.21244} {
		require.InDelta(t, want, a[onRung(j)], 1e-4)
		require.InDelta(t, -want, b[onRung(j)], 1e-4)
	}
}

// continuity: in a stationary state what flows into a site flows out again.
func continuity(t *testing.T, rungs int, a, b, rung map[string]float64, tolerance float64) {
	t.Helper()
	for j := range rungs {
		left, right := onRung(j-1), onRung(j) // no bond, no current
		require.InDelta(t, a[right], a[left]+rung[right], tolerance, "leg a, rung %d", j)
		require.InDelta(t, b[right], b[left]-rung[right], tolerance, "leg b, rung %d", j)
	}
}

// fluxLadder is the vortex ladder by exact diagonalization: J = 1, K = 0.9, U = 8.
func fluxLadder(t *testing.T, rungs, bosons int, flux float64) (*exact.Basis, exact.Level) {
	t.Helper()
	var sites []exact.Site
	for range 2 * rungs {
		sites = append(sites, exact.Boson(3))
	}
	basis, err := exact.NewBasis(sites, []exact.Number{exact.Particles(sites)}, []int{bosons})
	require.NoError(t, err)
	phase := cmplx.Exp(complex(0, flux/2))
	var h []exact.Term
	for j := range rungs {
		for leg := range 2 {
			i := 2*j + leg
			h = append(h, exact.T(4, "n", i, "n", i), exact.T(-4, "n", i))
		}
		h = append(h, exact.WithAdjoints(exact.T(-0.9, "b^+", 2*j, "b", 2*j+1))...)
		if j+1 < rungs {
			h = append(h, exact.WithAdjoints(exact.T(-phase, "b^+", 2*j+2, "b", 2*j), exact.T(-cmplx.Conj(phase), "b^+", 2*j+3, "b", 2*j+1))...)
		}
	}
	matrix, err := basis.Matrix(h...)
	require.NoError(t, err)
	ground, gap, err := matrix.Ground()
	require.NoError(t, err)
	require.Greater(t, gap, 1e-2, "the state of the test is not unique")
	return basis, ground
}

func TestVortexLadderSmall(t *testing.T) {
	const rungs, bosons, flux = 5, 4, 0.7 * math.Pi
	basis, ground := fluxLadder(t, rungs, bosons, flux)
	s, _, _ := solve(t, "vortex-ladder", "rungs    = 12", "rungs    = 5", "N = 8", "N = 4", "precision = 1e-5", "precision = 1e-9")
	require.InDelta(t, ground.Energy, s.EnergyLimit, 1e-9)
	density, a, b, rung := s.values(t, "density"), s.values(t, "current a"), s.values(t, "current b"), s.values(t, "rung current")
	flow := func(amplitude complex128, to, from int) float64 {
		return real(basis.Expect(ground.Vector, exact.WithAdjoints(exact.T(1i*amplitude, "b^+", to, "b", from))...))
	}
	phase := cmplx.Exp(complex(0, flux/2))
	local := basis.Local(ground.Vector, "n")
	for j := range rungs {
		require.InDelta(t, real(local[2*j]), density[onLegs(j, "a")], 1e-6)
		require.InDelta(t, real(local[2*j+1]), density[onLegs(j, "b")], 1e-6)
		require.InDelta(t, flow(0.9, 2*j, 2*j+1), rung[onRung(j)], 1e-6)
		if j+1 < rungs {
			require.InDelta(t, flow(phase, 2*j+2, 2*j), a[onRung(j)], 1e-6)
			require.InDelta(t, flow(cmplx.Conj(phase), 2*j+3, 2*j+1), b[onRung(j)], 1e-6)
		}
	}
	continuity(t, rungs, a, b, rung, 1e-6)
	coherence := basis.TwoPoint(ground.Vector, "b^+", "b")
	for place, v := range s.values(t, "coherence") {
		var j, k int
		scan(t, place, &j, &k)
		require.InDelta(t, cmplx.Abs(coherence[2*j][2*k]), v, 1e-6)
	}
}

// The sum of the leg currents is the slope of the energy in the flux: dE/dphi = -1/2 sum (a - b) (Hellmann, Feynman).
func TestVortexLadderSlope(t *testing.T) {
	const step = 1e-4
	_, more := fluxLadder(t, 4, 3, 0.7*math.Pi+step)
	_, less := fluxLadder(t, 4, 3, 0.7*math.Pi-step)
	s, _, _ := solve(t, "vortex-ladder", "rungs    = 12", "rungs    = 4", "N = 8", "N = 3", "precision = 1e-5", "precision = 1e-9")
	currents := sum(s.values(t, "current a")) - sum(s.values(t, "current b"))
	require.InDelta(t, (more.Energy-less.Energy)/(2*step), -currents/2, 1e-5)
}
