package mps

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

func TestCanonicalForms(t *testing.T) {
	both(t, canonicalForms[float64], canonicalForms[complex128])
}

func canonicalForms[T dense.Scalar](t *rapid.T) {
	g, axes := drawAxes(t)
	c := drawChain[T](t, g, axes, drawTotal(t, g, axes))
	want := vector(c)
	for range 3 {
		center := rapid.IntRange(0, c.Len()-1).Draw(t, "to")
		if rapid.Bool().Draw(t, "forget") {
			c.Center = -1
		}
		c.Canonicalize(center, nil)
		require.Equal(t, center, c.Center)
		requireCanonical(t, c)
		requireClose(t, want, vector(c), 1e-13)
		require.InEpsilon(t, norm(want), c.Norm(), 1e-13)
	}
	c.Center = -1
	require.InEpsilon(t, norm(want), c.Norm(), 1e-13)
	require.InEpsilon(t, norm(want), c.Normalize(), 1e-13)
	require.InDelta(t, 1, c.Norm(), 1e-13)
	c.Scale(number[T](3, -4))
	size := dense.Abs(number[T](3, -4))
	for i := range want {
		want[i] *= dense.ToComplex(number[T](3, -4)) / complex(norm(want), 0)
	}
	require.InEpsilon(t, size, c.Norm(), 1e-13)
}

func TestAlgebra(t *testing.T) { both(t, algebra[float64], algebra[complex128]) }

func algebra[T dense.Scalar](t *rapid.T) {
	g, axes := drawAxes(t)
	total := drawTotal(t, g, axes)
	a, b := drawChain[T](t, g, axes, total), drawChain[T](t, g, axes, total)
	va, vb := vector(a), vector(b)
	scale := norm(va) * norm(vb)
	overlap := dense.ToComplex(Overlap(a, b, nil))
	require.LessOrEqual(t, math.Abs(real(overlap-inner(va, vb))), 1e-13*scale)
	require.LessOrEqual(t, math.Abs(imag(overlap-inner(va, vb))), 1e-13*scale)

	alpha, beta := number[T](0.5, 2), number[T](-1.5, 0.25)
	sum := Add(alpha, a, beta, b)
	_, err := NewChain(g, sum.Sites)
	require.NoError(t, err)
	require.Equal(t, -1, sum.Center)
	for i, d := range sum.BondDims() {
		require.Equal(t, a.BondDims()[i]+b.BondDims()[i], d)
	}
	want := make([]complex128, len(va))
	for i := range want {
		want[i] = dense.ToComplex(alpha)*va[i] + dense.ToComplex(beta)*vb[i]
	}
	require.LessOrEqual(t, norm(minus(want, vector(sum))), 1e-13*(norm(va)+norm(vb)))

	other := g.Add(total, axes[0].Sectors[0].Charge)
	if c, err := Random[T](g, axes, other, 3, drawRng(t)); err == nil && other != total {
		require.Zero(t, Overlap(a, c, nil))
		require.Panics(t, func() { Add(alpha, a, beta, c) })
	}
}

// A difference of states that nearly agree has a norm right to all digits.
func TestNormOfADifference(t *testing.T) {
	g, axes := groups[1], uniform(8, 0, 1)
	rng := rand.New(rand.NewPCG(5, 6))
	a, err := Random[float64](g, axes, block.Charge{4}, 6, rng)
	require.NoError(t, err)
	b, err := Random[float64](g, axes, block.Charge{4}, 6, rng)
	require.NoError(t, err)
	near := Add(1, a, 1e-10, b)
	d := Add(1, near, -1, a)
	require.InEpsilon(t, 1e-10, d.Norm(), 1e-5)
}

func TestSchmidtValues(t *testing.T) { both(t, schmidtValues[float64], schmidtValues[complex128]) }

func schmidtValues[T dense.Scalar](t *rapid.T) {
	g, axes := drawAxes(t)
	c := drawChain[T](t, g, axes, drawTotal(t, g, axes))
	before := c.Clone()
	psi := vector(c)
	all, err := c.Spectra(nil)
	require.NoError(t, err)
	require.Len(t, all, len(axes)-1)
	for b := range all {
		one, err := c.Schmidt(b, nil)
		require.NoError(t, err)
		for _, s := range []block.Spectrum{all[b], one} {
			requireLevels(t, schmidt(g, axes, psi, b), s, norm(psi))
		}
	}
	require.Equal(t, before, c, "reading must not change the chain")
}

