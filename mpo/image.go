package mpo

import (
	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// Image is a planned product of the Hamiltonian of one site, between two environments, with a site tensor:
//
//	out(l', s', r') = sum left(l', a, l) W(a, w; s', s) ket(l, s, r) right(w, r, r')
//
// The bonds l' and r' need not be those of ket: an environment whose bra was chosen otherwise tells what of the image that bra sees. A plan may be
// run as long as the structures of all that enters stay the same.
type Image[T dense.Scalar] struct {
	Out  *block.Structure
	net  network[T]
	left bool // the left environment goes first
}

// Image plans the product on a site. The environment with the smaller bra is multiplied first.
func (p *Planner[T]) Image(site int, left, right, ket *block.Structure) *Image[T] {
	w := p.site(site)
	mustMeet("left", site, left.Axes[1:], []block.Axis{w.wl, ket.Axes[0]})
	mustMeet("right", site, right.Axes[:2], []block.Axis{w.wr, ket.Axes[2].Reversed()})
	axes := []block.Axis{left.Axes[0].Reversed(), ket.Axes[1], right.Axes[2]}
	m := &Image[T]{Out: block.NewStructure(w.group, axes, block.Charge{}), left: left.Axes[0].Dim() <= right.Axes[2].Dim()}
	var x, y slab
	if m.left {
		m.fromLeft(w, left, right, ket, &x, &y)
	} else {
		m.fromRight(w, left, right, ket, &x, &y)
	}
	m.net.seal(x, y)
	return m
}

// fromLeft goes by rows (l', s') of y and columns (w, r).
func (m *Image[T]) fromLeft(w *window[T], left, right, ket *block.Structure, x, y *slab) {
	t := asKet(ket)
	source := newLeftSource(&m.net, w, nowhere, left, t, x)
	nw := len(w.wr.Sectors)
	down := steps(w.group, m.Out.Axes[2], -1, w.wr, t.right())
	for i := range m.Out.Blocks {
		ob := &m.Out.Blocks[i]
		lp, out, rp := ob.Sectors[0], ob.Sectors[1], ob.Sectors[2]
		rows, n := ob.Shape[0]*ob.Shape[1], ob.Shape[2]
		for v := range nw {
			r := down[rp*nw+v]
			e, ok := right.Find(v, r, rp)
			if !ok || !source.moves(&m.net, lp, v, out, r) {
				continue
			}
			cols := w.wr.Sectors[v].Dim * t.right().Sectors[r].Dim
			at := m.net.piece(y, rows*cols)
			m.net.chained(gemmTask{a: at, b: right.Blocks[e].Offset, c: ob.Offset, m: rows, n: n, k: cols, lda: cols, ldb: n, ldc: n})
		}
		m.net.endChain()
	}
}

// fromRight goes by rows (a, l) of y and columns (s', r').
func (m *Image[T]) fromRight(w *window[T], left, right, ket *block.Structure, x, y *slab) {
	t := asKet(ket)
	source := newRightSource(&m.net, w, nowhere, right, t, x)
	na := len(w.wl.Sectors)
	down := steps(w.group, right.Axes[2], -1, w.wr, t.right())
	from := steps(w.group, m.Out.Axes[0], -1, w.wl, t.left())
	for i := range m.Out.Blocks {
		ob := &m.Out.Blocks[i]
		lp, out, rp := ob.Sectors[0], ob.Sectors[1], ob.Sectors[2]
		rows, n := ob.Shape[0], ob.Shape[1]*ob.Shape[2]
		for a := range na {
			l := from[lp*na+a]
			e, ok := left.Find(lp, a, l)
			if !ok || !source.moves(&m.net, down, a, out, l, rp) {
				continue
			}
			k := w.wl.Sectors[a].Dim * t.left().Sectors[l].Dim
			at := m.net.piece(y, k*n)
			m.net.chained(gemmTask{a: left.Blocks[e].Offset, b: at, c: ob.Offset, m: rows, n: n, k: k, lda: k, ldb: n, ldc: n})
		}
		m.net.endChain()
	}
}

// Flops returns the operations of one run.
func (m *Image[T]) Flops() float64 { return m.net.flops() }

// Run returns the image of ket.
func (m *Image[T]) Run(left, right, ket *block.Tensor[T], ws *Workspace[T], pool *task.Pool) *block.Tensor[T] {
	out := block.New[T](m.Out)
	if m.left {
		m.net.run(out.Data, left.Data, ket.Data, nil, right.Data, ws, pool)
	} else {
		m.net.run(out.Data, ket.Data, right.Data, left.Data, nil, ws, pool)
	}
	return out
}
