package block

import (
	"fmt"
	"slices"

	"rundle/internal/dense"
	"rundle/internal/task"
)

// PermutePlan is a planned reordering of the axes of one structure. It is immutable and may be run many times, by several goroutines at once.
type PermutePlan struct {
	In, Out *Structure
	moves   []move // one a block, largest first
}

// move copies one block of n elements: dst is contiguous and runs through dims row-major; strides are those of the source.
type move struct {
	src, dst, n   int
	dims, strides []int
}

// PlanPermute plans the tensor whose axis i is axis order[i] of s.
func PlanPermute(s *Structure, order ...int) *PermutePlan {
	mustPermutation(s, order)
	axes := make([]Axis, len(order))
	for i, k := range order {
		axes[i] = s.Axes[k]
	}
	p := &PermutePlan{In: s, Out: NewStructure(s.Group, axes, s.Total)}
	var sectors [MaxAxes]int
	moves := make([]move, len(s.Blocks))
	work := make([]float64, len(s.Blocks))
	for i := range s.Blocks {
		b := &s.Blocks[i]
		for j, k := range order {
			sectors[j] = b.Sectors[k]
		}
		to, ok := p.Out.Find(sectors[:len(order)]...)
		if !ok {
			panic(fmt.Sprintf("block: no block for sectors %v of %v in order %v of %v", b.Sectors, s, order, p.Out))
		}
		moves[i] = newMove(b, order, p.Out.Blocks[to].Offset)
		work[i] = float64(b.Len)
	}
	p.moves = make([]move, len(moves))
	for i, j := range task.ByWork(work) {
		p.moves[i] = moves[j]
	}
	return p
}

func mustPermutation(s *Structure, order []int) {
	seen := make([]bool, len(s.Axes))
	ok := len(order) == len(seen)
	for _, k := range order {
		if ok = ok && k >= 0 && k < len(seen) && !seen[k]; ok {
			seen[k] = true
		}
	}
	if !ok {
		panic(fmt.Sprintf("block: %v is not an order of the axes of %v", order, s))
	}
}

// newMove drops dimensions of one state and joins neighbours in the target that are neighbours in the source.
func newMove(b *Block, order []int, dst int) move {
	var stride [MaxAxes]int
	step := 1
	for k := len(b.Shape) - 1; k >= 0; k-- {
		stride[k] = step
		step *= b.Shape[k]
	}
	m := move{src: b.Offset, dst: dst, n: b.Len}
	for _, k := range order {
		d, s := b.Shape[k], stride[k]
		if d == 1 {
			continue
		}
		if last := len(m.dims) - 1; last >= 0 && m.strides[last] == d*s {
			m.dims[last] *= d
			m.strides[last] = s
			continue
		}
		m.dims, m.strides = append(m.dims, d), append(m.strides, s)
	}
	return m
}

// copyCost states one element moved in flops, for the decision to go parallel.
const copyCost = 16

// RunPermute overwrites dst, a slab of p.Out, with the reordered src, a slab of p.In. They must not overlap.
func RunPermute[T dense.Scalar](p *PermutePlan, dst, src []T, pool *task.Pool) {
	var r runner[T]
	r.permute(p, dst, src, pool)
}

// Permute returns the tensor whose axis i is axis order[i] of t.
func Permute[T dense.Scalar](t *Tensor[T], order ...int) *Tensor[T] {
	p := PlanPermute(t.Structure, order...)
	out := New[T](p.Out)
	RunPermute(p, out.Data, t.Data, nil)
	return out
}

func runMove[T dense.Scalar](m *move, dst, src []T) {
	dst, src = dst[m.dst:m.dst+m.n], src[m.src:m.src+m.n]
	last := len(m.dims) - 1
	if last < 0 || last == 0 && m.strides[0] == 1 {
		copy(dst, src)
		return
	}
	if m.strides[last] == 1 {
		copyRuns(m, dst, src)
		return
	}
	transpose(m, dst, src)
}

// copyRuns handles a target whose last axis is also the last of the source.
func copyRuns[T dense.Scalar](m *move, dst, src []T) {
	var index [MaxAxes]int
	last := len(m.dims) - 1
	run := m.dims[last]
	for at, from := 0, 0; at < len(dst); at += run {
		copy(dst[at:at+run], src[from:from+run])
		for k := last - 1; k >= 0; k-- {
			index[k]++
			from += m.strides[k]
			if index[k] < m.dims[k] {
				break
			}
			from -= index[k] * m.strides[k]
			index[k] = 0
		}
	}
}

// transpose handles the rest: a matrix transpose between the source's fastest axis u and the target's, inside loops over the others.
func transpose[T dense.Scalar](m *move, dst, src []T) {
	last := len(m.dims) - 1
	u := slices.Index(m.strides, 1)
	var index, step [MaxAxes]int // step: strides of the target
	size := 1
	for k := last; k >= 0; k-- {
		step[k] = size
		size *= m.dims[k]
	}
	rows, cols := m.dims[u], m.dims[last]
	for at, from, left := 0, 0, len(dst)/(rows*cols); left > 0; left-- {
		transposeMatrix(dst[at:], step[u], src[from:], m.strides[last], rows, cols)
		for k := last - 1; k >= 0; k-- {
			if k == u {
				continue
			}
			index[k]++
			at, from = at+step[k], from+m.strides[k]
			if index[k] < m.dims[k] {
				break
			}
			at, from = at-index[k]*step[k], from-index[k]*m.strides[k]
			index[k] = 0
		}
	}
}

// transposeTile rows are read together: their elements share cache lines of the source.
const transposeTile = 8

// transposeMatrix sets dst[r*ldd+c] = src[c*lds+r].
func transposeMatrix[T dense.Scalar](dst []T, ldd int, src []T, lds, rows, cols int) {
	for r := 0; r < rows; r += transposeTile {
		top := min(r+transposeTile, rows)
		for c := 0; c < cols; c += transposeTile {
			end := min(c+transposeTile, cols)
			for i := r; i < top; i++ {
				row := dst[i*ldd+c : i*ldd+end]
				from := c*lds + i
				for j := range row {
					row[j] = src[from]
					from += lds
				}
			}
		}
	}
}
