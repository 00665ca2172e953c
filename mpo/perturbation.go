package mpo

import (
	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// Perturbation plans, for each charge of the bond between two sites, the density matrix of the states that the Hamiltonian reaches from
// theta on one side of the bond: the terms that cross it, applied on that side only (White 2005). A row is a combination of
// (l', s1') for the left side, of (s2', r') for the right side; what the rest of the network leaves open is summed over.
// Charges absent from theta itself are there too.
type Perturbation[T dense.Scalar] struct {
	Blocks []PerturbationBlock

	net    network[T]    // of it the first pass
	moves  []feedTask[T] // from x, or from theta where the environment is the identity
	left   bool
	spans  []span // of the moves, by block
	order  []int  // blocks, most work first
	widest int    // elements of the largest matrix
	flops  float64
}

// PerturbationBlock is the density matrix of one bond charge, Rows × Rows.
type PerturbationBlock struct {
	Charge   block.Charge
	Rows     int
	Segments []Segment

	cols int
}

// Segment places a pair of sectors (bond, site) or (site, bond) among the rows of a block.
type Segment struct{ Outer, Site, Start, Dim int }

type span struct{ from, to int }

// Densities computes the matrix of each block for the slab src of theta: element (x, y) is the sum of m_x conj(m_y) over the open indices of what was
// reached, m, in units of the energy unit: couplings whose squares are no numbers need one of their size. Workers hold one m at a time.
func (p *Perturbation[T]) Densities(h *Projected[T], src []T, unit float64, ws *Workspace[T], pool *task.Pool) [][]T {
	ws.x = grow(ws.x, p.net.xSize)
	a, b := h.left.Data, src
	if !p.left {
		a, b = src, h.right.Data
	}
	pool.Do(len(p.net.first), p.net.firstFlops, func(_, i int) { multiply(&p.net.first[i], a, b, ws.x) })
	reached, rho := make([][]T, pool.Threads()), make([][]T, len(p.Blocks))
	pool.Do(len(p.Blocks), p.flops, func(worker, j int) {
		i := p.order[j]
		k := &p.Blocks[i]
		if reached[worker] == nil {
			reached[worker] = make([]T, p.widest)
		}
		m := reached[worker][:k.Rows*k.cols]
		clear(m)
		for q := p.spans[i].from; q < p.spans[i].to; q++ {
			f := &p.moves[q]
			if f.from == theta {
				move(&f.moveTask, src, m)
			} else {
				move(&f.moveTask, ws.x, m)
			}
		}
		if unit != 1 {
			dense.Scale(dense.FromFloat[T](1/unit), m)
		}
		rho[i] = make([]T, k.Rows*k.Rows)
		one, zero := dense.FromFloat[T](1), dense.FromFloat[T](0)
		if p.left {
			dense.Gemm(dense.NoTrans, dense.ConjTrans, k.Rows, k.Rows, k.cols, one, m, k.cols, m, k.cols, zero, rho[i], k.Rows)
		} else {
			dense.Gemm(dense.Trans, dense.ConjNoTrans, k.Rows, k.Rows, k.cols, one, m, k.Rows, m, k.Rows, zero, rho[i], k.Rows)
		}
	})
	return rho
}

// PlanPerturbation plans the perturbation of the left (or right) side of the bond between the two sites of h.
func (h *Projected[T]) PlanPerturbation(left bool) *Perturbation[T] {
	if left {
		return h.perturbLeft()
	}
	return h.perturbRight()
}

// draft is a perturbation under construction: the matrices m of its blocks, for the right side stored transposed, and where the combinations of sectors stand among their rows and columns.
type draft[T dense.Scalar] struct {
	blocks []PerturbationBlock
	sites  int             // sectors of the site that is kept
	rows   [][2]int        // block and first row, by outer sector * sites + site sector
	others int             // sectors of the other site
	cols   []int           // first column, by (block * sectors of the MPO bond + w) * others + other site sector; the bond of theta follows
	moves  [][]feedTask[T] // by block
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
	d.moves = make([][]feedTask[T], len(d.blocks))
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
			d.cols = append(d.cols, b.cols)
			q := g.Sub(rest, s.Charge)
			if sign > 0 {
				q = g.Add(rest, s.Charge)
			}
			if k, ok := far.Find(q); ok {
				b.cols += w.Dim * s.Dim * far.Sectors[k].Dim
			}
		}
	}
}