func requireLevels(t require.TestingT, want []level, s block.Spectrum, size float64) {
	require.Equal(t, block.In, s.Axis.Flow)
	require.InEpsilon(t, size, s.Norm, 1e-12)
	var got []level
	for i, list := range s.Values {
		require.Len(t, list, s.Axis.Sectors[i].Dim)
		require.True(t, slices.IsSortedFunc(list, func(a, b float64) int { return -int(math.Copysign(1, a-b)) }) || len(list) < 2)
		for _, v := range list {
			got = append(got, level{s.Axis.Sectors[i].Charge, v * size})
		}
	}
	strong := func(l level) bool { return l.value <= 1e-11*size }
	want, got = slices.DeleteFunc(want, strong), slices.DeleteFunc(got, strong)
	slices.SortFunc(want, compareLevels)
	slices.SortFunc(got, compareLevels)
	require.Equal(t, len(want), len(got))
	for i := range want {
		require.Equal(t, want[i].charge, got[i].charge)
		require.InDelta(t, want[i].value, got[i].value, 1e-12*size)
	}
}

func TestTruncation(t *testing.T) { both(t, truncation[float64], truncation[complex128]) }

func truncation[T dense.Scalar](t *rapid.T) {
	g, axes := drawAxes(t)
	c := drawChain[T](t, g, axes, drawTotal(t, g, axes))
	psi := vector(c)
	cut := block.Cut{
		Bond:   rapid.IntRange(0, 4).Draw(t, "cap"),
		Weight: rapid.SampledFrom([]float64{0, 1e-12, 1e-3, 0.1, 0.5}).Draw(t, "weight"),
	}
	discarded, err := c.Truncate(cut, nil)
	require.NoError(t, err)
	require.Equal(t, 0, c.Center)
	requireCanonical(t, c)
	lost := norm(minus(psi, vector(c))) / norm(psi)
	require.InDelta(t, lost*lost, discarded, 1e-13, "the reported weight is the error")
	require.InDelta(t, 1-discarded, math.Pow(c.Norm()/norm(psi), 2), 1e-12)
	if cut.Bond == 0 {
		require.LessOrEqual(t, discarded, cut.Weight)
	} else {
		require.LessOrEqual(t, c.MaxBond(), cut.Bond)
	}
	if cut.Bond == 0 && cut.Weight == 0 {
		requireClose(t, psi, vector(c), 1e-13)
	}
}

// For a single cut the truncation is the best there is: it keeps the largest Schmidt values over all charges.
func TestTruncationIsOptimal(t *testing.T) {
	g, axes := groups[1], uniform(2, 0, 0, 1, 1, 1, 2, 2)
	c, err := Random[complex128](g, axes, block.Charge{2}, 100, rand.New(rand.NewPCG(1, 2)))
	require.NoError(t, err)
	levels := schmidt(g, axes, vector(c), 0)
	slices.SortFunc(levels, func(a, b level) int { return int(math.Copysign(1, b.value-a.value)) })
	want := 0.0
	for _, l := range levels[3:] {
		want += l.value * l.value
	}
	discarded, err := c.Truncate(block.Cut{Bond: 3}, nil)
	require.NoError(t, err)
	require.InDelta(t, want, discarded, 1e-14)
	require.Greater(t, discarded, 1e-3)
}

// The weight that may be dropped is shared among the bonds and nearly used up.
func TestWeightIsSharedAmongBonds(t *testing.T) {
	g, axes := groups[1], uniform(12, 0, 1)
	c, err := Random[float64](g, axes, block.Charge{6}, 60, rand.New(rand.NewPCG(5, 6)))
	require.NoError(t, err)
	before := c.BondDims()
	discarded, err := c.Truncate(block.Cut{Weight: 0.3}, nil)
	require.NoError(t, err)
	require.LessOrEqual(t, discarded, 0.3)
	require.Greater(t, discarded, 0.2)
	for i, d := range c.BondDims()[3:8] {
		require.Less(t, d, before[3+i])
	}
}

