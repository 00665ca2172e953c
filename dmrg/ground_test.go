package dmrg

import (
	"context"
	"math"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// hamiltonian makes a ladder of equal legs a, b, ... and the sum of the formulas on it.
func hamiltonian(t testing.TB, rungs int, boundary ladder.Boundary, legs []ladder.Site, formulas ...string) *ladder.Hamiltonian {
	t.Helper()
	var parts []ladder.Part
	for i, s := range legs {
		parts = append(parts, ladder.Leg(string(rune('a'+i)), s))
	}
	lad, err := ladder.New(rungs, boundary, parts...)
	require.NoError(t, err)
	var terms []ladder.Term
	for _, f := range formulas {
		terms = append(terms, ladder.Term{Formula: f})
	}
	h, err := lad.Hamiltonian(nil, terms...)
	require.NoError(t, err)
	return h
}

func one(s ladder.Site) []ladder.Site { return []ladder.Site{s} }

func heisenberg(t testing.TB, n int) *ladder.Hamiltonian {
	return hamiltonian(t, n, ladder.Open, one(ladder.Spin(1)), "S[a,j].S[a,j+1]")
}

var hubbardTerms = []string{"-c_up^+[a,j+1] c_up[a,j] + h.c.", "-c_down^+[a,j+1] c_down[a,j] + h.c.", "4 n_up[a,j] n_down[a,j]"}

func hubbard(t testing.TB, n int) *ladder.Hamiltonian {
	return hamiltonian(t, n, ladder.Open, one(ladder.Electron()), hubbardTerms...)
}

// ring of a pi flux per plaquette through a generic gauge: complex in every basis.
var fluxTerms = []string{"-exp(0.4*i) b^+[a,j+1] b[a,j] + h.c.", "-exp(-0.4*i) b^+[b,j+1] b[b,j] + h.c.", "-b^+[a,j] b[b,j] + h.c.",
	"2 n[a,j] (n[a,j]-1)", "2 n[b,j] (n[b,j]-1)"}

func ground1(t testing.TB, h *ladder.Hamiltonian, sector ladder.Sector, opt Options) *Result {
	t.Helper()
	r, err := Ground(context.Background(), h, sector, opt)
	require.NoError(t, err)
	return r
}

// requireHonest checks what must hold of every result.
func requireHonest(t testing.TB, r *Result, want float64) {
	t.Helper()
	require.LessOrEqual(t, math.Abs(r.EnergyLimit-want), r.EnergyError, "the error bar: limit %v, exact %v, verdict %v", r.EnergyLimit, want, r.Verdict)
	require.GreaterOrEqual(t, r.Energy, want-1e-12*(1+math.Abs(want)), "an energy below the ground energy")
	require.InDelta(t, 1, r.State.Norm(), 1e-12)
	require.Equal(t, r.Verdict == Converged, r.Reason == "")
	require.Equal(t, r.State.MaxBond(), r.LargestBond)
	require.Equal(t, r.State.Charges(), r.Sector)
}

func TestOptionsAreChecked(t *testing.T) {
	h := heisenberg(t, 4)
	for _, row := range []struct {
		name string
		opt  Options
		says string
	}{
		{"negative precision", Options{Precision: -1}, "Precision = -1"},
		{"NaN precision", Options{Precision: math.NaN()}, "Precision = NaN"},
		{"infinite precision", Options{Precision: math.Inf(1)}, "Precision = +Inf"},
		{"negative observable precision", Options{ObservablePrecision: -1e-3}, "ObservablePrecision = -0.001"},
		{"NaN observable precision", Options{ObservablePrecision: math.NaN()}, "ObservablePrecision = NaN"},
		{"negative bond", Options{Bond: -5}, "Bond = -5"},
		{"negative sweeps", Options{Sweeps: -1}, "Sweeps = -1"},
		{"negative time", Options{Time: -time.Second}, "Time = -1s"},
		{"negative memory", Options{Memory: -1}, "Memory = -1"},
		{"negative threads", Options{Threads: -2}, "Threads = -2"},
		{"unknown opening", Options{Opening: 7}, "Opening = 7"},
		{"unknown charge", Options{Charges: []string{"N"}}, `charge "N"`},
	} {
		t.Run(row.name, func(t *testing.T) {
			r, err := Ground(context.Background(), h, nil, row.opt)
			require.ErrorContains(t, err, row.says)
			require.Nil(t, r)
		})
	}
	_, err := Ground(context.Background(), h, ladder.Sector{"Sz": 7}, Options{})
	require.ErrorContains(t, err, "Sz = 7")
	_, err = Ground(context.Background(), h, ladder.Sector{"M": 0}, Options{})
	require.ErrorContains(t, err, "M")
}

func TestDefaultsOfOptions(t *testing.T) {
	for _, row := range []struct {
		name                 string
		opt                  Options
		scale                float64
		precision, observing float64
		weight               float64
	}{
		{"zero value", Options{}, 1, 1e-8, math.Sqrt(1e-11), 1e-13},
		{"couplings of 1e8", Options{}, 1e8, 1e-8, math.Sqrt(1e-19), 1e-21},
		{"couplings of 1e-8: the precision asks for nothing", Options{}, 1e-8, 1e-8, 1e-3, 1e-8},
		{"precision alone", Options{Precision: 1e-4}, 1, 1e-4, math.Sqrt(1e-7), 1e-9},
		{"no precision worth the name", Options{Precision: 1e9}, 1, 1e9, 1e-3, 1e-8},
		{"beyond double precision", Options{Precision: 1e-30}, 1, 1e-30, math.Sqrt(1e-33), leastWeight},
		{"both", Options{Precision: 1e-6, ObservablePrecision: 1e-2}, 1, 1e-6, 1e-2, 1e-8},
		{"loose observables named", Options{Precision: 1, ObservablePrecision: 1}, 1, 1, 1, largestWeight},
	} {
		t.Run(row.name, func(t *testing.T) {
			s := row.opt.settle(row.scale)
			assert.Equal(t, row.precision, s.Precision)
			assert.InEpsilon(t, row.observing, s.ObservablePrecision, 1e-12)
			assert.InEpsilon(t, row.weight, s.weight, 1e-9)
			assert.Equal(t, row.opt.ObservablePrecision > 0, s.strict)
			assert.Equal(t, 4096, s.Bond)
			assert.Equal(t, 200, s.Sweeps)
		})
	}
}

// TestSmallLadders has known answers where a sweep has little or nothing to do.
func TestSmallLadders(t *testing.T) {
	spin, boson, fermion := ladder.Spin(1), ladder.Boson(2), ladder.Fermion()
	for _, row := range []struct {
		name   string
		h      *ladder.Hamiltonian
		sector ladder.Sector
		want   float64
	}{
		{"one site, one state", hamiltonian(t, 1, ladder.Open, one(boson), "3 n[a,j]"), ladder.Sector{"N": 2}, 6},
		{"one site without charges", hamiltonian(t, 1, ladder.Open, one(spin), "S^x[a,j]", "S^z[a,j]"), nil, -math.Sqrt(0.5)},
		{"one site, complex", hamiltonian(t, 1, ladder.Open, one(ladder.Spin(2)), "S^x[a,j]", "S^y[a,j]", "S^z[a,j]"), nil, -math.Sqrt(3)},
		{"two sites", heisenberg(t, 2), ladder.Sector{"Sz": 0}, -0.75},
		{"two sites, triplet", heisenberg(t, 2), ladder.Sector{"Sz": 1}, 0.25},
		{"one rung of three legs", hamiltonian(t, 1, ladder.Open, []ladder.Site{spin, spin, spin}, "S[a,j].S[b,j]", "S[b,j].S[c,j]"), ladder.Sector{"Sz": "1/2"}, -1},
		{"all filled: one basis state", hamiltonian(t, 6, ladder.Open, one(fermion), "-c^+[a,j+1] c[a,j] + h.c.", "0.5 n[a,j] n[a,j+1]"), ladder.Sector{"N": 6}, 2.5},
		{"all empty", hamiltonian(t, 6, ladder.Open, one(fermion), "-c^+[a,j+1] c[a,j] + h.c."), ladder.Sector{"N": 0}, 0},
		{"polarized", heisenberg(t, 9), ladder.Sector{"Sz": "9/2"}, 2},
		{"constant", hamiltonian(t, 5, ladder.Open, one(fermion), "2"), ladder.Sector{"N": 2}, 2},
		{"large constant beside small couplings", hamiltonian(t, 2, ladder.Open, one(spin), "1000", "S[a,j].S[a,j+1]"), ladder.Sector{"Sz": 0}, 999.25},
	} {
		t.Run(row.name, func(t *testing.T) {
			r := ground1(t, row.h, row.sector, Options{})
			require.Equal(t, Converged, r.Verdict, r.Reason)
			requireHonest(t, r, row.want)
			require.InDelta(t, row.want, r.Energy, 1e-12*(1+math.Abs(row.want)))
			require.LessOrEqual(t, r.EnergyError, 1e-8)
			require.InDelta(t, 0, r.Variance, max(1e-12, r.VarianceRounding))
		})
	}
}

// TestFourCharges: four species that keep their numbers, one by one, so that four U(1) charges are in use at once.
func TestFourCharges(t *testing.T) {
	sites := []ladder.Site{ladder.Fermion(), ladder.Fermion(), ladder.Boson(1), ladder.Boson(1)}
	terms := []string{"-c^+[a,j+1] c[a,j] + h.c.", "-0.7 c^+[b,j+1] c[b,j] + h.c.", "-b^+[c,j+1] b[c,j] + h.c.", "-0.4 b^+[d,j+1] b[d,j] + h.c.",
		"0.6 n[a,j] n[b,j]", "0.3 n[b,j] n[c,j]", "-0.5 n[c,j] n[d,j]", "0.2 j n[a,j]"}
	h := hamiltonian(t, 3, ladder.Open, sites, terms...)
	r := ground1(t, h, ladder.Sector{"N_a": 1, "N_b": 2, "N_c": 1, "N_d": 2}, Options{Precision: 1e-10})
	require.Len(t, r.Sector, 4)

	var list []exact.Site
	var all []exact.Term
	for range 3 {
		list = append(list, exact.Fermion(), exact.Fermion(), exact.Boson(1), exact.Boson(1))
	}
	hop := func(t float64, op string, leg int) {
		for j := range 2 {
			all = append(all, exact.WithAdjoints(exact.T(complex(-t, 0), op+"^+", 4*(j+1)+leg, op, 4*j+leg))...)
		}
	}
	hop(1, "c", 0)
	hop(0.7, "c", 1)
	hop(1, "b", 2)
	hop(0.4, "b", 3)
	for j := range 3 {
		all = append(all, exact.T(0.6, "n", 4*j, "n", 4*j+1), exact.T(0.3, "n", 4*j+1, "n", 4*j+2), exact.T(-0.5, "n", 4*j+2, "n", 4*j+3),
			exact.T(complex(0.2*float64(j), 0), "n", 4*j))
	}
	var numbers []exact.Number
	for leg := range 4 {
		numbers = append(numbers, exact.Particles(list, leg, leg+4, leg+8))
	}
	basis, err := exact.NewBasis(list, numbers, []int{1, 2, 1, 2})
	require.NoError(t, err)
	m, err := basis.Matrix(all...)
	require.NoError(t, err)
	ground, _, err := m.Ground()
	require.NoError(t, err)
	require.Equal(t, Converged, r.Verdict)
	requireHonest(t, r, ground.Energy)
	require.InDelta(t, ground.Energy, r.Energy, 1e-10)
}

// TestScales multiplies a Hamiltonian: with a precision that goes along, the search must not notice.
func TestScales(t *testing.T) {
	want, err := exact.HeisenbergChain(14, 7)
	require.NoError(t, err)
	for _, row := range []struct {
		factor  string
		scale   float64
		opt     Options
		verdict Verdict
		error   float64 // relative
	}{
		{"1", 1, Options{Precision: 1e-9}, Converged, 1e-9},
		{"1e-8", 1e-8, Options{Precision: 1e-17}, Converged, 1e-9},
		{"1e8", 1e8, Options{Precision: 1e-1}, Converged, 1e-9},
		{"1e-150", 1e-150, Options{Precision: 1e-159}, Converged, 1e-9},
		{"1e250", 1e250, Options{Precision: 1e241}, Converged, 1e-9},
		// The default precision is absolute: met by anything here, out of reach there.
		{"1e-8", 1e-8, Options{}, Converged, 1},
		{"1e8", 1e8, Options{}, Suspect, 1e-12},
	} {
		h := hamiltonian(t, 14, ladder.Open, one(ladder.Spin(1)), row.factor+" S[a,j].S[a,j+1]")
		r := ground1(t, h, ladder.Sector{"Sz": 0}, row.opt)
		require.Equal(t, row.verdict, r.Verdict, "%s: %s", row.factor, r.Reason)
		requireHonest(t, r, want*row.scale)
		require.InDelta(t, want, r.Energy/row.scale, row.error, row.factor)
		require.Less(t, len(r.Sweeps), 40, row.factor)
	}
}

// TestArithmetic: real where a gauge makes it so, complex where none does or where asked for; the energy does not know.
func TestArithmetic(t *testing.T) {
	want, err := exact.HeisenbergChain(10, 5)
	require.NoError(t, err)
	for _, complex := range []bool{false, true} {
		r := ground1(t, heisenberg(t, 10), ladder.Sector{"Sz": 0}, Options{Complex: complex})
		_, isComplex := r.State.Complex()
		require.Equal(t, complex, isComplex)
		require.InDelta(t, want, r.Energy, 1e-8)
	}
	r := ground1(t, hamiltonian(t, 4, ladder.Open, []ladder.Site{ladder.Boson(1), ladder.Boson(1)}, fluxTerms[:3]...), ladder.Sector{"N": 3}, Options{})
	_, isComplex := r.State.Complex()
	require.True(t, isComplex, "a flux of 0.8 a plaquette has no real gauge")
}

// TestDegenerate: any state of the multiplet will do, but energy and verdict must hold.
func TestDegenerate(t *testing.T) {
	spin := ladder.Spin(1)
	for _, row := range []struct {
		name   string
		h      *ladder.Hamiltonian
		sector ladder.Sector
		want   float64
	}{
		// Two dimer coverings of the ring (Majumdar, Ghosh 1969).
		{"Majumdar-Ghosh ring", hamiltonian(t, 10, ladder.Periodic, one(spin), "S[a,j].S[a,j+1]", "0.5 S[a,j].S[a,j+2]"), ladder.Sector{"Sz": 0}, -3.75},
		// Two Neel states, no term to join them.
		{"Ising antiferromagnet", hamiltonian(t, 8, ladder.Periodic, one(spin), "S^z[a,j] S^z[a,j+1]"), ladder.Sector{"Sz": 0}, -2},
		// A particle on any of seven sites.
		{"no hopping at all", hamiltonian(t, 7, ladder.Open, one(ladder.Fermion()), "-0.5 n[a,j]"), ladder.Sector{"N": 1}, -0.5},
		// A multiplet of spin 4: S^z = 0 is one of nine.
		{"ferromagnet", hamiltonian(t, 8, ladder.Open, one(spin), "-S[a,j].S[a,j+1]"), ladder.Sector{"Sz": 0}, -1.75},
		// Fermions on a ring of eight with a level half filled.
		{"open shell", hamiltonian(t, 8, ladder.Periodic, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c."), ladder.Sector{"N": 4}, -2 - 4*math.Cos(math.Pi/4)},
	} {
		t.Run(row.name, func(t *testing.T) {
			r := ground1(t, row.h, row.sector, Options{})
			require.Equal(t, Converged, r.Verdict, r.Reason)
			requireHonest(t, r, row.want)
			require.InDelta(t, row.want, r.Energy, 1e-8)
		})
	}
}

// TestFarTerms: from a product state, where neighbours cannot move alone (design.md asks for it on larger ladders).
func TestFarTerms(t *testing.T) {
	fermion := one(ladder.Fermion())
	far := ground1(t, hamiltonian(t, 12, ladder.Open, fermion, "-c^+[a,j+3] c[a,j] + h.c."), ladder.Sector{"N": 6}, Options{})
	// Three chains of four sites with two particles each: levels 2 cos(k pi/5).
	require.InDelta(t, -3*math.Sqrt(5), far.Energy, 1e-8)
	require.Equal(t, Converged, far.Verdict)
	// Without perturbation the same search stays where it was, unless another start tells.
	stuck := ground1(t, hamiltonian(t, 12, ladder.Open, fermion, "-c^+[a,j+3] c[a,j] + h.c."), ladder.Sector{"N": 6}, Options{Opening: Unperturbed, Unprobed: true})
	require.Greater(t, stuck.Energy, far.Energy+0.1, "the test would not see a perturbation that does nothing")
}
