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
		return h.perturbLeft()
	}
	return h.perturbRight()
}

// draft is a perturbation under construction: its blocks, and where the combinations of sectors stand among their rows and columns.
type draft[T dense.Scalar] struct {
	blocks []PerturbationBlock
	sites  int             // sectors of the site that is kept
	rows   [][2]int        // block and first row, by outer sector * sites + site sector
	others int             // sectors of the other site
	cols   []int           // first column, by (block * sectors of the MPO bond + w) * others + other site sector; the bond of theta follows
	moves  [][]moveTask[T] // by block
}

// newDraft lists the pairs of an outer bond sector and a site sector by the charge of the bond between the sites: outer + site on the
// left side, outer - site on the right. The slower axis of theta runs slower here too. The columns are the sectors of the MPO bond mid with those
// of the other site and of its bond.
func newDraft[T dense.Scalar](g block.Group, mid block.Axis, th *block.Structure, env block.Axis, left bool) *draft[T] {
	site, other, far, sign := th.Axes[1], th.Axes[2], th.Axes[3], +1
	if !left {
		site, other, far, sign = th.Axes[2], th.Axes[1], th.Axes[0], -1
	}
	d := &draft[T]{sites: len(site.Sectors), rows: make([][2]int, len(env.Sectors)*len(site.Sectors)), others: len(other.Sectors)}
	at := make(map[block.Charge]int)
	if left {
		for o := range env.Sectors {
			for s := range site.Sectors {
				d.addRows(at, g.Add(env.Sectors[o].Charge, site.Sectors[s].Charge), o, s, env.Sectors[o].Dim*site.Sectors[s].Dim)
			}
		}
	} else {
		for s := range site.Sectors {
			for o := range env.Sectors {
				d.addRows(at, g.Sub(env.Sectors[o].Charge, site.Sectors[s].Charge), o, s, env.Sectors[o].Dim*site.Sectors[s].Dim)
			}
		}
	}
	d.moves = make([][]moveTask[T], len(d.blocks))
	for i := range d.blocks {
		d.addColumns(g, &d.blocks[i], mid, other, far, sign)
	}
	return d
}

func (d *draft[T]) addRows(at map[block.Charge]int, q block.Charge, outer, site, dim int) {
	i, ok := at[q]
	if !ok {
		i = len(d.blocks)
		at[q] = i
		d.blocks = append(d.blocks, PerturbationBlock{Charge: q})
	}
	b := &d.blocks[i]
	d.rows[outer*d.sites+site] = [2]int{i, b.Rows}
	b.Segments = append(b.Segments, Segment{Outer: outer, Site: site, Start: b.Rows, Dim: dim})
	b.Rows += dim
}

// addColumns lists every sector of the MPO bond and of the other site whose charges, with a bond sector of theta, add up to the block's.
func (d *draft[T]) addColumns(g block.Group, b *PerturbationBlock, mid, other, far block.Axis, sign int) {
	for _, w := range mid.Sectors {
		rest := g.Sub(b.Charge, w.Charge)
		for _, s := range other.Sectors {
			d.cols = append(d.cols, b.Cols)
			q := g.Sub(rest, s.Charge)
			if sign > 0 {
				q = g.Add(rest, s.Charge)
			}
			if k, ok := far.Find(q); ok {
				b.Cols += w.Dim * s.Dim * far.Sectors[k].Dim
			}
		}
	}
}

// finish gives the blocks that anything reaches their places.
func (d *draft[T]) finish(p *Perturbation[T], x slab) {
	var y slab
	for i, b := range d.blocks {
		if len(d.moves[i]) == 0 {
			continue
		}
		p.net.moves = append(p.net.moves, d.moves[i]...)
		b.Offset = p.net.piece(&y, b.Rows*b.Cols)
		p.Blocks = append(p.Blocks, b)
	}
	p.net.seal(x, y)
}

// perturbLeft: y(l', s1' | w, s2, r) = sum W1(a, w; s1', s1) env(l', a, l) theta(l, s1, s2, r).
func (h *Projected[T]) perturbLeft() *Perturbation[T] {
	p := &Perturbation[T]{left: true}
	p.net.first = h.net.first // the first pass is that of h
	w, th := h.planner.crossing(h.first, true), h.Theta
	na, nm := len(w.wl.Sectors), len(w.wr.Sectors)
	outer := h.left.Axes[0]
	d := newDraft[T](w.group, w.wr, th, outer, true)
	up, links := steps(w.group, th.Axes[0], +1, w.wl, outer), w.by(leftIn)
	for t := range th.Blocks {
		tb := &th.Blocks[t]
		l, s1, s2 := tb.Sectors[0], tb.Sectors[1], tb.Sectors[2]
		d1, cols := tb.Shape[1], tb.Shape[2]*tb.Shape[3]
		for a := range na {
			src := h.source.at[t*na+a]
			if src < 0 {
				continue
			}
			lp := up[l*na+a]
			m, lds := outer.Sectors[lp].Dim, w.wl.Sectors[a].Dim*d1*cols
			for _, k := range links[a*len(w.states)+s1] {
				row := d.rows[lp*d.sites+k.out]
				col, ld := d.cols[(row[0]*nm+k.right)*d.others+s2], d.blocks[row[0]].Cols
				for _, e := range w.local[k.from:k.to] {
					d.moves[row[0]] = append(d.moves[row[0]], moveTask[T]{src: src + (e.left*d1+e.in)*cols,
						dst: (row[1]+e.out)*ld + col + e.right*cols, rows: m, cols: cols, lds: lds, ldd: w.states[k.out].dim * ld, value: e.value})
				}
			}
		}
	}
	d.finish(p, slab{h.net.xSize})
	return p
}

// perturbRight: y(w, l, s1 | s2', r') = sum W2(w, c; s2', s2) theta(l, s1, s2, r) env(c, r, r').
func (h *Projected[T]) perturbRight() *Perturbation[T] {
	p := &Perturbation[T]{}
	var x slab
	w, th := h.planner.crossing(h.first, false), h.Theta
	nc, nm := len(w.wr.Sectors), len(w.wl.Sectors)
	outer := h.right.Axes[2]
	source := newRightSource(&p.net, w, h.right.Structure, asKet(th), &x)
	d := newDraft[T](w.group, w.wl, th, outer, false)
	links := w.by(rightIn)
	for t := range th.Blocks {
		tb := &th.Blocks[t]
		s1, s2, r := tb.Sectors[1], tb.Sectors[2], tb.Sectors[3]
		rows, d2 := tb.Shape[0]*tb.Shape[1], tb.Shape[2]
		for c := range nc {
			src := source.at[t*nc+c]
			if src < 0 {
				continue
			}
			rp, many := source.up[r*nc+c], w.wr.Sectors[c].Dim
			n := outer.Sectors[rp].Dim
			for _, k := range links[c*len(w.states)+s2] {
				row := d.rows[rp*d.sites+k.out]
				col, ld := d.cols[(row[0]*nm+k.left)*d.others+s1], d.blocks[row[0]].Rows
				for _, e := range w.local[k.from:k.to] {
					d.moves[row[0]] = append(d.moves[row[0]], moveTask[T]{src: src + (e.in*many+e.right)*n,
						dst: (col+e.left*rows)*ld + row[1] + e.out*n, rows: rows, cols: n, lds: d2 * many * n, ldd: ld, value: e.value})
				}
			}
		}
	}
	d.finish(p, x)
	return p
}
