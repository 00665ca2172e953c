package block

import (
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/internal/dense"
	"rundle/internal/task"
)

// drawPair draws two structures that share some axes at random places, and the pairs.
func drawPair(t *rapid.T) (a, b *Structure, axesA, axesB []int) {
	g := drawGroup(t)
	shared := rapid.IntRange(0, 3).Draw(t, "shared")
	freeA := rapid.IntRange(0, 4-shared).Draw(t, "free of a")
	freeB := rapid.IntRange(0, 4-shared).Draw(t, "free of b")
	bonds := make([]Axis, shared)
	for i := range bonds {
		bonds[i] = drawAxis(t, g)
	}
	axesA, listA := drawPlaces(t, g, bonds, freeA)
	for i := range bonds {
		bonds[i] = bonds[i].Reversed()
	}
	axesB, listB := drawPlaces(t, g, bonds, freeB)
	return NewStructure(g, listA, drawTotal(t, g, listA)), NewStructure(g, listB, drawTotal(t, g, listB)), axesA, axesB
}

// drawPlaces puts the bonds between free new axes; half of the time they stand together, in order, in front or behind.
func drawPlaces(t *rapid.T, g Group, bonds []Axis, free int) (places []int, axes []Axis) {
	n := len(bonds) + free
	order := drawOrder(t, n)
	switch rapid.IntRange(0, 3).Draw(t, "layout") {
	case 0:
		slices.Sort(order)
	case 1:
		slices.Sort(order)
		order = append(order[free:], order[:free]...)
	}
	places = order[:len(bonds)]
	axes = make([]Axis, n)
	for i, k := range places {
		axes[k] = bonds[i]
	}
	for k := range axes {
		if axes[k].Flow == 0 {
			axes[k] = drawAxis(t, g)
		}
	}
	return places, axes
}

func TestContractEqualsDense(t *testing.T) {
	checkBoth(t, contractEqualsDense[float64], contractEqualsDense[complex128])
}

func contractEqualsDense[T dense.Scalar](t *rapid.T) {
	sa, sb, axesA, axesB := drawPair(t)
	a, b := drawTensor[T](t, sa), drawTensor[T](t, sb)
	want := contractDense(denseOf(a), denseOf(b), axesA, axesB)
	p := PlanContract(sa, sb, axesA, axesB)
	out := New[T](p.Out)
	for i := range out.Data {
		out.Data[i] = dense.FromFloat[T](math.NaN()) // all of it is overwritten, gaps too
	}
	var ws Scratch[T]
	for range 2 {
		RunContract(p, out.Data, a.Data, b.Data, &ws, nil)
		requireTensor(t, out, "contraction")
		requireClose(t, want, denseOf(out), 1e-13, "contraction")
	}
	requireClose(t, want, denseOf(Contract(a, b, axesA, axesB)), 1e-13, "convenient form")
}

// TestDirectLayouts makes sure that the layouts that need no permutation plan none, and others one.
func TestDirectLayouts(t *testing.T) {
	g := mustGroup(t, 0)
	x, y := NewAxis(In, Sector{Charge{0}, 2}, Sector{Charge{1}, 3}), NewAxis(In, Sector{Charge{-1}, 1}, Sector{Charge{1}, 2})
	f := NewAxis(Out, Sector{Charge{0}, 2}, Sector{Charge{1}, 1}, Sector{Charge{2}, 2})
	xo, yo := x.Reversed(), y.Reversed()
	rows := []struct {
		name         string
		a, b         []Axis
		axesA, axesB []int
		opA, opB     dense.Op
		permuteA     bool
		permuteB     bool
	}{
		{"trailing, leading", []Axis{f, x, y}, []Axis{xo, yo, f}, []int{1, 2}, []int{0, 1}, dense.NoTrans, dense.NoTrans, false, false},
		{"pairs named backwards", []Axis{f, x, y}, []Axis{xo, yo, f}, []int{2, 1}, []int{1, 0}, dense.NoTrans, dense.NoTrans, false, false},
		{"leading, leading", []Axis{x, y, f}, []Axis{xo, yo, f}, []int{0, 1}, []int{0, 1}, dense.Trans, dense.NoTrans, false, false},
		{"trailing, trailing", []Axis{f, x, y}, []Axis{f, xo, yo}, []int{1, 2}, []int{1, 2}, dense.NoTrans, dense.Trans, false, false},
		{"leading, trailing", []Axis{x, y, f}, []Axis{f, f, xo, yo}, []int{0, 1}, []int{2, 3}, dense.Trans, dense.Trans, false, false},
		{"orders differ, b larger", []Axis{x, y, f}, []Axis{f, f.Reversed(), f, yo, xo}, []int{0, 1}, []int{4, 3}, dense.NoTrans, dense.Trans, true, false},
		{"orders differ, a larger", []Axis{x, y, f, f}, []Axis{f, yo, xo}, []int{0, 1}, []int{2, 1}, dense.Trans, dense.NoTrans, false, true},
		{"in the middle", []Axis{f, x, f}, []Axis{f, xo, f}, []int{1}, []int{1}, dense.NoTrans, dense.NoTrans, true, true},
		{"all of both", []Axis{x, y}, []Axis{xo, yo}, []int{0, 1}, []int{0, 1}, dense.NoTrans, dense.NoTrans, false, false},
		{"none", []Axis{x, y}, []Axis{f}, nil, nil, dense.NoTrans, dense.NoTrans, false, false},
	}
	for _, r := range rows {
		t.Run(r.name, func(t *testing.T) {
			a := Random[float64](NewStructure(g, r.a, Charge{}), fixed(1))
			b := Random[float64](NewStructure(g, r.b, Charge{}), fixed(2))
			p := PlanContract(a.Structure, b.Structure, r.axesA, r.axesB)
			assert.Equal(t, r.permuteA, p.permuteA != nil, "permutes a")
			assert.Equal(t, r.permuteB, p.permuteB != nil, "permutes b")
			assert.Equal(t, r.opA, p.opA)
			assert.Equal(t, r.opB, p.opB)
			out := New[float64](p.Out)
			RunContract(p, out.Data, a.Data, b.Data, nil, nil)
			requireClose(t, contractDense(denseOf(a), denseOf(b), r.axesA, r.axesB), denseOf(out), 1e-13, "result")
			if len(r.axesA) > 0 {
				assert.NotZero(t, out.Norm())
			}
		})
	}
}

