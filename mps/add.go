package mps

import (
	"fmt"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// Add returns alpha a + beta b as the direct sum of the bonds: dimensions add up, nothing is lost. The centre is unknown;
// Truncate with a Floor near rounding, 1e-14, brings the bonds down to what the sum needs. Chains on different sites or of different charge panic.
func Add[T dense.Scalar](alpha T, a *Chain[T], beta T, b *Chain[T]) *Chain[T] {
	mustFit("sum", a, b)
	if a.Charge() != b.Charge() {
		panic(fmt.Sprintf("mps: sum of %v and %v: different charges", a, b))
	}
	last := a.Len() - 1
	sum := &Chain[T]{Group: a.Group, Sites: make([]*block.Tensor[T], a.Len()), Center: -1}
	left := a.Sites[0].Axes[0]
	for i, x := range a.Sites {
		y := b.Sites[i]
		right := x.Axes[2]
		if i < last {
			right = block.NewAxis(block.Out, append(append([]block.Sector{}, right.Sectors...), y.Axes[2].Sectors...)...)
		}
		s := block.NewStructure(a.Group, []block.Axis{left, x.Axes[1], right}, block.Charge{})
		t := block.New[T](s)
		fx, fy := dense.FromFloat[T](1), dense.FromFloat[T](1)
		if i == 0 {
			fx, fy = alpha, beta
		}
		place(t, x, fx, i > 0, i < last, false)
		place(t, y, fy, i > 0, i < last, true)
		sum.Sites[i] = t
		left = right.Reversed()
	}
	return sum
}

// place adds factor*x to t. On a bond that is a direct sum (sumLeft, sumRight) the first summand takes the first states of each sector,
// the second the last; at an edge both take the same state.
func place[T dense.Scalar](t, x *block.Tensor[T], factor T, sumLeft, sumRight, second bool) {
	for k := range x.Blocks {
		from := &x.Blocks[k]
		at := [3]int{}
		for axis := range at {
			pos, ok := t.Axes[axis].Find(x.Axes[axis].Sectors[from.Sectors[axis]].Charge)
			if !ok {
				panic(fmt.Sprintf("mps: sum: sector %d of axis %v is missing in %v", from.Sectors[axis], x.Axes[axis], t.Axes[axis]))
			}
			at[axis] = pos
		}
		i, ok := t.Find(at[:]...)
		if !ok {
			panic(fmt.Sprintf("mps: sum: block %v is missing in %v", at, t.Structure))
		}
		to := &t.Blocks[i]
		row, col := 0, 0
		if second && sumLeft {
			row = to.Shape[0] - from.Shape[0]
		}
		if second && sumRight {
			col = to.Shape[2] - from.Shape[2]
		}
		src, dst := x.Block(k), t.Block(i)
		states, width := from.Shape[1], from.Shape[2]
		for l := range from.Shape[0] {
			for s := range states {
				line := dst[((row+l)*states+s)*to.Shape[2]+col:]
				dense.Axpy(factor, src[(l*states+s)*width:][:width], line[:width])
			}
		}
	}
}
