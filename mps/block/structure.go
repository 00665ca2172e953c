package block

import (
	"fmt"
	"slices"
	"sort"
	"strings"
)

// MaxAxes is the largest number of axes of a tensor.
const MaxAxes = 16

// alignment of block offsets in elements: 64 bytes of float64, 128 of complex128.
const alignment = 8

func align(n int) int { return (n + alignment - 1) &^ (alignment - 1) }

// Structure is the shape of a block-sparse tensor: its axes, its total charge and the table of all blocks that the charge
// rule sum_i Flow_i*charge_i = Total allows. It is immutable once built and may be shared by any number of tensors.
type Structure struct {
	Group  Group
	Axes   []Axis
	Total  Charge
	Blocks []Block // sorted lexicographically by sector positions
	Size   int     // elements of the slab, gaps included

	table   []int32 // block index + 1 by the positions on all axes but the last; nil: search instead
	strides [MaxAxes]int
}

// Block is one dense row-major block: the sector position on each axis, the dimension along each, and its place in the slab.
type Block struct {
	Sectors []int
	Shape   []int
	Offset  int
	Len     int
}

// NewStructure returns the structure with all allowed blocks. Axes or a total that do not fit the group panic.
func NewStructure(g Group, axes []Axis, total Charge) *Structure {
	if len(axes) > MaxAxes {
		panic(fmt.Sprintf("block: %d axes; at most %d are supported", len(axes), MaxAxes))
	}
	if !g.valid(total) {
		panic(fmt.Sprintf("block: total charge %v is not a normalized charge of the group %v", total, g))
	}
	for _, a := range axes {
		a.check(g)
	}
	s := &Structure{Group: g, Axes: slices.Clone(axes), Total: total}
	e := newEnumeration(s)
	e.walk(0, total)
	s.adopt(e.found)
	s.buildTable()
	return s
}

// enumeration walks the allowed sector combinations in lexicographic order. A prefix is followed only while the rest of the
// axes can still reach the missing charge; the last axis is looked up.
type enumeration struct {
	s        *Structure
	at       [MaxAxes]int
	low, top [MaxAxes + 1][MaxCharges]int64 // range of the U(1) charges that axes k.. can carry
	found    []int                          // sector positions of the blocks, len(Axes) each
}

func newEnumeration(s *Structure) *enumeration {
	e := &enumeration{s: s}
	for k := len(s.Axes) - 1; k >= 0; k-- {
		a := s.Axes[k]
		for c := range e.low[k] {
			low, top := int64(0), int64(0)
			for i, x := range a.Sectors {
				v := int64(a.Flow) * int64(x.Charge[c])
				if i == 0 {
					low, top = v, v
				}
				low, top = min(low, v), max(top, v)
			}
			e.low[k][c], e.top[k][c] = e.low[k+1][c]+low, e.top[k+1][c]+top
		}
	}
	return e
}

// reachable reports whether axes k.. may carry the charge missing, judged by the ranges of the U(1) charges.
func (e *enumeration) reachable(k int, missing Charge) bool {
	for c, q := range e.s.Group.moduli {
		if v := int64(missing[c]); q == 0 && (v < e.low[k][c] || v > e.top[k][c]) {
			return false
		}
	}
	return true
}

// walk extends the prefix of k sectors; missing is the charge that axes k.. have to carry.
func (e *enumeration) walk(k int, missing Charge) {
	axes, g := e.s.Axes, e.s.Group
	if k == len(axes) {
		if missing == (Charge{}) {
			e.found = append(e.found, e.at[:k]...)
		}
		return
	}
	a := axes[k]
	if k == len(axes)-1 {
		if pos, ok := a.Find(g.signed(Charge{}, a.Flow, missing)); ok {
			e.at[k] = pos
			e.found = append(e.found, e.at[:k+1]...)
		}
		return
	}
	for i := range a.Sectors {
		if rest := g.signed(missing, -a.Flow, a.Sectors[i].Charge); e.reachable(k+1, rest) {
			e.at[k] = i
			e.walk(k+1, rest)
		}
	}
}

