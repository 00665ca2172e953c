package mpo

import (
	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// gemmTask is C (+)= op(A) op(B) on offsets into three slabs.
type gemmTask struct {
	a, b, c       int
	m, n, k       int
	lda, ldb, ldc int
	opA, opB      dense.Op
	add           bool // accumulate into C
}

func (g gemmTask) flops() float64 { return 2 * float64(g.m) * float64(g.n) * float64(g.k) }

// moveTask is dst += value * src on a strided matrix.
type moveTask[T dense.Scalar] struct {
	src, dst   int
	rows, cols int
	lds, ldd   int
	value      T
}

// piece is a stretch of the middle slab with the moves that fill it.
type piece[T dense.Scalar] struct {
	start, size int
	moves       []moveTask[T]
}

// network is the plan of one contraction environment · tensor · MPO · (environment or tensor), in three passes:
//
//  1. GEMM of one outer factor with the tensor into the slab x, one task a block pair;
//  2. the sparse MPO entries as scaled copies from x to y, one task a piece of y;
//  3. GEMM of y with the other outer factor into the result, one chain a result block.
//
// Every piece has one writer and chains run in a fixed order, so the result does not depend on the number of threads.
type network[T dense.Scalar] struct {
	first        []gemmTask
	middle       []piece[T]
	last         [][]gemmTask
	xSize, ySize int

	firstFlops, middleWork, lastFlops float64
}

// Workspace holds the two slabs between the passes of a network. The zero value is ready; it grows and is reused.
// It is not for concurrent use.
type Workspace[T dense.Scalar] struct{ x, y []T }

func grow[T any](s []T, n int) []T {
	if cap(s) < n {
		return make([]T, n)
	}
	return s[:n]
}

// seal sorts the lists by work, largest first, and adds up their cost.
func (p *network[T]) seal() {
	work := make([]float64, len(p.first))
	for i, g := range p.first {
		work[i] = g.flops()
		p.firstFlops += work[i]
	}
	p.first = reorder(p.first, task.ByWork(work))
	work = make([]float64, len(p.middle))
	for i, q := range p.middle {
		for _, m := range q.moves {
			work[i] += float64(m.rows) * float64(m.cols)
		}
		p.middleWork += work[i]
	}
	p.middle = reorder(p.middle, task.ByWork(work))
	work = make([]float64, len(p.last))
	for i, c := range p.last {
		for _, g := range c {
			work[i] += g.flops()
		}
		p.lastFlops += work[i]
	}
	p.last = reorder(p.last, task.ByWork(work))
}

func reorder[S any](s []S, order []int) []S {
	out := make([]S, len(s))
	for i, j := range order {
		out[i] = s[j]
	}
	return out
}

// copyWeight states one element moved in flops, for the decision to go parallel: a scaled copy runs at memory speed.
const copyWeight = 16

// run overwrites dst. In pass 1 the GEMMs multiply firstA[a] · firstB[b]; in pass 3 lastA[a] · lastB[b], where a nil
// operand stands for the middle slab y.
func (p *network[T]) run(dst, firstA, firstB, lastA, lastB []T, ws *Workspace[T], pool *task.Pool) {
	ws.x, ws.y = grow(ws.x, p.xSize), grow(ws.y, p.ySize)
	x, y := ws.x, ws.y
	pool.Do(len(p.first), p.firstFlops, func(_, i int) {
		g := &p.first[i]
		multiply(g, firstA, firstB, x)
	})
	p.runMiddle(x, y, pool)
	if lastA == nil {
		lastA = y
	}
	if lastB == nil {
		lastB = y
	}
	clear(dst)
	pool.Do(len(p.last), p.lastFlops, func(_, i int) {
		chain := p.last[i]
		for j := range chain {
			multiply(&chain[j], lastA, lastB, dst)
		}
	})
}

func (p *network[T]) runMiddle(x, y []T, pool *task.Pool) {
	pool.Do(len(p.middle), copyWeight*p.middleWork, func(_, i int) {
		q := &p.middle[i]
		clear(y[q.start : q.start+q.size])
		for j := range q.moves {
			move(&q.moves[j], x, y)
		}
	})
}

func multiply[T dense.Scalar](g *gemmTask, a, b, c []T) {
	beta := dense.FromFloat[T](0)
	if g.add {
		beta = dense.FromFloat[T](1)
	}
	dense.Gemm(g.opA, g.opB, g.m, g.n, g.k, dense.FromFloat[T](1), a[g.a:], g.lda, b[g.b:], g.ldb, beta, c[g.c:], g.ldc)
}

func move[T dense.Scalar](m *moveTask[T], x, y []T) {
	if m.lds == m.cols && m.ldd == m.cols {
		n := m.rows * m.cols
		dense.Axpy(m.value, x[m.src:m.src+n], y[m.dst:m.dst+n])
		return
	}
	for r := 0; r < m.rows; r++ {
		s, d := m.src+r*m.lds, m.dst+r*m.ldd
		dense.Axpy(m.value, x[s:s+m.cols], y[d:d+m.cols])
	}
}

// slab hands out aligned stretches of a slab that does not exist yet.
type slab struct{ size int }

func (s *slab) take(n int) int {
	at := s.size
	s.size += (n + 7) &^ 7
	return at
}

// stateTable splits the states of a product of physical axes by sector.
type stateTable struct {
	sector []int32 // sector of each state
	inner  []int32 // its place inside the sector
	dims   []int   // dimension of each sector
}

func newStateTable(a block.Axis) stateTable {
	var t stateTable
	for i, s := range a.Sectors {
		t.dims = append(t.dims, s.Dim)
		for k := 0; k < s.Dim; k++ {
			t.sector = append(t.sector, int32(i))
			t.inner = append(t.inner, int32(k))
		}
	}
	return t
}