func TestTruncateBringsASumDown(t *testing.T) {
	g, axes := groups[1], uniform(8, 0, 1)
	a, err := Random[float64](g, axes, block.Charge{4}, 4, rand.New(rand.NewPCG(5, 6)))
	require.NoError(t, err)
	sum := Add(0.5, a, 0.5, a)
	require.Equal(t, 2*a.MaxBond(), sum.MaxBond())
	discarded, err := sum.Truncate(block.Cut{Floor: 1e-14}, nil)
	require.NoError(t, err)
	require.Less(t, discarded, 1e-27)
	require.Equal(t, a.BondDims(), sum.BondDims())
	require.InDelta(t, 1, Overlap(a, sum, nil), 1e-14)
}

// uniform returns n axes of states with the given charges.
func uniform(n int, charges ...int32) []block.Axis {
	var sectors []block.Sector
	for _, q := range charges {
		sectors = append(sectors, block.Sector{Charge: block.Charge{q}, Dim: 1})
	}
	axes := make([]block.Axis, n)
	for i := range axes {
		axes[i] = block.NewAxis(block.In, sectors...)
	}
	return axes
}

// Site tensors far from norm one: each step overflows, the state does not.
func TestExtremeScales(t *testing.T) {
	g, axes := groups[1], uniform(6, 0, 1)
	rng := rand.New(rand.NewPCG(3, 4))
	c, err := Random[float64](g, axes, block.Charge{3}, 8, rng)
	require.NoError(t, err)
	want := vector(c)
	wild := c.Clone()
	for i, e := range []int{500, 500, 500, -500, -500, -500} {
		scaleBy(wild.Sites[i], e)
	}
	wild.Center = -1
	require.InDelta(t, 1, wild.Norm(), 1e-13)
	require.InDelta(t, 1, Overlap(wild, c, nil), 1e-13)
	require.InDelta(t, 1, Overlap(wild, wild, nil), 1e-13)
	s, err := wild.Schmidt(2, nil)
	require.NoError(t, err)
	require.InDelta(t, 1, s.Norm, 1e-13)
	cut := wild.Clone()
	_, err = cut.Truncate(block.Cut{}, nil)
	require.NoError(t, err)
	requireClose(t, want, vector(cut), 1e-13)
	wild.Canonicalize(3, nil)
	requireClose(t, want, vector(wild), 1e-13)

	tiny := c.Clone()
	scaleBy(tiny.Sites[0], -1000)
	require.Greater(t, tiny.Normalize(), 0.0)
	require.InDelta(t, 1, tiny.Norm(), 1e-12)
}

func TestZeroState(t *testing.T) {
	g, axes := groups[1], uniform(4, 0, 1)
	c, err := Random[float64](g, axes, block.Charge{2}, 4, rand.New(rand.NewPCG(3, 4)))
	require.NoError(t, err)
	c.Scale(0)
	for _, center := range []int{-1, 0} {
		c.Center = center
		require.Zero(t, c.Norm())
		require.Zero(t, c.Normalize())
		require.Zero(t, Overlap(c, c, nil))
		_, err = c.Schmidt(1, nil)
		require.ErrorIs(t, err, block.ErrZero)
		_, err = c.Spectra(nil)
		require.ErrorIs(t, err, block.ErrZero)
		before := c.Clone()
		_, err = c.Truncate(block.Cut{}, nil)
		require.ErrorIs(t, err, block.ErrZero)
		require.ErrorContains(t, err, "cut 2")
		require.Equal(t, before, c)
	}
	c.Canonicalize(2, nil)
	require.Zero(t, c.Norm())
}

func TestThreadsDoNotChangeTheResult(t *testing.T) {
	g, axes := groups[1], uniform(10, 0, 1, 2)
	c, err := Random[complex128](g, axes, block.Charge{10}, 60, rand.New(rand.NewPCG(3, 4)))
	require.NoError(t, err)
	run := func(pool *task.Pool) (*Chain[complex128], complex128) {
		d := c.Clone()
		d.Center = -1
		_, err := d.Truncate(block.Cut{Bond: 40}, pool)
		require.NoError(t, err)
		d.MoveCenter(5, pool)
		return d, Overlap(c, d, pool)
	}
	one, x := run(nil)
	three, y := run(task.New(3))
	require.Equal(t, one, three)
	require.Equal(t, x, y)
}

