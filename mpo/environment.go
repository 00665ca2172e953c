package mpo

import (
	"fmt"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// An environment is the contraction of all sites on one side of a bond with the MPO between bra and ket (Schollwoeck 2011,
// section 6). It is a rank-three tensor of total charge zero with q(bra) = q(ket) + q(MPO index) on both sides. Its axes are
//
//	left   (bra Out, MPO In, ket In)
//	right  (MPO In, ket In, bra Out)
//
// chosen so that each step of its growth is one GEMM a block pair.

// LeftEdge returns the environment left of the first site: one element, 1.
func LeftEdge[T dense.Scalar](o *Operator[T]) *block.Tensor[T] {
	unit := block.NewAxis(block.In, block.Sector{Dim: 1})
	s := block.NewStructure(o.Group, []block.Axis{unit.Reversed(), unit, unit}, block.Charge{})
	t := block.New[T](s)
	t.Block(0)[0] = dense.FromFloat[T](1)
	return t
}

// RightEdge returns the environment right of the last site: one element, 1, if the operator leads from the total charge
// ket to the total charge bra; otherwise the tensor has no blocks and every matrix element is zero.
func RightEdge[T dense.Scalar](o *Operator[T], bra, ket block.Charge) *block.Tensor[T] {
	one := func(f block.Flow, c block.Charge) block.Axis {
		return block.NewAxis(f, block.Sector{Charge: c, Dim: 1})
	}
	axes := []block.Axis{o.Bonds[len(o.Bonds)-1].Axis(block.In), one(block.In, ket), one(block.Out, bra)}
	t := block.New[T](block.NewStructure(o.Group, axes, block.Charge{}))
	if len(t.Blocks) > 0 {
		t.Block(0)[0] = dense.FromFloat[T](1)
	}
	return t
}

// Growth is the planned step of an environment across one site. A plan may be run as long as the structures of all
// that enters stay the same.
type Growth[T dense.Scalar] struct {
	Out     *block.Structure
	net     network[T]
	left    bool
	entries int
}

// Flops returns the operations of one run.
func (g *Growth[T]) Flops() float64 { return g.net.firstFlops + g.net.lastFlops + 2*g.net.middleWork }

// Run overwrites out.Data (of structure g.Out) with the environment one site further on.
func (g *Growth[T]) Run(out, env, bra, ket *block.Tensor[T], ws *Workspace[T], pool *task.Pool) {
	if len(out.Data) != g.Out.Size {
		panic(fmt.Sprintf("mpo: environment slab of %d elements where the plan has %d", len(out.Data), g.Out.Size))
	}
	if g.left {
		g.net.run(out.Data, env.Data, ket.Data, bra.Data, nil, ws, pool)
	} else {
		g.net.run(out.Data, ket.Data, env.Data, nil, bra.Data, ws, pool)
	}
}

// GrowLeft returns the left environment one site to the right of env: env, the site tensors bra and ket (axes left In,
// site In, right Out) and the MPO of the site.
func GrowLeft[T dense.Scalar](o *Operator[T], site int, env, bra, ket *block.Tensor[T], ws *Workspace[T], pool *task.Pool) *block.Tensor[T] {
	g := PlanLeft(o, site, env.Structure, bra.Structure, ket.Structure)
	out := block.New[T](g.Out)
	g.Run(out, env, bra, ket, ws, pool)
	return out
}

// GrowRight returns the right environment one site to the left of env.
func GrowRight[T dense.Scalar](o *Operator[T], site int, env, bra, ket *block.Tensor[T], ws *Workspace[T], pool *task.Pool) *block.Tensor[T] {
	g := PlanRight(o, site, env.Structure, bra.Structure, ket.Structure)
	out := block.New[T](g.Out)
	g.Run(out, env, bra, ket, ws, pool)
	return out
}

// entryGroup collects MPO entries between fixed sectors of both bonds and both physical axes.
type groupKey struct{ left, right, out, in int32 }

// localEntry is an MPO entry with its indices counted inside their sectors.
type localEntry[T dense.Scalar] struct {
	left, right, out, in int
	value                T
}

// groupEntries sorts entries of a (possibly multi-site) MPO into sector groups; out and in are states of the table.
func groupEntries[T dense.Scalar](entries []Entry[T], left, right block.Axis, phys stateTable) map[groupKey][]localEntry[T] {
	l, r := newStateTable(left), newStateTable(right)
	m := make(map[groupKey][]localEntry[T])
	for _, e := range entries {
		k := groupKey{l.sector[e.Left], r.sector[e.Right], phys.sector[e.Out], phys.sector[e.In]}
		m[k] = append(m[k], localEntry[T]{int(l.inner[e.Left]), int(r.inner[e.Right]), int(phys.inner[e.Out]), int(phys.inner[e.In]), e.Value})
	}
	return m
}

// pairKey names a block of the first pass: a block of the tensor with a sector of the MPO bond.
type pairKey struct{ block, sector int }

// PlanLeft plans the growth of a left environment: out(r', w, r) = sum conj(bra(l', s', r')) W(a, w; s', s) env(l', a, l) ket(l, s, r).
func PlanLeft[T dense.Scalar](o *Operator[T], site int, env, bra, ket *block.Structure) *Growth[T] {
	wl, wr := o.Bonds[site].Axis(block.In), o.Bonds[site+1].Axis(block.In)
	phys := newStateTable(o.Phys[site])
	groups := groupEntries(o.Sites[site], wl, wr, phys)
	out := block.NewStructure(o.Group, []block.Axis{bra.Axes[2], wr, ket.Axes[2].Reversed()}, block.Charge{})
	g := &Growth[T]{Out: out, left: true}
	var x, y slab

	// Pass 1: rows (l', a), columns (s, r).
	pairs := make(map[pairKey]int)
	for t, kb := range ket.Blocks {
		ql := kb.Sectors[0]
		for a := range wl.Sectors {
			lp, ok := env.Axes[0].Find(o.Group.Add(ket.Axes[0].Sectors[ql].Charge, wl.Sectors[a].Charge))
			if !ok {
				continue
			}
			e, ok := env.Find(lp, a, ql)
			if !ok {
				continue
			}
			eb := env.Blocks[e]
			m, n, k := eb.Shape[0]*eb.Shape[1], kb.Shape[1]*kb.Shape[2], kb.Shape[0]
			at := x.take(m * n)
			pairs[pairKey{t, a}] = at
			g.net.first = append(g.net.first, gemmTask{a: eb.Offset, b: kb.Offset, c: at, m: m, n: n, k: k, lda: k, ldb: n, ldc: n})
		}
	}
	// Passes 2 and 3: for each result block the bra blocks that end in r', rows (l', s') of y, columns (w, r).
	byRight := blocksByAxis(bra, 2)
	for _, ob := range out.Blocks {
		rp, w, r := ob.Sectors[0], ob.Sectors[1], ob.Sectors[2]
		nw, n := ob.Shape[1], ob.Shape[2]
		var chain []gemmTask
		for _, b := range byRight[rp] {
			bb := bra.Blocks[b]
			lp, sp := bb.Sectors[0], bb.Sectors[1]
			m, d := bb.Shape[0], bb.Shape[1]
			var moves []moveTask[T]
			for s := range ket.Axes[1].Sectors {
				q := o.Group.Sub(ket.Axes[2].Sectors[r].Charge, ket.Axes[1].Sectors[s].Charge)
				l, ok := ket.Axes[0].Find(q)
				if !ok {
					continue
				}
				a, ok := wl.Find(o.Group.Sub(bra.Axes[0].Sectors[lp].Charge, q))
				if !ok {
					continue
				}
				group := groups[groupKey{int32(a), int32(w), int32(sp), int32(s)}]
				if len(group) == 0 {
					continue
				}
				t, ok := ket.Find(l, s, r)
				if !ok {
					continue
				}
				src, ok := pairs[pairKey{t, a}]
				if !ok {
					continue
				}
				na, ds := wl.Sectors[a].Dim, ket.Blocks[t].Shape[1]
				for _, e := range group {
					moves = append(moves, moveTask[T]{src: src + (e.left*ds+e.in)*n, dst: (e.out*nw + e.right) * n,
						rows: m, cols: n, lds: na * ds * n, ldd: d * nw * n, value: e.value})
				}
			}
			if len(moves) == 0 {
				continue
			}
			at := y.take(m * d * nw * n)
			g.net.middle = append(g.net.middle, finishPiece(at, m*d*nw*n, moves))
			chain = append(chain, gemmTask{a: bb.Offset, b: at, c: ob.Offset, m: bb.Shape[2], n: nw * n, k: m * d,
				lda: bb.Shape[2], ldb: nw * n, ldc: nw * n, opA: dense.ConjTrans, add: len(chain) > 0})
		}
		if len(chain) > 0 {
			g.net.last = append(g.net.last, chain)
		}
	}
	g.net.xSize, g.net.ySize = x.size, y.size
	g.net.seal()
	return g
}

// PlanRight plans the growth of a right environment: out(a, l, l') = sum W(a, w; s', s) ket(l, s, r) env(w, r, r') conj(bra(l', s', r')).
func PlanRight[T dense.Scalar](o *Operator[T], site int, env, bra, ket *block.Structure) *Growth[T] {
	wl, wr := o.Bonds[site].Axis(block.In), o.Bonds[site+1].Axis(block.In)
	phys := newStateTable(o.Phys[site])
	groups := groupEntries(o.Sites[site], wl, wr, phys)
	out := block.NewStructure(o.Group, []block.Axis{wl, ket.Axes[0], bra.Axes[0].Reversed()}, block.Charge{})
	g := &Growth[T]{Out: out}
	var x, y slab

	// Pass 1: rows (l, s), columns (w, r').
	pairs := make(map[pairKey]int)
	for t, kb := range ket.Blocks {
		at, cols := firstRight(&g.net, o.Group, ket, env, wr, t, 2, kb.Shape[0]*kb.Shape[1], kb.Shape[2], &x)
		for w, a := range at {
			if cols[w] > 0 {
				pairs[pairKey{t, w}] = a
			}
		}
	}
	byLeft := blocksByAxis(bra, 0)
	for _, ob := range out.Blocks {
		a, l, lp := ob.Sectors[0], ob.Sectors[1], ob.Sectors[2]
		na, m := ob.Shape[0], ob.Shape[1]
		var chain []gemmTask
		for _, b := range byLeft[lp] {
			bb := bra.Blocks[b]
			sp, rp := bb.Sectors[1], bb.Sectors[2]
			d, n := bb.Shape[1], bb.Shape[2]
			var moves []moveTask[T]
			for s := range ket.Axes[1].Sectors {
				q := o.Group.Add(ket.Axes[0].Sectors[l].Charge, ket.Axes[1].Sectors[s].Charge)
				r, ok := ket.Axes[2].Find(q)
				if !ok {
					continue
				}
				w, ok := wr.Find(o.Group.Sub(bra.Axes[2].Sectors[rp].Charge, q))
				if !ok {
					continue
				}
				group := groups[groupKey{int32(a), int32(w), int32(sp), int32(s)}]
				if len(group) == 0 {
					continue
				}
				t, ok := ket.Find(l, s, r)
				if !ok {
					continue
				}
				src, ok := pairs[pairKey{t, w}]
				if !ok {
					continue
				}
				nw, ds := wr.Sectors[w].Dim, ket.Blocks[t].Shape[1]
				for _, e := range group {
					moves = append(moves, moveTask[T]{src: src + (e.in*nw+e.right)*n, dst: (e.left*m*d + e.out) * n,
						rows: m, cols: n, lds: ds * nw * n, ldd: d * n, value: e.value})
				}
			}
			if len(moves) == 0 {
				continue
			}
			at := y.take(na * m * d * n)
			g.net.middle = append(g.net.middle, finishPiece(at, na*m*d*n, moves))
			chain = append(chain, gemmTask{a: at, b: bb.Offset, c: ob.Offset, m: na * m, n: bb.Shape[0], k: d * n,
				lda: d * n, ldb: d * n, ldc: bb.Shape[0], opB: dense.ConjTrans, add: len(chain) > 0})
		}
		if len(chain) > 0 {
			g.net.last = append(g.net.last, chain)
		}
	}
	g.net.xSize, g.net.ySize = x.size, y.size
	g.net.seal()
	return g
}

// firstRight plans the products of tensor block t, seen as a matrix (rows × cols) whose columns are its last axis, with every
// sector w of a right environment: the result (rows) × (w, r') for each w, in x. It returns the offsets and the r' dimensions
// (0: no such block).
func firstRight[T dense.Scalar](net *network[T], g block.Group, ket, env *block.Structure, wr block.Axis, t, last, rows, cols int, x *slab) (at, dims []int) {
	kb := ket.Blocks[t]
	r := kb.Sectors[last]
	at, dims = make([]int, len(wr.Sectors)), make([]int, len(wr.Sectors))
	for w := range wr.Sectors {
		rp, ok := env.Axes[2].Find(g.Add(ket.Axes[last].Sectors[r].Charge, wr.Sectors[w].Charge))
		if !ok {
			continue
		}
		e, ok := env.Find(w, r, rp)
		if !ok {
			continue
		}
		eb := env.Blocks[e]
		nw, n := eb.Shape[0], eb.Shape[2]
		at[w], dims[w] = x.take(rows*nw*n), n
		for i := 0; i < nw; i++ {
			net.first = append(net.first, gemmTask{a: kb.Offset, b: eb.Offset + i*cols*n, c: at[w] + i*n,
				m: rows, n: n, k: cols, lda: cols, ldb: n, ldc: nw * n})
		}
	}
	return at, dims
}

// finishPiece moves the targets of the moves, counted from the start of their piece, to the piece's place in the slab.
func finishPiece[T dense.Scalar](start, size int, moves []moveTask[T]) piece[T] {
	for i := range moves {
		moves[i].dst += start
	}
	return piece[T]{start: start, size: size, moves: moves}
}

// blocksByAxis lists the blocks of a structure by their sector on one axis.
func blocksByAxis(s *block.Structure, axis int) [][]int {
	by := make([][]int, len(s.Axes[axis].Sectors))
	for i, b := range s.Blocks {
		q := b.Sectors[axis]
		by[q] = append(by[q], i)
	}
	return by
}
