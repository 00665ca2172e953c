package mpo

import (
	"rundle/internal/dense"
	"rundle/internal/task"
)

// gemmTask is C (+)= op(A) op(B) on offsets into three slabs.
type gemmTask struct {
	a, b, c       int
	m, n, k       int
	lda, ldb, ldc int
	opA, opB      dense.Op
	add           bool // accumulate into C
}

func (g *gemmTask) flops() float64 { return 2 * float64(g.m) * float64(g.n) * float64(g.k) }

// moveTask is dst += value * src on a strided matrix.
type moveTask[T dense.Scalar] struct {
	src, dst   int
	rows, cols int
	lds, ldd   int
	value      T
}

// piece is a stretch of the middle slab with the moves that fill it, moves[from:to].
type piece struct{ start, size, from, to int }

// chain is a stretch of the GEMMs of the last pass that write to the same block of the result, last[from:to].
type chain struct{ from, to int }

// network is the plan of one contraction environment · tensor · MPO · (environment or tensor), in three passes:
//
//  1. GEMM of one outer factor with the tensor into the slab x, one task a block pair;
//  2. the sparse MPO entries as scaled copies from x to y, one task a piece of y;
//  3. GEMM of y with the other outer factor into the result, one chain a result block.
//
// Every piece has one writer and chains run in a fixed order, so the result does not depend on the number of threads.
type network[T dense.Scalar] struct {
	first        []gemmTask
	moves        []moveTask[T]
	pieces       []piece
	last         []gemmTask
	chains       []chain
	xSize, ySize int

	firstFlops, middleWork, lastFlops float64
}

// piece gives the moves that no piece holds yet, with targets counted from zero, a place of n elements in y.
func (p *network[T]) piece(y *slab, n int) (start int) {
	start = y.take(n)
	from := 0
	if len(p.pieces) > 0 {
		from = p.pieces[len(p.pieces)-1].to
	}
	for i := range p.moves[from:] {
		p.moves[from+i].dst += start
	}
	p.pieces = append(p.pieces, piece{start, n, from, len(p.moves)})
	return start
}

// chained adds a GEMM to the open chain: the first one overwrites, the others add.
func (p *network[T]) chained(g gemmTask) {
	g.add = len(p.last) > p.closed()
	p.last = append(p.last, g)
}

// endChain closes the open chain, if there is one.
func (p *network[T]) endChain() {
	if from := p.closed(); len(p.last) > from {
		p.chains = append(p.chains, chain{from, len(p.last)})
	}
}

// closed is the number of GEMMs in closed chains.
func (p *network[T]) closed() int {
	if len(p.chains) == 0 {
		return 0
	}
	return p.chains[len(p.chains)-1].to
}

// Workspace holds what plans need while they run. The zero value is ready; it grows and is reused.
// It is not for concurrent use.
type Workspace[T dense.Scalar] struct {
	x, y   []T   // the two slabs between the passes of a network
	space  [][]T // of the bands, by worker
	mixed  []T   // of a growth
	run    projectionRun[T]
	growth growthRun[T]
}

// spaces returns n elements for each thread.
func (ws *Workspace[T]) spaces(threads, n int) [][]T {
	for len(ws.space) < threads {
		ws.space = append(ws.space, nil)
	}
	for i := range threads {
		ws.space[i] = grow(ws.space[i], n)
	}
	return ws.space
}

func grow[T any](s []T, n int) []T {
	if cap(s) < n {
		return make([]T, n)
	}
	return s[:n]
}

// seal notes the sizes of the slabs, sorts the lists by work, largest first, and adds up their cost.
func (p *network[T]) seal(x, y slab) {
	p.xSize, p.ySize = x.size, y.size
	p.first, p.firstFlops = byWork(p.first, func(g *gemmTask) float64 { return g.flops() })
	p.pieces, p.middleWork = byWork(p.pieces, func(q *piece) (work float64) {
		for i := range p.moves[q.from:q.to] {
			m := &p.moves[q.from+i]
			work += float64(m.rows) * float64(m.cols)
		}
		return work
	})
	p.chains, p.lastFlops = byWork(p.chains, func(c *chain) (work float64) {
		for i := c.from; i < c.to; i++ {
			work += p.last[i].flops()
		}
		return work
	})
}

// byWork returns a list in order of decreasing work, and the sum.
func byWork[S any](list []S, cost func(*S) float64) ([]S, float64) {
	work, total := make([]float64, len(list)), 0.0
	for i := range list {
		work[i] = cost(&list[i])
		total += work[i]
	}
	return reorder(list, task.ByWork(work)), total
}

// flops returns the operations of one run.
func (p *network[T]) flops() float64 { return p.firstFlops + p.lastFlops + 2*p.middleWork }

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
	pool.Do(len(p.chains), p.lastFlops, func(_, i int) {
		for j := p.chains[i].from; j < p.chains[i].to; j++ {
			multiply(&p.last[j], lastA, lastB, dst)
		}
	})
}

func (p *network[T]) runMiddle(x, y []T, pool *task.Pool) {
	pool.Do(len(p.pieces), copyWeight*p.middleWork, func(_, i int) {
		q := p.pieces[i]
		clear(y[q.start : q.start+q.size])
		for j := q.from; j < q.to; j++ {
			move(&p.moves[j], x, y)
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