func TestNewChainRefuses(t *testing.T) {
	g := groups[1]
	c, err := Product[float64](g, uniform(3, 0, 1), []int{1, 0, 1})
	require.NoError(t, err)
	tensor := func(total block.Charge, axes ...block.Axis) *block.Tensor[float64] {
		return block.New[float64](block.NewStructure(g, axes, total))
	}
	phys := uniform(1, 0, 1)[0]
	in, out := single(block.In, block.Charge{}), single(block.Out, block.Charge{1})
	good := tensor(block.Charge{}, in, phys, out)
	wide := block.NewAxis(block.Out, block.Sector{Charge: block.Charge{1}, Dim: 2})
	short := tensor(block.Charge{}, in, phys, out)
	short.Data = short.Data[:1]
	for _, row := range []struct {
		name  string
		group block.Group
		sites []*block.Tensor[float64]
		want  string
	}{
		{"no sites", g, nil, "no sites"},
		{"no tensor", g, []*block.Tensor[float64]{nil}, "site 0: no tensor"},
		{"another group", groups[2], []*block.Tensor[float64]{good}, "N: U(1)"},
		{"two axes", g, []*block.Tensor[float64]{tensor(block.Charge{}, in, in.Reversed())}, "2 axes"},
		{"wrong flow", g, []*block.Tensor[float64]{tensor(block.Charge{}, in, phys.Reversed(), out)}, "flows in, out, out"},
		{"a total charge", g, []*block.Tensor[float64]{tensor(block.Charge{1}, in, phys, out)}, "total charge"},
		{"a slab too short", g, []*block.Tensor[float64]{short}, "slab of 1 elements"},
		{"an empty axis", g, []*block.Tensor[float64]{tensor(block.Charge{}, in, block.NewAxis(block.In), out)}, "axis 1 has no states"},
		{"bonds that do not meet", g, []*block.Tensor[float64]{c.Sites[0], c.Sites[0]}, "site 1: its left bond"},
		{"left edge with a charge", g, c.Sites[1:], "left edge"},
		{"right edge of two states", g, []*block.Tensor[float64]{tensor(block.Charge{}, in, phys, wide)}, "right edge"},
	} {
		t.Run(row.name, func(t *testing.T) {
			_, err := NewChain(row.group, row.sites)
			require.ErrorContains(t, err, row.want)
		})
	}
}

func TestMisusePanics(t *testing.T) {
	g := groups[1]
	c, err := Product[float64](g, uniform(3, 0, 1), []int{1, 0, 1})
	require.NoError(t, err)
	other, err := Product[float64](g, uniform(3, 0, 2), []int{1, 0, 0})
	require.NoError(t, err)
	short, err := Product[float64](g, uniform(2, 0, 1), []int{1, 1})
	require.NoError(t, err)
	foreign, err := Product[float64](groups[0], uniform(3, 0), []int{0, 0, 0})
	require.NoError(t, err)
	for _, row := range []struct {
		name, want string
		run        func()
	}{
		{"centre beyond the end", "MoveCenter to site 3", func() { c.MoveCenter(3, nil) }},
		{"cut beyond the end", "cut 2", func() { _, _ = c.Schmidt(2, nil) }},
		{"other states", "site 0 has the states", func() { Overlap(c, other, nil) }},
		{"other length", "different lengths", func() { Overlap(c, short, nil) }},
		{"other group", "different groups", func() { Add(1, c, 1, foreign) }},
	} {
		t.Run(row.name, func(t *testing.T) {
			defer func() { require.Contains(t, recover(), row.want) }()
			row.run()
		})
	}
}

func TestPromote(t *testing.T) {
	c, err := Random[float64](groups[3], uniform(4, 0, 1, 2), block.Charge{4}, 5, rand.New(rand.NewPCG(3, 4)))
	require.NoError(t, err)
	p := Promote(c)
	require.Equal(t, vector(c), vector(p))
	require.Equal(t, c.Center, p.Center)
	_, err = NewChain(p.Group, p.Sites)
	require.NoError(t, err)
}