// finish keeps the blocks that anything reaches.
func (d *draft[T]) finish(p *Perturbation[T], x slab) {
	var work []float64
	for i, b := range d.blocks {
		if len(d.moves[i]) == 0 {
			continue
		}
		from := len(p.moves)
		p.moves = append(p.moves, d.moves[i]...)
		p.Blocks, p.spans = append(p.Blocks, b), append(p.spans, span{from, len(p.moves)})
		p.widest = max(p.widest, b.Rows*b.cols)
		cost := 2 * float64(b.Rows) * float64(b.Rows) * float64(b.cols)
		work = append(work, cost)
		p.flops += cost
	}
	p.order = task.ByWork(work)
	p.net.seal(x, slab{})
}

// perturbLeft: y(l', s1' | w, s2, r) = sum W1(a, w; s1', s1) env(l', a, l) theta(l, s1, s2, r).
func (h *Projected[T]) perturbLeft() *Perturbation[T] {
	p := &Perturbation[T]{left: true}
	var x slab
	w, th, skip := h.planner.crossing(h.first, true), h.Theta, h.plan.key.vacant
	source := newLeftSource(&p.net, w, skip, h.left.Structure, asKet(th), &x)
	na, nm := len(w.wl.Sectors), len(w.wr.Sectors)
	outer := h.left.Axes[0]
	d := newDraft[T](w.group, w.wr, th, outer, true)
	up, links := steps(w.group, th.Axes[0], +1, w.wl, outer), w.by(leftIn)
	for t := range th.Blocks {
		tb := &th.Blocks[t]
		l, s1, s2 := tb.Sectors[0], tb.Sectors[1], tb.Sectors[2]
		d1, cols := tb.Shape[1], tb.Shape[2]*tb.Shape[3]
		for a := range na {
			src, lp := source.at[t*na+a], up[l*na+a]
			if lp < 0 {
				continue
			}
			m, wide := outer.Sectors[lp].Dim, source.pack.wide[a]
			for _, k := range links[a*len(w.states)+s1] {
				row := d.rows[lp*d.sites+k.out]
				col, ld := d.cols[(row[0]*nm+k.right)*d.others+s2], d.blocks[row[0]].cols
				for _, e := range w.local[k.from:k.to] {
					f := feedTask[T]{from: between, moveTask: moveTask[T]{dst: (row[1]+e.out)*ld + col + e.right*cols,
						rows: m, cols: cols, ldd: w.states[k.out].dim * ld, value: e.value}}
					switch {
					case skip == place{a, e.left}:
						f.from, f.src, f.lds = theta, tb.Offset+e.in*cols, d1*cols
					case src < 0:
						continue
					default:
						f.src, f.lds = src+(source.pack.at[a][e.left]*d1+e.in)*cols, wide*d1*cols
					}
					d.moves[row[0]] = append(d.moves[row[0]], f)
				}
			}
		}
	}
	d.finish(p, x)
	return p
}

// perturbRight: y(w, l, s1 | s2', r') = sum W2(w, c; s2', s2) theta(l, s1, s2, r) env(c, r, r').
func (h *Projected[T]) perturbRight() *Perturbation[T] {
	p := &Perturbation[T]{}
	var x slab
	w, th, skip := h.planner.crossing(h.first, false), h.Theta, h.plan.key.done
	nc, nm := len(w.wr.Sectors), len(w.wl.Sectors)
	outer := h.right.Axes[2]
	source := newRightSource(&p.net, w, skip, h.right.Structure, asKet(th), &x)
	d := newDraft[T](w.group, w.wl, th, outer, false)
	links := w.by(rightIn)
	for t := range th.Blocks {
		tb := &th.Blocks[t]
		s1, s2, r := tb.Sectors[1], tb.Sectors[2], tb.Sectors[3]
		rows, d2 := tb.Shape[0]*tb.Shape[1], tb.Shape[2]
		for c := range nc {
			src, rp := source.at[t*nc+c], source.up[r*nc+c]
			if rp < 0 {
				continue
			}
			n, wide := outer.Sectors[rp].Dim, source.pack.wide[c]
			for _, k := range links[c*len(w.states)+s2] {
				row := d.rows[rp*d.sites+k.out]
				col, ld := d.cols[(row[0]*nm+k.left)*d.others+s1], d.blocks[row[0]].Rows
				for _, e := range w.local[k.from:k.to] {
					f := feedTask[T]{from: between, moveTask: moveTask[T]{dst: (col+e.left*rows)*ld + row[1] + e.out*n,
						rows: rows, cols: n, ldd: ld, value: e.value}}
					switch {
					case skip == place{c, e.right}:
						f.from, f.src, f.lds = theta, tb.Offset+e.in*n, d2*n
					case src < 0:
						continue
					default:
						f.src, f.lds = src+(e.in*wide+source.pack.at[c][e.right])*n, d2*wide*n
					}
					d.moves[row[0]] = append(d.moves[row[0]], f)
				}
			}
		}
	}
	d.finish(p, x)
	return p
}
