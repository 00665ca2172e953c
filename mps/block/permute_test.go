package block

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/internal/dense"
	"rundle/internal/task"
)

func TestPermuteEqualsDense(t *testing.T) {
	checkBoth(t, permuteEqualsDense[float64], permuteEqualsDense[complex128])
}

func permuteEqualsDense[T dense.Scalar](t *rapid.T) {
	x := drawTensor[T](t, drawStructure(t, 0, 5))
	order := drawOrder(t, len(x.Axes))
	p := PlanPermute(x.Structure, order...)
	got := New[T](p.Out)
	for i := range got.Data {
		got.Data[i] = dense.FromFloat[T](math.NaN())
	}
	RunPermute(p, got.Data, x.Data, nil)
	requireTensor(t, got, "permuted")
	requireClose(t, permuteDense(denseOf(x), order), denseOf(got), 0, "permuted")

	back := make([]int, len(order))
	for i, k := range order {
		back[k] = i
	}
	requireClose(t, denseOf(x), denseOf(Permute(got, back...)), 0, "there and back")
}

func permuteDense[T dense.Scalar](x array[T], order []int) array[T] {
	dims := make([]int, len(order))
	for i, k := range order {
		dims[i] = x.dims[k]
	}
	out := newArray[T](dims)
	from := make([]int, len(order))
	each(dims, func(index []int) {
		for i, k := range order {
			from[k] = index[i]
		}
		*out.at(index) = *x.at(from)
	})
	return out
}

// TestPermuteLargeBlocks has blocks wider than the tiles, in all orders of four axes.
func TestPermuteLargeBlocks(t *testing.T) {
	var axes []Axis
	for _, d := range []int{9, 2, 19, 11} {
		axes = append(axes, NewAxis(In, Sector{Charge{0}, d}, Sector{Charge{1}, d / 2}))
	}
	x := Random[float64](NewStructure(mustGroup(t, 2), axes, Charge{1}), fixed(5))
	full := denseOf(x)
	for order := range orders(4) {
		want := permuteDense(full, order)
		requireClose(t, want, denseOf(Permute(x, order...)), 0, fmt.Sprint(order))
	}
}

// TestPermuteOnThreads moves enough for the pool to start its threads.
func TestPermuteOnThreads(t *testing.T) {
	a := NewAxis(In, Sector{Charge{0}, 60}, Sector{Charge{1}, 100})
	x := Random[float64](NewStructure(mustGroup(t, 2), []Axis{a, a, a}, Charge{}), fixed(6))
	require.Greater(t, copyCost*float64(x.Size), float64(task.Threshold))
	p := PlanPermute(x.Structure, 2, 0, 1)
	out := New[float64](p.Out)
	RunPermute(p, out.Data, x.Data, task.New(3))
	assert.True(t, slices.Equal(Permute(x, 2, 0, 1).Data, out.Data))
	assert.True(t, slices.Equal(Permute(&Tensor[float64]{p.Out, out.Data}, 1, 2, 0).Data, x.Data))
}

// orders yields all permutations of 0..n-1.
func orders(n int) func(func([]int) bool) {
	return func(yield func([]int) bool) {
		var extend func(prefix []int) bool
		extend = func(prefix []int) bool {
			if len(prefix) == n {
				return yield(append([]int(nil), prefix...))
			}
			for k := range n {
				used := false
				for _, p := range prefix {
					used = used || p == k
				}
				if !used && !extend(append(prefix, k)) {
					return false
				}
			}
			return true
		}
		extend(nil)
	}
}
