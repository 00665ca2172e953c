package block

import (
	"fmt"
	"slices"

	"rundle/internal/dense"
)

// Fusion says how neighbouring axes were joined into one: which sector of the fused axis holds a combination of their sectors, and
// where. Inside a sector combinations follow each other in lexicographic order.
type Fusion struct {
	Axes  []Axis // the axes that were joined
	Fused Axis

	places []place // by combination, row-major
}

// place is where the states of a combination begin.
type place struct{ sector, start int }

// NewFusion plans the joining of axes into one with the given flow. It holds all combinations of their sectors, also those that
// no block of some tensor uses. No axes give one state of charge zero.
func NewFusion(g Group, axes []Axis, flow Flow) *Fusion {
	f := &Fusion{Axes: slices.Clone(axes)}
	charges, dims := []Charge{{}}, []int{1}
	for _, a := range axes {
		a.check(g)
		nextCharges := make([]Charge, 0, len(charges)*len(a.Sectors))
		nextDims := make([]int, 0, len(charges)*len(a.Sectors))
		for i, c := range charges {
			for _, s := range a.Sectors {
				nextCharges = append(nextCharges, g.signed(c, a.Flow*flow, s.Charge))
				nextDims = append(nextDims, dims[i]*s.Dim)
			}
		}
		charges, dims = nextCharges, nextDims
	}
	sectors := make([]Sector, len(charges))
	for i := range sectors {
		sectors[i] = Sector{charges[i], dims[i]}
	}
	f.Fused = NewAxis(flow, sectors...)
	f.places = make([]place, len(charges))
	used := make([]int, len(f.Fused.Sectors))
	for i, c := range charges {
		pos, _ := f.Fused.Find(c)
		f.places[i] = place{pos, used[pos]}
		used[pos] += dims[i]
	}
	return f
}

// place returns where the combination of sectors begins in the fused axis.
func (f *Fusion) place(sectors []int) place {
	key := 0
	for k, s := range sectors {
		key = key*len(f.Axes[k].Sectors) + s
	}
	return f.places[key]
}

// Fuse joins axes from..to-1 into one axis with the given flow; the charge rule holds as before. from == to inserts an axis of one
// state. Split undoes it.
func Fuse[T dense.Scalar](t *Tensor[T], from, to int, flow Flow) (*Tensor[T], *Fusion) {
	if from < 0 || to < from || to > len(t.Axes) {
		panic(fmt.Sprintf("block: Fuse of axes %d..%d of %v", from, to-1, t.Structure))
	}
	f := NewFusion(t.Group, t.Axes[from:to], flow)
	axes := slices.Concat(t.Axes[:from], []Axis{f.Fused}, t.Axes[to:])
	out := New[T](NewStructure(t.Group, axes, t.Total))
	f.each(t.Structure, out.Structure, from, func(split, fused span) {
		copyRows(out.Data[fused.offset:], fused.ld, t.Data[split.offset:], split.ld, split.rows, split.ld)
	})
	return out, f
}

// Split replaces an axis that equals f.Fused by the axes it was made of.
func Split[T dense.Scalar](t *Tensor[T], axis int, f *Fusion) *Tensor[T] {
	mustAxis("Split", t.Structure, axis)
	if !t.Axes[axis].Equal(f.Fused) {
		panic(fmt.Sprintf("block: Split of axis %d of %v, which is not the fused axis %v", axis, t.Structure, f.Fused))
	}
	axes := slices.Concat(t.Axes[:axis], f.Axes, t.Axes[axis+1:])
	out := New[T](NewStructure(t.Group, axes, t.Total))
	f.each(out.Structure, t.Structure, axis, func(split, fused span) {
		copyRows(out.Data[split.offset:], split.ld, t.Data[fused.offset:], fused.ld, split.rows, split.ld)
	})
	return out
}

// span is a strided piece of a slab.
type span struct{ offset, rows, ld int }

// each visits the blocks of the split structure: all of the block there, and the rows of the fused block that hold it.
func (f *Fusion) each(split, fused *Structure, axis int, visit func(split, fused span)) {
	var sectors [MaxAxes]int
	n := len(f.Axes)
	for i := range split.Blocks {
		b := &split.Blocks[i]
		at := f.place(b.Sectors[axis : axis+n])
		k := copy(sectors[:], b.Sectors[:axis])
		sectors[k] = at.sector
		k += 1 + copy(sectors[k+1:], b.Sectors[axis+n:])
		j, ok := fused.Find(sectors[:k]...)
		if !ok {
			panic(fmt.Sprintf("block: no fused block at %v of %v for %v of %v", sectors[:k], fused, b.Sectors, split))
		}
		to := &fused.Blocks[j]
		rows := 1
		for _, d := range b.Shape[:axis] {
			rows *= d
		}
		inner := 1
		for _, d := range b.Shape[axis+n:] {
			inner *= d
		}
		visit(span{b.Offset, rows, b.Len / rows}, span{to.Offset + at.start*inner, rows, to.Len / rows})
	}
}

// copyRows copies a rows×cols matrix between strided places.
func copyRows[T any](dst []T, ldd int, src []T, lds, rows, cols int) {
	for r := 0; r < rows; r++ {
		copy(dst[r*ldd:r*ldd+cols], src[r*lds:r*lds+cols])
	}
}