// adopt fills the block table from the sector positions found.
func (s *Structure) adopt(found []int) {
	n := len(s.Axes)
	count := 1
	if n > 0 {
		count = len(found) / n
	} else if s.Total != (Charge{}) {
		count = 0
	}
	s.Blocks = make([]Block, count)
	shapes := make([]int, len(found))
	for b := range s.Blocks {
		sectors, shape := found[b*n:(b+1)*n:(b+1)*n], shapes[b*n:(b+1)*n:(b+1)*n]
		size := 1
		for k, pos := range sectors {
			shape[k] = s.Axes[k].Sectors[pos].Dim
			size *= shape[k]
		}
		s.Blocks[b] = Block{Sectors: sectors, Shape: shape, Offset: s.Size, Len: size}
		s.Size += align(size)
	}
}

// buildTable makes the direct table of Find when it is not much larger than the list of blocks.
func (s *Structure) buildTable() {
	limit := 1024 + 8*len(s.Blocks)
	size := 1
	for k := len(s.Axes) - 2; k >= 0; k-- {
		s.strides[k] = size
		if size *= len(s.Axes[k].Sectors); size > limit {
			return
		}
	}
	s.table = make([]int32, size)
	for i, b := range s.Blocks {
		s.table[s.key(b.Sectors)] = int32(i + 1)
	}
}

func (s *Structure) key(sectors []int) int {
	key := 0
	for k := 0; k < len(sectors)-1; k++ {
		key += sectors[k] * s.strides[k]
	}
	return key
}

// Find returns the index of the block at the given sector positions, one per axis, and whether it exists.
func (s *Structure) Find(sectors ...int) (i int, ok bool) {
	if len(sectors) != len(s.Axes) {
		panic(fmt.Sprintf("block: Find with %d positions in %v", len(sectors), s))
	}
	for k, pos := range sectors {
		if pos < 0 || pos >= len(s.Axes[k].Sectors) {
			return 0, false
		}
	}
	if s.table != nil {
		i = int(s.table[s.key(sectors)]) - 1
	} else {
		i = sort.Search(len(s.Blocks), func(j int) bool { return slices.Compare(s.Blocks[j].Sectors, sectors) >= 0 })
		if i == len(s.Blocks) {
			return 0, false
		}
	}
	if i < 0 || !slices.Equal(s.Blocks[i].Sectors, sectors) {
		return 0, false
	}
	return i, true
}

// Equal reports whether both structures have the same group, axes and total, hence the same blocks at the same offsets.
func (s *Structure) Equal(o *Structure) bool {
	return s == o || s.Group == o.Group && s.Total == o.Total && slices.EqualFunc(s.Axes, o.Axes, Axis.Equal)
}

// Conj returns the structure of the conjugate tensor: flows reversed, total negated. Blocks and offsets are the same.
func (s *Structure) Conj() *Structure {
	c := *s
	c.Total = s.Group.Neg(s.Total)
	c.Axes = make([]Axis, len(s.Axes))
	for i, a := range s.Axes {
		c.Axes[i] = a.Reversed()
	}
	return &c
}

// Dims returns the dense dimensions.
func (s *Structure) Dims() []int {
	d := make([]int, len(s.Axes))
	for i, a := range s.Axes {
		d[i] = a.Dim()
	}
	return d
}

// Elements returns the number of elements in blocks, gaps not counted.
func (s *Structure) Elements() int {
	n := 0
	for i := range s.Blocks {
		n += s.Blocks[i].Len
	}
	return n
}

// String describes the structure for messages: group, total and axes.
func (s *Structure) String() string {
	parts := make([]string, len(s.Axes))
	for i, a := range s.Axes {
		parts[i] = a.String()
	}
	return fmt.Sprintf("tensor over %v, total %v, axes [%s]", s.Group, s.Total, strings.Join(parts, "; "))
}
