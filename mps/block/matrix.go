package block

import (
	"fmt"
	"slices"

	"rundle/internal/dense"
	"rundle/internal/task"
)

// MatrixPlan sees a tensor across a bipartition: one matrix for each charge that crosses the bond. Rows are combinations of the
// first Left axes, columns of the others, each in lexicographic order of their sectors. It is immutable.
type MatrixPlan struct {
	Of      *Structure
	Left    int            // axes on the left of the bond
	Sectors []MatrixSector // increasing by charge
	Size    int            // elements of a slab that holds all matrices at their offsets
}

// MatrixSector is the matrix of one bond charge, the sum of Flow*charge over the left axes. Every pair of a row segment and a column segment is one
// block of the tensor.
type MatrixSector struct {
	Charge           Charge
	Rows, Cols       int
	Offset           int // place in a slab of MatrixPlan.Size elements, row-major with leading dimension Cols
	RowSegs, ColSegs []Segment

	first []int // per row segment, the block it makes with the first column segment; the others follow
}

// Segment is the stretch of rows or columns that one combination of sectors takes.
type Segment struct {
	Sectors    []int // positions on the left (right) axes; read only
	Start, Dim int
}

// PlanMatrix plans the matrices of s with the first left axes as rows.
func PlanMatrix(s *Structure, left int) *MatrixPlan {
	if left < 0 || left > len(s.Axes) {
		panic(fmt.Sprintf("block: bipartition after %d axes of %v", left, s))
	}
	p := &MatrixPlan{Of: s, Left: left}
	at := make(map[Charge]int)
	for i := 0; i < len(s.Blocks); {
		row := s.Blocks[i].Sectors[:left]
		end := i + 1
		for end < len(s.Blocks) && slices.Equal(s.Blocks[end].Sectors[:left], row) {
			end++
		}
		var q Charge
		for k, pos := range row {
			q = s.Group.signed(q, s.Axes[k].Flow, s.Axes[k].Sectors[pos].Charge)
		}
		j, ok := at[q]
		if !ok {
			j = len(p.Sectors)
			at[q] = j
			p.Sectors = append(p.Sectors, newMatrixSector(s, left, q, i, end))
		}
		m := &p.Sectors[j]
		dim := product(s.Blocks[i].Shape[:left])
		m.RowSegs = append(m.RowSegs, Segment{Sectors: row, Start: m.Rows, Dim: dim})
		m.first = append(m.first, i)
		m.Rows += dim
		i = end
	}
	slices.SortFunc(p.Sectors, func(a, b MatrixSector) int { return a.Charge.Compare(b.Charge) })
	for i := range p.Sectors {
		m := &p.Sectors[i]
		m.Offset = p.Size
		p.Size += align(m.Rows * m.Cols)
	}
	return p
}

// newMatrixSector makes a sector without rows; blocks i..end-1 list its columns.
func newMatrixSector(s *Structure, left int, q Charge, i, end int) MatrixSector {
	m := MatrixSector{Charge: q, ColSegs: make([]Segment, 0, end-i)}
	for _, b := range s.Blocks[i:end] {
		dim := product(b.Shape[left:])
		m.ColSegs = append(m.ColSegs, Segment{Sectors: b.Sectors[left:], Start: m.Cols, Dim: dim})
		m.Cols += dim
	}
	return m
}

func product(dims []int) int {
	n := 1
	for _, d := range dims {
		n *= d
	}
	return n
}

// Find returns the index of the sector of bond charge q.
func (p *MatrixPlan) Find(q Charge) (i int, ok bool) {
	return slices.BinarySearchFunc(p.Sectors, q, func(m MatrixSector, q Charge) int { return m.Charge.Compare(q) })
}

// byWork returns the sectors, most work first, and the work of all: a sector's is cost*rows*columns*min(rows, columns).
func (p *MatrixPlan) byWork(cost float64) (order []int, total float64) {
	work := make([]float64, len(p.Sectors))
	for i := range p.Sectors {
		m := &p.Sectors[i]
		work[i] = cost * float64(m.Rows) * float64(m.Cols) * float64(min(m.Rows, m.Cols))
		total += work[i]
	}
	return task.ByWork(work), total
}

// Gather writes the matrix of a sector of the slab src to dst, row-major with leading dimension ld >= Cols.
func Gather[T dense.Scalar](p *MatrixPlan, sector int, dst []T, ld int, src []T) {
	m := p.sector("Gather", sector, ld)
	mustFit("Gather", p.Of, src)
	for r, row := range m.RowSegs {
		for c, col := range m.ColSegs {
			b := &p.Of.Blocks[m.first[r]+c]
			copyRows(dst[row.Start*ld+col.Start:], ld, src[b.Offset:], col.Dim, row.Dim, col.Dim)
		}
	}
}

// Scatter writes the matrix src, row-major with leading dimension ld >= Cols, to the blocks of a sector of the slab dst.
func Scatter[T dense.Scalar](p *MatrixPlan, sector int, dst []T, src []T, ld int) {
	m := p.sector("Scatter", sector, ld)
	mustFit("Scatter", p.Of, dst)
	for r, row := range m.RowSegs {
		for c, col := range m.ColSegs {
			b := &p.Of.Blocks[m.first[r]+c]
			copyRows(dst[b.Offset:], col.Dim, src[row.Start*ld+col.Start:], ld, row.Dim, col.Dim)
		}
	}
}

func (p *MatrixPlan) sector(what string, i, ld int) *MatrixSector {
	if i < 0 || i >= len(p.Sectors) || ld < p.Sectors[i].Cols {
		panic(fmt.Sprintf("block: %s of sector %d of %d with leading dimension %d across axis %d of %v", what, i, len(p.Sectors), ld, p.Left, p.Of))
	}
	return &p.Sectors[i]
}
