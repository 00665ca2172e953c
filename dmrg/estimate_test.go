package dmrg

import (
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

func TestEstimate(t *testing.T) {
	const scale, bonds = 2.0, 16
	stage := func(gain float64, energies ...float64) settledStage {
		return settledStage{energies: energies, gain: gain}
	}
	rounding := roundingUnit * (10 + 4*scale)
	for _, row := range []struct {
		name       string
		stages     []settledStage
		limit, err float64
	}{
		{"nothing", nil, math.NaN(), math.Inf(1)},
		{"one sweep", []settledStage{stage(1e-3, -10)}, math.NaN(), math.Inf(1)},
		{"settled, nothing truncated", []settledStage{stage(0, -10, -10)}, -10, rounding},
		{"a gain that is rounding", []settledStage{stage(-1e-15, -10, -10)}, -10, rounding},
		{"one stage: a slope is guessed", []settledStage{stage(1e-6, -10, -10)}, -10 - guessedSlope*1e-6, guessedError * 1e-6},
		{"drift halves by assumption", []settledStage{stage(0, -9.5, -10)}, -10, 0.5},
		{"drift by its own ratio", []settledStage{stage(0, -9.1, -9.7, -10)}, -10, 0.3},
		{"slow drift", []settledStage{stage(0, -9.1, -9.6, -10)}, -10, 1.6},
		{"two stages: a line through both", []settledStage{stage(8e-3, -9.9916, -9.9916), stage(1e-3, -10, -10)}, -10.0012, 0.0003},
		{"the last one settles alone", []settledStage{stage(8e-3, -9.9916, -9.9916), stage(1e-3, -10, -10), stage(1e-4, -10.005)}, -10.0012, 0.0003},
		{"the bond stays: a line through the one before", []settledStage{stage(8e-3, -9.9916, -9.9916), stage(1.01e-3, -10, -10), stage(1e-3, -10, -10)}, -10.0012, 0.0003},
		{"too close for a line", []settledStage{stage(1.1e-3, -9.99, -9.99), stage(1e-3, -10, -10)}, -10.00125, guessedError * 1e-3},
		{"no slope downward", []settledStage{stage(2e-3, -10.1, -10.1), stage(1e-3, -10, -10)}, -10.001, 0.00025},
		{"a slope too steep", []settledStage{stage(2e-3, -9, -9), stage(1e-3, -10, -10)}, -10.002, 0.0005},
	} {
		t.Run(row.name, func(t *testing.T) {
			est := estimateError(row.stages, scale, bonds)
			if math.IsNaN(row.limit) {
				require.True(t, math.IsNaN(est.limit))
				require.True(t, math.IsInf(est.err, 1))
				return
			}
			require.InDelta(t, row.limit, est.limit, 1e-12)
			require.InDelta(t, row.err, est.err, 1e-9*row.err+2*rounding)
			require.GreaterOrEqual(t, est.err, est.rounding)
		})
	}
	left := stage(0, -10, -10)
	left.rest = 1e-3
	narrow := left
	narrow.narrow = 1e2
	rough := stage(1e-2, -10, -10)
	rough.discarded = 0.1
	require.InDelta(t, (guessedError+mostCrude)*1e-2, estimateError([]settledStage{rough}, scale, bonds).err, 1e-9, "much is discarded")
	require.InDelta(t, 1e-6/(widestGap*scale), estimateError([]settledStage{left}, scale, bonds).err, 1e-12, "what the eigensolver left")
	require.InDelta(t, 1e-4/gapShare, estimateError([]settledStage{narrow}, scale, bonds).err, 1e-10, "above a narrow gap")
	require.InDelta(t, 1e-4/gapShare, estimateError([]settledStage{narrow, left}, scale, bonds).err, 1e-10, "that the stage before has found")
}

// model is a Hamiltonian with a ground energy known by other means.
type model struct {
	name   string
	h      *ladder.Hamiltonian
	sector ladder.Sector
	energy float64
}

// models of all kinds: critical and gapped, chains and ladders, spins, fermions, bosons; with the source of each energy.
func models(t testing.TB) []model {
	spin, fermion, electron := one(ladder.Spin(1)), one(ladder.Fermion()), one(ladder.Electron())
	must := func(e float64, err error) float64 { require.NoError(t, err); return e }
	chain := must(exact.HeisenbergChain(24, 12)) // Bethe ansatz
	hubbardHalf := must(exact.HubbardChain(10, 5, 5, 1, 4))
	hubbardDoped := must(exact.HubbardChain(12, 4, 3, 1, 8))
	dimers := hamiltonian(t, 12, ladder.Open, spin, "S[a,j].S[a,j+1]", "0.5 S[a,j].S[a,j+2]")
	return []model{
		{"Heisenberg chain", heisenberg(t, 24), ladder.Sector{"Sz": 0}, chain},
		{"XX chain", hamiltonian(t, 24, ladder.Open, spin, "S^x[a,j] S^x[a,j+1]", "S^y[a,j] S^y[a,j+1]"), ladder.Sector{"Sz": 0}, exact.XXChain(24)},
		{"critical Ising chain", hamiltonian(t, 32, ladder.Open, spin, "-4 S^x[a,j] S^x[a,j+1]", "-2 S^z[a,j]"), nil, exact.IsingChain(32)},
		{"Majumdar-Ghosh chain", dimers, ladder.Sector{"Sz": 0}, exact.MajumdarGhoshChain(12)},
		{"AKLT chain", hamiltonian(t, 10, ladder.Open, one(ladder.Spin(2)), "S[a,j].S[a,j+1]", "(1/3) (S[a,j].S[a,j+1])^2"), ladder.Sector{"Sz": 0}, exact.AKLTChain(10)},
		{"pairing chain", hamiltonian(t, 24, ladder.Open, fermion, "-c^+[a,j+1] c[a,j] + h.c.", "-c^+[a,j+1] c^+[a,j] + h.c."), ladder.Sector{"P": 0}, exact.PairingChain(24, 1)},
		{"Hubbard chain, half filled", hubbard(t, 10), ladder.Sector{"N": 10, "Sz": 0}, hubbardHalf},
		{"Hubbard chain, doped", hamiltonian(t, 12, ladder.Open, electron, hubbardTerms[0], hubbardTerms[1], "8 n_up[a,j] n_down[a,j]"), ladder.Sector{"N": 7, "Sz": "1/2"}, hubbardDoped},
		freeLadder(t),
		fluxLadder(t),
		spinLadder(t),
	}
}

// freeLadder is a fermion ladder with a flux, solved by its orbitals.
func freeLadder(t testing.TB) model {
	const rungs = 10
	q := exact.NewQuadratic(2 * rungs)
	for j := range rungs {
		q.Hop(2*j, 2*j+1, -0.8)
		if j+1 < rungs {
			q.Hop(2*j+2, 2*j, complex(-math.Cos(0.6), -math.Sin(0.6)))
			q.Hop(2*j+3, 2*j+1, complex(-math.Cos(0.6), math.Sin(0.6)))
		}
	}
	g, err := q.Filled(rungs)
	require.NoError(t, err)
	legs := []ladder.Site{ladder.Fermion(), ladder.Fermion()}
	return model{"free fermions on a ladder", hamiltonian(t, rungs, ladder.Open, legs, "-exp(0.6*i) c^+[a,j+1] c[a,j] + h.c.",
		"-exp(-0.6*i) c^+[b,j+1] c[b,j] + h.c.", "-0.8 c^+[a,j] c[b,j] + h.c."), ladder.Sector{"N": rungs}, g.Energy}
}

// fluxLadder is a boson ladder, diagonalized.
func fluxLadder(t testing.TB) model {
	const rungs = 4
	sites := slices.Repeat([]exact.Site{exact.Boson(2)}, 2*rungs)
	var terms []exact.Term
	for j := range rungs {
		terms = append(terms, exact.WithAdjoints(exact.T(-1, "b^+", 2*j, "b", 2*j+1))...)
		if j+1 < rungs {
			phase := complex(-math.Cos(0.4), -math.Sin(0.4))
			terms = append(terms, exact.WithAdjoints(exact.T(phase, "b^+", 2*j+2, "b", 2*j))...)
			terms = append(terms, exact.WithAdjoints(exact.T(complex(real(phase), -imag(phase)), "b^+", 2*j+3, "b", 2*j+1))...)
		}
		for l := range 2 {
			terms = append(terms, exact.T(2, "n", 2*j+l, "n", 2*j+l), exact.T(-2, "n", 2*j+l))
		}
	}
	legs := []ladder.Site{ladder.Boson(2), ladder.Boson(2)}
	return model{"bosons on a flux ladder", hamiltonian(t, rungs, ladder.Open, legs, fluxTerms...), ladder.Sector{"N": 5},
		diagonalized(t, sites, []exact.Number{exact.Particles(sites)}, []int{5}, terms)}
}

// spinLadder is a frustrated ladder, diagonalized.
func spinLadder(t testing.TB) model {
	const rungs = 6
	sites := slices.Repeat([]exact.Site{exact.Spin(1)}, 2*rungs)
	var terms []exact.Term
	couple := func(j float64, a, b int) {
		terms = append(terms, exact.T(complex(j, 0), "S^z", a, "S^z", b))
		terms = append(terms, exact.WithAdjoints(exact.T(complex(j/2, 0), "S^+", a, "S^-", b))...)
	}
	for j := range rungs {
		couple(0.7, 2*j, 2*j+1)
		if j+1 < rungs {
			couple(1, 2*j, 2*j+2)
			couple(1, 2*j+1, 2*j+3)
			couple(0.4, 2*j, 2*j+3)
		}
	}
	legs := []ladder.Site{ladder.Spin(1), ladder.Spin(1)}
	return model{"frustrated spin ladder", hamiltonian(t, rungs, ladder.Open, legs, "S[a,j].S[a,j+1]", "S[b,j].S[b,j+1]", "0.7 S[a,j].S[b,j]", "0.4 S[a,j].S[b,j+1]"),
		ladder.Sector{"Sz": 0}, diagonalized(t, sites, []exact.Number{exact.TwiceSz(sites)}, []int{0}, terms)}
}

func diagonalized(t testing.TB, sites []exact.Site, numbers []exact.Number, values []int, terms []exact.Term) float64 {
	b, err := exact.NewBasis(sites, numbers, values)
	require.NoError(t, err)
	m, err := b.Matrix(terms...)
	require.NoError(t, err)
	g, _, err := m.Ground()
	require.NoError(t, err)
	return g.Energy
}

// TestErrorBars stops searches for known energies at several bond dimensions: the bar must hold, and not be blown up beyond use.
func TestErrorBars(t *testing.T) { testErrorBars(t, 8, 20) }

func testErrorBars(t *testing.T, bonds ...int) {
	var ratios []float64
	for _, m := range models(t) {
		for _, bond := range bonds {
			r := ground1(t, m.h, m.sector, Options{Bond: bond, Precision: 1e-9})
			wrong := math.Abs(r.EnergyLimit - m.energy)
			t.Logf("%-28s bond %3d: off by %.1e, bar %.1e, %s", m.name, bond, wrong, r.EnergyError, r.Verdict)
			if wrong > r.EnergyError {
				t.Errorf("%s at bond %d: the energy is off by %.2e, the bar says %.2e", m.name, bond, wrong, r.EnergyError)
			}
			if wrong > 1e-10 {
				ratios = append(ratios, r.EnergyError/wrong)
			}
		}
	}
	slices.Sort(ratios)
	median := ratios[len(ratios)/2]
	t.Logf("%d searches, bar over error in the median %.1f, at most %.0f", len(ratios), median, ratios[len(ratios)-1])
	require.LessOrEqual(t, median, 10.0)
}

// The two-site variance is the variance on chains of neighbours, part of it on a ladder, whose leg hops pass over a site.
func TestTwoSiteVariance(t *testing.T) {
	chain := ground1(t, heisenberg(t, 16), ladder.Sector{"Sz": 0}, Options{Bond: 10})
	require.InEpsilon(t, chain.Variance, chain.TwoSiteVariance, 1e-6)
	m := freeLadder(t)
	wide := ground1(t, m.h, m.sector, Options{Bond: 12})
	require.Less(t, wide.TwoSiteVariance, wide.Variance)
	require.Greater(t, wide.TwoSiteVariance, 0.2*wide.Variance)
	t.Logf("ladder: %.2g of %.2g", wide.TwoSiteVariance, wide.Variance)
}
