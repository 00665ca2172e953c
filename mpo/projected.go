package mpo

import (
	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// Projected is the Hamiltonian projected on one or two neighbouring sites between a left and a right environment: the effective
// Hamiltonian of DMRG (Schollwoeck 2011, section 6.3), planned once for a structure and applied many times. It acts on slabs
// of tensors with axes (l In, s1 In[, s2 In], r Out) and total charge zero.
type Projected[T dense.Scalar] struct {
	Theta       *block.Structure
	left, right *block.Tensor[T]
	net         network[T]

	planner *Planner[T]
	source  *leftSource[T] // the first pass
	first   int            // site
}

// Project plans the Hamiltonian on sites first..first+count-1 (count 1 or 2) for the tensor structure theta.
func Project[T dense.Scalar](o *Operator[T], first, count int, left, right *block.Tensor[T], theta *block.Structure) *Projected[T] {
	return NewPlanner(o).Project(first, count, left, right, theta)
}

// Project plans the Hamiltonian on sites first..first+count-1 (count 1 or 2) for the tensor structure theta.
func (p *Planner[T]) Project(first, count int, left, right *block.Tensor[T], theta *block.Structure) *Projected[T] {
	w := p.site(first)
	if count == 2 {
		w = p.pair(first)
	}
	t := asKet(theta)
	mustMeet("left", first, left.Axes, []block.Axis{t.left().Reversed(), w.wl, t.left()})
	mustMeet("right", first+count-1, right.Axes, []block.Axis{w.wr, t.right().Reversed(), t.right()})
	h := &Projected[T]{Theta: theta, left: left, right: right, planner: p, first: first}
	var x, y slab
	h.source = newLeftSource(&h.net, w, left.Structure, t, &x)
	nw := len(w.wr.Sectors)
	down := steps(w.group, t.right(), -1, w.wr, t.right())
	// For each result block and sector w of the MPO bond, rows (l', s') of y, columns (w, r).
	for i := range theta.Blocks {
		lp, out, rp := t.at(i)
		m, d, n := t.shape(i)
		for v := range nw {
			r := down[rp*nw+v]
			e, ok := right.Find(v, r, rp)
			if !ok || !h.source.moves(&h.net, lp, v, out, r) {
				continue
			}
			cols := w.wr.Sectors[v].Dim * t.right().Sectors[r].Dim
			at := h.net.piece(&y, m*d*cols)
			h.net.chained(gemmTask{a: at, b: right.Blocks[e].Offset, c: theta.Blocks[i].Offset, m: m * d, n: n, k: cols, lda: cols, ldb: n, ldc: n})
		}
		h.net.endChain()
	}
	h.net.seal(x, y)
	return h
}

// Sites returns the first site that h acts on, and their number.
func (h *Projected[T]) Sites() (first, count int) { return h.first, len(h.Theta.Axes) - 2 }

// Flops returns the operations of one application.
func (h *Projected[T]) Flops() float64 { return h.net.flops() }

// Apply sets dst = H src on slabs of the structure Theta.
func (h *Projected[T]) Apply(dst, src []T, ws *Workspace[T], pool *task.Pool) {
	h.net.run(dst, h.left.Data, src, nil, h.right.Data, ws, pool)
}
