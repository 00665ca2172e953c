package block

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/internal/dense"
)

func TestFuseSplit(t *testing.T) { checkBoth(t, fuseSplit[float64], fuseSplit[complex128]) }

func fuseSplit[T dense.Scalar](t *rapid.T) {
	x := drawTensor[T](t, drawStructure(t, 0, 5))
	from := rapid.IntRange(0, len(x.Axes)).Draw(t, "from")
	to := rapid.IntRange(from, len(x.Axes)).Draw(t, "to")
	flow := rapid.SampledFrom([]Flow{In, Out}).Draw(t, "flow")
	y, f := Fuse(x, from, to, flow)
	requireTensor(t, y, "fused")
	if len(y.Axes) != len(x.Axes)-(to-from)+1 || y.Axes[from].Flow != flow || y.Total != x.Total {
		t.Fatalf("axes %d..%d of %v fused into %v", from, to-1, x.Structure, y.Structure)
	}
	requireClose(t, fuseDense(denseOf(x), x.Structure, from, to, flow), denseOf(y), 0, "fused")
	z := Split(y, from, f)
	requireTensor(t, z, "split")
	if !z.Structure.Equal(x.Structure) {
		t.Fatalf("split into %v, want %v", z.Structure, x.Structure)
	}
	requireClose(t, denseOf(x), denseOf(z), 0, "split")
}

// fuseDense joins axes state by state: fused states are sorted by charge, then by sectors, then by states.
func fuseDense[T dense.Scalar](x array[T], s *Structure, from, to int, flow Flow) array[T] {
	type state struct {
		charge  Charge
		sectors []int
		row     int // in plain row-major order
	}
	var states []state
	joined := x.dims[from:to]
	each(joined, func(index []int) {
		var st state
		for k, i := range index {
			a := s.Axes[from+k]
			st.charge = s.Group.signed(st.charge, a.Flow*flow, stateCharges(a)[i])
			pos, _ := a.Find(stateCharges(a)[i])
			st.sectors = append(st.sectors, pos)
		}
		st.row = len(states)
		states = append(states, st)
	})
	less := func(a, b state) bool {
		if c := a.charge.Compare(b.charge); c != 0 {
			return c < 0
		}
		for k := range a.sectors {
			if a.sectors[k] != b.sectors[k] {
				return a.sectors[k] < b.sectors[k]
			}
		}
		return a.row < b.row
	}
	rank := make([]int, len(states))
	for i := range states {
		for j := range states {
			if less(states[j], states[i]) {
				rank[i]++
			}
		}
	}
	dims := append(append(append([]int{}, x.dims[:from]...), len(states)), x.dims[to:]...)
	out := newArray[T](dims)
	each(x.dims, func(index []int) {
		row := 0
		for k, i := range index[from:to] {
			row = row*joined[k] + i
		}
		at := append(append(append([]int{}, index[:from]...), rank[row]), index[to:]...)
		*out.at(at) = *x.at(index)
	})
	return out
}

// TestFusingCommutesWithContracting sums two axes at once, fused on both sides.
func TestFusingCommutesWithContracting(t *testing.T) {
	g := mustGroup(t, 0, 2)
	a := NewAxis(In, Sector{Charge{0, 0}, 2}, Sector{Charge{1, 1}, 3}, Sector{Charge{2, 0}, 1})
	b := NewAxis(Out, Sector{Charge{-1, 1}, 1}, Sector{Charge{1, 0}, 2})
	x := Random[float64](NewStructure(g, []Axis{a, b, a.Reversed()}, Charge{1, 0}), fixed(1))
	y := Random[float64](NewStructure(g, []Axis{b.Reversed(), a, a}, Charge{2, 1}), fixed(2))
	require.NotEmpty(t, x.Blocks)
	want := Contract(x, y, []int{1, 2}, []int{0, 1})
	fx, f := Fuse(x, 1, 3, In)
	fy, _ := Fuse(y, 0, 2, Out)
	assert.True(t, fx.Axes[1].Equal(fy.Axes[0].Reversed()))
	got := Contract(fx, fy, []int{1}, []int{0})
	assert.NotZero(t, want.Norm())
	requireClose(t, denseOf(want), denseOf(got), 1e-13, "fused contraction")
	assert.Equal(t, fx.Axes[1].Dim(), f.Fused.Dim())
}