func TestEmptyContributions(t *testing.T) {
	g := mustGroup(t, 0)
	x := NewAxis(In, Sector{Charge{0}, 2}, Sector{Charge{5}, 1})
	narrow := NewAxis(In, Sector{Charge{0}, 2})
	a := Random[float64](NewStructure(g, []Axis{x, narrow.Reversed()}, Charge{}), fixed(1))
	b := Random[float64](NewStructure(g, []Axis{narrow, x.Reversed()}, Charge{}), fixed(2))
	p := PlanContract(a.Structure, b.Structure, []int{1}, []int{0})
	require.Len(t, p.Out.Blocks, 2)
	require.Equal(t, []int{1}, p.empty)
	dst := slices.Repeat([]float64{math.NaN()}, p.Out.Size)
	RunContract(p, dst, a.Data, b.Data, nil, nil)
	assert.Zero(t, dst[8], "the block of charge 5 gets nothing and is zero")
	assert.False(t, math.IsNaN(dense.Norm(dst)))
}

// TestChainsLargestFirst holds the order in which the pool hands out work.
func TestChainsLargestFirst(t *testing.T) {
	_, _, p := environmentStep[float64](t, 32)
	last, total := math.Inf(1), 0.0
	for _, c := range p.chains {
		work := 0.0
		for i := c.from; i < c.to; i++ {
			assert.Equal(t, p.gemms[c.from].c, p.gemms[i].c, "one result a chain")
			work += p.gemms[i].flops()
		}
		assert.LessOrEqual(t, work, last)
		last, total = work, total+work
	}
	assert.Equal(t, p.Flops(), total)
	assert.Len(t, p.chains, len(p.Out.Blocks)-len(p.empty))
}

// TestSplitChains runs a product of one large block in parts, long rows and long columns, and all transposes.
func TestSplitChains(t *testing.T) {
	for _, size := range [][3]int{{420, 250, 300}, {250, 420, 300}} {
		m, n, k := size[0], size[1], size[2]
		axis := func(f Flow, d int) Axis { return NewAxis(f, Sector{Dim: d}) }
		for _, layout := range []struct {
			name  string
			a, b  []int
			pairs [2]int
		}{
			{"plain", []int{m, k}, []int{k, n}, [2]int{1, 0}}, {"first transposed", []int{k, m}, []int{k, n}, [2]int{0, 0}},
			{"second transposed", []int{m, k}, []int{n, k}, [2]int{1, 1}}, {"both transposed", []int{k, m}, []int{n, k}, [2]int{0, 1}},
		} {
			axesOf := func(dims []int, f Flow) []Axis { return []Axis{axis(f, dims[0]), axis(f, dims[1])} }
			a := Random[float64](NewStructure(Group{}, axesOf(layout.a, In), Charge{}), fixed(3))
			b := Random[float64](NewStructure(Group{}, axesOf(layout.b, Out), Charge{}), fixed(4))
			p := PlanContract(a.Structure, b.Structure, layout.pairs[:1], layout.pairs[1:])
			require.Len(t, p.Out.Blocks, 1)
			require.Len(t, p.chains, 2, "%v %s", size, layout.name)
			assert.Equal(t, 2*float64(m*n*k), p.Flops())
			want := array[float64]{[]int{m, n}, make([]float64, m*n)}
			dense.Gemm(p.opA, p.opB, m, n, k, 1, a.Data, layout.a[1], b.Data, layout.b[1], 0, want.data, n)
			serial := Contract(a, b, layout.pairs[:1], layout.pairs[1:])
			requireClose(t, want, denseOf(serial), 1e-13, layout.name)
			parallel := New[float64](p.Out)
			RunContract(p, parallel.Data, a.Data, b.Data, nil, task.New(3))
			assert.Equal(t, serial.Data, parallel.Data, "bitwise the same at any number of threads")
		}
	}
}
