package dmrg

import (
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

func build(t testing.TB, p *problem) *mpo.Operator[float64] {
	t.Helper()
	op, err := mpo.Build[float64](p.strings, mpo.Options{})
	require.NoError(t, err)
	return op
}

func energyOf[T dense.Scalar](t testing.TB, e *engine[T]) float64 {
	t.Helper()
	energy, err := e.energy()
	require.NoError(t, err)
	return energy
}

// randomEngine stands on a random state of the middle of a chain.
func randomEngine[T dense.Scalar](t *testing.T, h *ladder.Hamiltonian, sector ladder.Sector, bond int) *engine[T] {
	t.Helper()
	p, err := newProblem(h, sector, Options{Complex: dense.IsComplex[T]()})
	require.NoError(t, err)
	op, err := mpo.Build[T](p.strings, mpo.Options{})
	require.NoError(t, err)
	psi, err := mps.Random[T](p.strings.Group, p.strings.Axes, p.target.Charge, bond, rand.New(rand.NewPCG(1, 2)))
	require.NoError(t, err)
	e := newEngine(op, psi, p.opt, func() error { return nil })
	require.NoError(t, e.prepare())
	return e
}

// TestEnvironmentsStand checks after every update what the engine promises of centre and environments, through the energy.
func TestEnvironmentsStand(t *testing.T) {
	t.Run("real", func(t *testing.T) { testEnvironmentsStand[float64](t, heisenberg(t, 8), ladder.Sector{"Sz": 1}) })
	t.Run("complex", func(t *testing.T) {
		h := hamiltonian(t, 4, ladder.Open, []ladder.Site{ladder.Boson(2), ladder.Boson(2)}, fluxTerms...)
		testEnvironmentsStand[complex128](t, h, ladder.Sector{"N": 4})
	})
}

func testEnvironmentsStand[T dense.Scalar](t *testing.T, h *ladder.Hamiltonian, sector ladder.Sector) {
	e := randomEngine[T](t, h, sector, 10)
	check := func() {
		want := dense.Real(mpo.Expectation(e.psi, e.op, nil))
		require.InDelta(t, want, energyOf(t, e), 1e-12)
		for i := range e.psi.Len() {
			require.Equal(t, i <= e.psi.Center, e.envs.lefts[i] != nil, "left environment of site %d, centre %d", i, e.psi.Center)
			require.Equal(t, i >= e.psi.Center, e.envs.rights[i] != nil, "right environment of site %d, centre %d", i, e.psi.Center)
		}
		require.LessOrEqual(t, len(e.envs.spare), 2)
		c := e.psi.Clone()
		c.Center = -1
		require.InDelta(t, 1, c.Norm(), 1e-12, "norm without the promise of a centre")
		require.InDelta(t, 1, e.psi.Norm(), 1e-12, "norm of the centre")
	}
	check()
	e.onBond = func(Position) { check() }
	for _, perturbation := range []float64{1e-2, 0} {
		_, err := e.sweep(setting{bond: 12, perturbation: perturbation, noise: perturbation, vectors: 3, tolerance: 1e-6})
		require.NoError(t, err)
	}
	require.Positive(t, e.growth)
	require.Greater(t, e.flops, e.growth)
}

// TestSplitPerturbed: the halves are an isometry and a centre of norm one, within the bond; without perturbation they are those of the singular values.
func TestSplitPerturbed(t *testing.T) {
	t.Run("real", func(t *testing.T) { testSplitPerturbed[float64](t, heisenberg(t, 8), ladder.Sector{"Sz": 0}) })
	t.Run("complex", func(t *testing.T) {
		h := hamiltonian(t, 4, ladder.Open, []ladder.Site{ladder.Boson(2), ladder.Boson(2)}, fluxTerms...)
		testSplitPerturbed[complex128](t, h, ladder.Sector{"N": 4})
	})
}

func testSplitPerturbed[T dense.Scalar](t *testing.T, h *ladder.Hamiltonian, sector ladder.Sector) {
	e := randomEngine[T](t, h, sector, 12)
	e.psi.MoveCenter(3, nil)
	for i := range 3 {
		require.NoError(t, e.growLeft(i))
	}
	theta := block.Contract(e.psi.Sites[3], e.psi.Sites[4], []int{2}, []int{0})
	theta.Scale(dense.FromFloat[T](1 / theta.Norm()))
	proj := e.plan.Project(3, 2, e.envs.lefts[3], e.envs.rights[4], theta.Structure)
	for _, right := range []bool{true, false} {
		for _, perturbation := range []float64{1e-14, 1e-3, 0.3} {
			for _, bond := range []int{1, 2, 5, 11, 1000} {
				a, b, discarded, err := e.splitPerturbed(proj, theta, right, setting{bond: bond, perturbation: perturbation})
				require.NoError(t, err)
				require.LessOrEqual(t, a.Axes[2].Dim(), bond)
				iso, center := a, b
				overlap := block.Contract(a.Conj(), a, []int{0, 1}, []int{0, 1})
				if !right {
					iso, center = b, a
					overlap = block.Contract(b, b.Conj(), []int{1, 2}, []int{1, 2})
				}
				one := block.Identity[T](theta.Group, overlap.Axes[0])
				overlap.Axpy(dense.FromFloat[T](-1), one)
				require.InDelta(t, 0, overlap.Norm(), 1e-12, "no isometry: right %v, perturbation %v, bond %d", right, perturbation, bond)
				require.InDelta(t, 1, center.Norm(), 1e-12)
				require.Positive(t, iso.Size)
				// The product is theta projected and normalized.
				joined := block.Contract(a, b, []int{2}, []int{0})
				require.InDelta(t, 1-discarded, dense.Abs(block.Dot(joined, theta))*dense.Abs(block.Dot(joined, theta)), 1e-11)
				if perturbation < 1e-10 && (bond == 1 || bond == 1000) { // in between, starved charges take seats
					_, s, _, err := block.SVD(theta, 2, block.Cut{Bond: bond}, nil, nil)
					require.NoError(t, err)
					require.InDelta(t, s.Discarded, discarded, 1e-9)
				}
			}
		}
	}
}

// TestPerturbationReachesNewCharges: from a product state the perturbation brings the charges that one application of H reaches, and
// nothing else does.
func TestPerturbationReachesNewCharges(t *testing.T) {
	h := hamiltonian(t, 6, ladder.Open, one(ladder.Boson(2)), "-b^+[a,j+3]^2 b[a,j]^2 + h.c.", "0.1 n[a,j]")
	p, err := newProblem(h, ladder.Sector{"N": 2}, Options{})
	require.NoError(t, err)
	psi, err := mps.Product[float64](p.strings.Group, p.strings.Axes, []int{2, 0, 0, 0, 0, 0})
	require.NoError(t, err)
	for _, perturbation := range []float64{0, 1e-3} {
		e := newEngine(build(t, p), psi.Clone(), p.opt, func() error { return nil })
		require.NoError(t, e.prepare())
		out, err := e.sweep(setting{bond: 8, perturbation: perturbation, vectors: 4, tolerance: 1e-12})
		require.NoError(t, err)
		if perturbation == 0 {
			require.InDelta(t, 0.2, out.energy, 1e-12, "the pair cannot move")
		} else {
			require.InDelta(t, 0.2-2, out.energy, 1e-12, "the pair hops from site 0 to 3 with amplitude 2")
		}
	}
}

func TestChoose(t *testing.T) {
	for _, row := range []struct {
		name   string
		values [][]float64
		bond   int
		want   []int
	}{
		{"room for all", [][]float64{{0.1, 0.5}, {0.4}}, 5, []int{2, 1}},
		{"the largest", [][]float64{{0.1, 0.2, 0.3}, {0.15, 0.25}}, 3, []int{2, 1}},
		{"rounding is not kept", [][]float64{{1e-18, 1}, {1e-17}}, 9, []int{1, 0}},
		{"negative rounding", [][]float64{{-1e-17, 1}, {-1e-18}}, 9, []int{1, 0}},
		{"a starved charge takes a seat", [][]float64{{0.1, 0.2, 0.3, 0.4}, {1e-6}}, 4, []int{3, 1}},
		{"a tenth of the seats at most", [][]float64{{0.1, 0.2, 0.3, 0.4}, {1e-6}, {1e-7}, {1e-5}}, 4, []int{3, 0, 0, 1}},
		{"one seat for the largest alone", [][]float64{{0.3}, {0.7}}, 1, []int{0, 1}},
		{"who gives the seat does not starve", [][]float64{{0.5}, {0.3}, {0.2}}, 2, []int{1, 1, 0}},
		{"all zero: one state stays", [][]float64{{0}, {0}}, 4, []int{1, 0}},
	} {
		t.Run(row.name, func(t *testing.T) {
			sides := make([]side[float64], len(row.values))
			for i, v := range row.values {
				sides[i] = side[float64]{values: v, dim: len(v)}
			}
			choose(sides, row.bond, 1e-3)
			var got []int
			for _, q := range sides {
				got = append(got, q.keep)
			}
			require.Equal(t, row.want, got)
		})
	}
}

// TestDeterminism: bitwise the same at any number of threads and for the same seed. Without charges all blocks are one, and ten sites of spin one are
// enough for lists to be spread.
func TestDeterminism(t *testing.T) {
	h := hamiltonian(t, 10, ladder.Open, one(ladder.Spin(2)), "S[a,j].S[a,j+1]")
	run := func(opt Options) *Result {
		opt.Precision, opt.Bond, opt.Charges, opt.Sweeps = 1e-11, 81, []string{}, 12
		return ground1(t, h, nil, opt)
	}
	bits := func(r *Result) (all []float64) {
		c, _ := r.State.Real()
		for _, a := range c.Sites {
			all = append(all, a.Data...)
		}
		for _, s := range r.Sweeps {
			all = append(all, s.Energy, s.Discarded, s.Residual)
		}
		return append(all, r.Energy, r.EnergyLimit, r.EnergyError, r.Variance, r.VarianceRounding)
	}
	one := run(Options{Threads: 1, Seed: 5})
	theta := block.Contract(mid(t, one, 4), mid(t, one, 5), []int{2}, []int{0})
	p, err := newProblem(h, nil, Options{Charges: []string{}})
	require.NoError(t, err)
	c, _ := one.State.Real()
	e := newEngine(build(t, p), c.Clone(), p.opt, func() error { return nil })
	require.NoError(t, e.prepare())
	for i := range 4 {
		require.NoError(t, e.growLeft(i))
	}
	require.Greater(t, e.plan.Project(4, 2, e.envs.lefts[4], e.envs.rights[5], theta.Structure).Flops(), task.Threshold, "too small to be spread")
	require.Equal(t, bits(one), bits(run(Options{Threads: 2, Seed: 5})), "two threads")
	require.Equal(t, bits(one), bits(run(Options{Threads: 3, Seed: 5})), "three threads")
	require.NotEqual(t, bits(one), bits(run(Options{Threads: 1, Seed: 6})), "the seed has no effect")
}

func mid(t *testing.T, r *Result, site int) *block.Tensor[float64] {
	c, ok := r.State.Real()
	require.True(t, ok)
	return c.Sites[site]
}
