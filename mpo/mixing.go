package mpo

import (
	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// Perturbation holds, for each charge of the bond between two sites, the matrix of states that the Hamiltonian reaches from
// theta on one side of the bond: the terms that cross it, applied on that side only (White 2005). A row is a combination of
// (l', s1') for the left side, of (s2', r') for the right side; the columns are what the rest of the network leaves open.
// Charges absent from theta itself are there too.
type Perturbation[T dense.Scalar] struct {
	net    network[T]
	left   bool
	Blocks []PerturbationBlock
}

// PerturbationBlock is the matrix of one bond charge: Rows × Cols at Offset of the slab, row-major; for the right side it is
// stored transposed, Cols × Rows.
type PerturbationBlock struct {
	Charge             block.Charge
	Rows, Cols, Offset int
	Segments           []Segment
}

// Segment places a pair of sectors (bond, site) or (site, bond) among the rows of a block.
type Segment struct{ Outer, Site, Start, Dim int }

// Size returns the elements of the slab.
func (p *Perturbation[T]) Size() int { return p.net.ySize }

// Run computes the matrices for the slab theta; the result is valid until the workspace is used again.
func (p *Perturbation[T]) Run(h *Projected[T], theta []T, ws *Workspace[T], pool *task.Pool) []T {
	ws.x, ws.y = grow(ws.x, p.net.xSize), grow(ws.y, p.net.ySize)
	a, b := h.left.Data, theta
	if !p.left {
		a, b = theta, h.right.Data
	}
	pool.Do(len(p.net.first), p.net.firstFlops, func(_, i int) { multiply(&p.net.first[i], a, b, ws.x) })
	p.net.runMiddle(ws.x, ws.y, pool)
	return ws.y
}

// PlanPerturbation plans the perturbation of the left (or right) side of the bond between the two sites of h.
func (h *Projected[T]) PlanPerturbation(left bool) *Perturbation[T] {
	if left {
		return h.planLeftPerturbation()
	}
	return h.planRightPerturbation()
}

// crossing reports whether index i of bond b carries a term that has begun and is not done.
func (h *Projected[T]) crossing(i int32) bool {
	b := h.op.Bonds[h.first+1]
	return int(i) != b.Vacant && int(i) != b.Done
}

// sideRows lists, per charge, the pairs of an outer bond sector and a site sector. sign is +1 for the left side
// (bond charge = l + s), -1 for the right (bond charge = r - s).
func (h *Projected[T]) sideRows(outer, site block.Axis, left bool) ([]PerturbationBlock, map[[2]int][2]int) {
	at := make(map[block.Charge]int)
	var blocks []PerturbationBlock
	place := make(map[[2]int][2]int)
	add := func(o, s int) {
		q := h.group.Sub(outer.Sectors[o].Charge, site.Sectors[s].Charge)
		if left {
			q = h.group.Add(outer.Sectors[o].Charge, site.Sectors[s].Charge)
		}
		i, ok := at[q]
		if !ok {
			i = len(blocks)
			at[q] = i
			blocks = append(blocks, PerturbationBlock{Charge: q})
		}
		b := &blocks[i]
		dim := outer.Sectors[o].Dim * site.Sectors[s].Dim
		place[[2]int{o, s}] = [2]int{i, b.Rows}
		b.Segments = append(b.Segments, Segment{Outer: o, Site: s, Start: b.Rows, Dim: dim})
		b.Rows += dim
	}
	if left {
		for o := range outer.Sectors {
			for s := range site.Sectors {
				add(o, s)
			}
		}
	} else {
		for s := range site.Sectors {
			for o := range outer.Sectors {
				add(o, s)
			}
		}
	}
	return blocks, place
}

// planLeftPerturbation: y(l', s1' | w, s2, r) = sum W1(a, w; s1', s1) env(l', a, l) theta(l, s1, s2, r).
func (h *Projected[T]) planLeftPerturbation() *Perturbation[T] {
	p := &Perturbation[T]{left: true}
	var y slab
	p.net.first, p.net.xSize = h.leftPass()
	th, g := h.Theta, h.group
	blocks, place := h.sideRows(h.left.Axes[0], th.Axes[1], true)
	groups := groupEntries(h.crossingEntries(h.op.Sites[h.first], true), h.wl, h.wm, newStateTable(h.op.Phys[h.first]))
	type column struct{ block, w, s2, r int }
	start := make(map[column]int)
	moves := make([][]moveTask[T], len(blocks))
	// Columns first: every (w, s2, r) whose ket bond charge r - s2 and MPO charge w add up to the block's.
	for i := range blocks {
		b := &blocks[i]
		for w := range h.wm.Sectors {
			for s2 := range th.Axes[2].Sectors {
				r, ok := th.Axes[3].Find(g.Add(g.Sub(b.Charge, h.wm.Sectors[w].Charge), th.Axes[2].Sectors[s2].Charge))
				if !ok {
					continue
				}
				start[column{i, w, s2, r}] = b.Cols
				b.Cols += h.wm.Sectors[w].Dim * th.Axes[2].Sectors[s2].Dim * th.Axes[3].Sectors[r].Dim
			}
		}
		b.Offset = y.take(b.Rows * b.Cols)
	}
	for t, tb := range th.Blocks {
		l, s1, s2, r := tb.Sectors[0], tb.Sectors[1], tb.Sectors[2], tb.Sectors[3]
		d1, cols := tb.Shape[1], tb.Shape[2]*tb.Shape[3]
		for a := range h.wl.Sectors {
			src, ok := h.pairs[pairKey{t, a}]
			if !ok {
				continue
			}
			lp, _ := h.left.Axes[0].Find(g.Add(th.Axes[0].Sectors[l].Charge, h.wl.Sectors[a].Charge))
			m, na := h.left.Axes[0].Sectors[lp].Dim, h.wl.Sectors[a].Dim
			for w := range h.wm.Sectors {
				for s1p := range th.Axes[1].Sectors {
					group := groups[groupKey{int32(a), int32(w), int32(s1p), int32(s1)}]
					if len(group) == 0 {
						continue
					}
					at := place[[2]int{lp, s1p}]
					b := &blocks[at[0]]
					c, ok := start[column{at[0], w, s2, r}]
					if !ok {
						continue
					}
					d := th.Axes[1].Sectors[s1p].Dim
					for _, e := range group {
						moves[at[0]] = append(moves[at[0]], moveTask[T]{src: src + (e.left*d1+e.in)*cols,
							dst: (at[1]+e.out)*b.Cols + c + e.right*cols, rows: m, cols: cols,
							lds: na * d1 * cols, ldd: d * b.Cols, value: e.value})
					}
				}
			}
		}
	}
	p.finish(blocks, moves, &y)
	return p
}

// planRightPerturbation: y(w, l, s1 | s2', r') = sum W2(w, c; s2', s2) theta(l, s1, s2, r) env(c, r, r').
func (h *Projected[T]) planRightPerturbation() *Perturbation[T] {
	p := &Perturbation[T]{}
	var x, y slab
	th, g := h.Theta, h.group
	blocks, place := h.sideRows(h.right.Axes[2], th.Axes[2], false)
	groups := groupEntries(h.crossingEntries(h.op.Sites[h.first+1], false), h.wm, h.wr, newStateTable(h.op.Phys[h.first+1]))
	type row struct{ block, w, l, s1 int }
	start := make(map[row]int)
	for i := range blocks {
		b := &blocks[i]
		for w := range h.wm.Sectors {
			for s1 := range th.Axes[1].Sectors {
				l, ok := th.Axes[0].Find(g.Sub(g.Sub(b.Charge, h.wm.Sectors[w].Charge), th.Axes[1].Sectors[s1].Charge))
				if !ok {
					continue
				}
				start[row{i, w, l, s1}] = b.Cols
				b.Cols += h.wm.Sectors[w].Dim * th.Axes[0].Sectors[l].Dim * th.Axes[1].Sectors[s1].Dim
			}
		}
		b.Offset = y.take(b.Rows * b.Cols)
	}
	moves := make([][]moveTask[T], len(blocks))
	for t, tb := range th.Blocks {
		l, s1, s2, r := tb.Sectors[0], tb.Sectors[1], tb.Sectors[2], tb.Sectors[3]
		rows, d2 := tb.Shape[0]*tb.Shape[1], tb.Shape[2]
		at, dims := firstRight(&p.net, g, th, h.right.Structure, h.wr, t, 3, rows*d2, tb.Shape[3], &x)
		for c := range h.wr.Sectors {
			n := dims[c]
			if n == 0 {
				continue
			}
			rp, _ := h.right.Axes[2].Find(g.Add(th.Axes[3].Sectors[r].Charge, h.wr.Sectors[c].Charge))
			nc := h.wr.Sectors[c].Dim
			for w := range h.wm.Sectors {
				for s2p := range th.Axes[2].Sectors {
					group := groups[groupKey{int32(w), int32(c), int32(s2p), int32(s2)}]
					if len(group) == 0 {
						continue
					}
					pl := place[[2]int{rp, s2p}]
					b := &blocks[pl[0]]
					st, ok := start[row{pl[0], w, l, s1}]
					if !ok {
						continue
					}
					for _, e := range group {
						moves[pl[0]] = append(moves[pl[0]], moveTask[T]{src: at[c] + (e.in*nc+e.right)*n,
							dst: (st+e.left*rows)*b.Rows + pl[1] + e.out*n, rows: rows, cols: n,
							lds: d2 * nc * n, ldd: b.Rows, value: e.value})
					}
				}
			}
		}
	}
	p.net.xSize = x.size
	p.finish(blocks, moves, &y)
	return p
}

func (p *Perturbation[T]) finish(blocks []PerturbationBlock, moves [][]moveTask[T], y *slab) {
	for i, b := range blocks {
		if len(moves[i]) == 0 {
			continue
		}
		p.Blocks = append(p.Blocks, b)
		p.net.middle = append(p.net.middle, finishPiece(b.Offset, b.Rows*b.Cols, moves[i]))
	}
	p.net.ySize = y.size
	p.net.seal()
}

// leftPass returns the first pass of h, which the left perturbation shares.
func (h *Projected[T]) leftPass() ([]gemmTask, int) { return h.net.first, h.net.xSize }

// crossingEntries keeps the entries whose inner bond index carries a crossing term.
func (h *Projected[T]) crossingEntries(entries []Entry[T], left bool) []Entry[T] {
	var keep []Entry[T]
	for _, e := range entries {
		i := e.Left
		if left {
			i = e.Right
		}
		if h.crossing(i) {
			keep = append(keep, e)
		}
	}
	return keep
}
