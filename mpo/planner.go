package mpo

import (
	"rundle/internal/dense"
	"rundle/mps/block"
)

// Planner plans contractions with one operator. What all plans ask of the operator is worked out on first use and kept. It is not for
// concurrent use; plans are.
type Planner[T dense.Scalar] struct {
	op    *Operator[T]
	sites []*window[T]
	pairs []*window[T] // sites i and i+1 joined
	begun []*window[T] // site i, the entries that lead to an index that crosses the bond on its right
	ended []*window[T] // site i, the entries that come from an index that crosses the bond on its left
	kept  int          // entries of pairs

	projections []*projection[T] // the last ones, of one site and of two from each site on
	growths     []*Growth[T]     // the last ones of each site by side, and by whether there is an identity
	tasks       int              // of them all
	spare       [2][]T           // for the mixtures of the left and of the right
}

// pairEntries bounds the joined entries that a planner keeps: about 50 MB in real arithmetic. Beyond, pairs are joined anew for each plan,
// which then costs as much again.
const pairEntries = 1 << 20

// NewPlanner returns a planner for o.
func NewPlanner[T dense.Scalar](o *Operator[T]) *Planner[T] {
	n := o.Len()
	return &Planner[T]{op: o, sites: make([]*window[T], n), pairs: make([]*window[T], n), begun: make([]*window[T], n), ended: make([]*window[T], n),
		projections: make([]*projection[T], 2*n), growths: make([]*Growth[T], 4*n)}
}

// site returns the window of one site.
func (p *Planner[T]) site(i int) *window[T] {
	if p.sites[i] == nil {
		p.sites[i] = p.single(i, p.op.Sites[i])
	}
	return p.sites[i]
}

// pair returns the window of sites i and i+1.
func (p *Planner[T]) pair(i int) *window[T] {
	if p.pairs[i] != nil {
		return p.pairs[i]
	}
	o := p.op
	joined := joinEntries(o.Sites[i], o.Sites[i+1], o.Phys[i+1].Dim())
	w := newWindow(o.Group, o.Bonds[i], o.Bonds[i+2], o.Phys[i:i+2], joined)
	if p.kept+len(w.local) <= pairEntries {
		p.pairs[i] = w
		p.kept += len(w.local)
	}
	return w
}

// crossing returns the window of one side of the bond between sites i and i+1, with the entries alone that touch terms begun on the left
// and not done.
func (p *Planner[T]) crossing(i int, left bool) *window[T] {
	bond := p.op.Bonds[i+1]
	site, store := i, p.begun
	if !left {
		site, store = i+1, p.ended
	}
	if store[site] == nil {
		var keep []Entry[T]
		for _, e := range p.op.Sites[site] {
			index := e.Left
			if left {
				index = e.Right
			}
			if bond.crosses(index) {
				keep = append(keep, e)
			}
		}
		store[site] = p.single(site, keep)
	}
	return store[site]
}

func (p *Planner[T]) single(i int, entries []Entry[T]) *window[T] {
	o := p.op
	return newWindow(o.Group, o.Bonds[i], o.Bonds[i+1], o.Phys[i:i+1], entries)
}

// crosses reports whether an index carries terms that have begun and are not done.
func (b Bond) crosses(i int32) bool { return int(i) != b.Vacant && int(i) != b.Done }

// ket sees a tensor with the axes (l, s, r) or (l, s1, s2, r) as rows × states × columns, its states in the groups of a window.
type ket struct {
	*block.Structure
	last int // the axis r
}

func asKet(s *block.Structure) ket { return ket{s, len(s.Axes) - 1} }

func (k ket) left() block.Axis  { return k.Axes[0] }
func (k ket) right() block.Axis { return k.Axes[k.last] }

// at returns the sectors of block i: left bond, state group, right bond.
func (k ket) at(i int) (l, s, r int) {
	q := k.Blocks[i].Sectors
	if k.last == 2 {
		return q[0], q[1], q[2]
	}
	return q[0], q[1]*len(k.Axes[2].Sectors) + q[2], q[3]
}

// shape returns the size of block i as rows × states × columns.
func (k ket) shape(i int) (m, d, n int) {
	q := k.Blocks[i].Shape
	if k.last == 2 {
		return q[0], q[1], q[2]
	}
	return q[0], q[1] * q[2], q[3]
}

// find returns the block at the given sectors.
func (k ket) find(l int, s stateGroup, r int) (int, bool) {
	if k.last == 2 {
		return k.Find(l, s.at[0], r)
	}
	return k.Find(l, s.at[0], s.at[1], r)
}

// packing places the indices of an MPO bond that a pass 1 makes among those of their sector.
type packing struct {
	at   [][]int // by sector and index; -1: nothing asks for it
	wide []int   // indices by sector
}

// packed takes what the entries of w ask of its bond on the left or on the right, but for the index at skip.
func packed[T dense.Scalar](w *window[T], left bool, skip place) packing {
	bond := w.wr
	if left {
		bond = w.wl
	}
	p := packing{make([][]int, len(bond.Sectors)), make([]int, len(bond.Sectors))}
	for i, s := range bond.Sectors {
		p.at[i] = make([]int, s.Dim)
	}
	for _, k := range w.links {
		for _, e := range w.local[k.from:k.to] {
			at := place{k.right, e.right}
			if left {
				at = place{k.left, e.left}
			}
			if at != skip {
				p.at[at.sector][at.inner] = 1
			}
		}
	}
	for i, list := range p.at {
		for k, asked := range list {
			list[k] = -1
			if asked == 1 {
				list[k] = p.wide[i]
				p.wide[i]++
			}
		}
	}
	return p
}

// leftSource is pass 1 with the environment on the left: env(l', a, l) · t(l, s, r) for each block of t and each sector a of the MPO bond,
// rows (l', a) with the indices a that are asked for, columns (s, r), in the slab x.
type leftSource[T dense.Scalar] struct {
	w    *window[T]
	t    ket
	env  *block.Structure
	pack packing
	at   []int // place in x, by block of t and a; -1: no such product
	down []int // sector of l with the charge l' - a
}

func newLeftSource[T dense.Scalar](net *network[T], w *window[T], skip place, env *block.Structure, t ket, x *slab) *leftSource[T] {
	na := len(w.wl.Sectors)
	up := steps(w.group, t.left(), +1, w.wl, env.Axes[0])
	p := &leftSource[T]{w: w, t: t, env: env, pack: packed(w, true, skip), at: make([]int, len(t.Blocks)*na), down: steps(w.group, env.Axes[0], -1, w.wl, t.left())}
	for i := range t.Blocks {
		l, _, _ := t.at(i)
		k, d, n := t.shape(i)
		for a := range na {
			p.at[i*na+a] = -1
			e, ok := env.Find(up[l*na+a], a, l)
			wide := p.pack.wide[a]
			if !ok || wide == 0 {
				continue
			}
			eb := &env.Blocks[e]
			m := eb.Shape[0]
			at := x.take(m * wide * d * n)
			p.at[i*na+a] = at
			if wide == eb.Shape[1] {
				net.first = append(net.first, gemmTask{a: eb.Offset, b: t.Blocks[i].Offset, c: at, m: m * wide, n: d * n, k: k, lda: k, ldb: d * n, ldc: d * n})
				continue
			}
			for inner, j := range p.pack.at[a] {
				if j >= 0 {
					net.first = append(net.first, gemmTask{a: eb.Offset + inner*k, b: t.Blocks[i].Offset, c: at + j*d*n,
						m: m, n: d * n, k: k, lda: eb.Shape[1] * k, ldb: d * n, ldc: wide * d * n})
				}
			}
		}
	}
	return p
}

// moves plans a piece of pass 2, rows (l', out), columns (w, r): all that the operator brings there. It appends to the moves of net, and tells
// whether there was anything.
func (p *leftSource[T]) moves(net *network[T], lp, w, out, r int) bool {
	na, before := len(p.w.wl.Sectors), len(net.moves)
	m, n, d := p.env.Axes[0].Sectors[lp].Dim, p.t.right().Sectors[r].Dim, p.w.states[out].dim
	nw := p.w.wr.Sectors[w].Dim
	for _, k := range p.w.by(rightOut)[w*len(p.w.states)+out] {
		l := p.down[lp*na+k.left]
		if l < 0 {
			continue
		}
		t, ok := p.t.find(l, p.w.states[k.in], r)
		if !ok || p.at[t*na+k.left] < 0 {
			continue
		}
		src, ds := p.at[t*na+k.left], p.w.states[k.in].dim
		lds := p.pack.wide[k.left] * ds * n
		for _, e := range p.w.local[k.from:k.to] {
			net.moves = append(net.moves, moveTask[T]{src: src + (p.pack.at[k.left][e.left]*ds+e.in)*n, dst: (e.out*nw + e.right) * n,
				rows: m, cols: n, lds: lds, ldd: d * nw * n, value: e.value})
		}
	}
	return len(net.moves) > before
}

// rightSource is pass 1 with the environment on the right: t(l, s, r) · env(w, r, r') for each block of t and each sector w of the MPO bond,
// rows (l, s), columns (w, r') with the indices w that are asked for, in the slab x.
type rightSource[T dense.Scalar] struct {
	w    *window[T]
	t    ket
	env  *block.Structure
	pack packing
	at   []int // place in x, by block of t and w; -1: no such product
	up   []int // sector of r' with the charge r + w
}

func newRightSource[T dense.Scalar](net *network[T], w *window[T], skip place, env *block.Structure, t ket, x *slab) *rightSource[T] {
	nw := len(w.wr.Sectors)
	p := &rightSource[T]{w: w, t: t, env: env, pack: packed(w, false, skip), at: make([]int, len(t.Blocks)*nw), up: steps(w.group, t.right(), +1, w.wr, env.Axes[2])}
	for i := range t.Blocks {
		_, _, r := t.at(i)
		m, d, k := t.shape(i)
		rows := m * d
		for v := range nw {
			p.at[i*nw+v] = -1
			e, ok := env.Find(v, r, p.up[r*nw+v])
			wide := p.pack.wide[v]
			if !ok || wide == 0 {
				continue
			}
			eb := &env.Blocks[e]
			n := eb.Shape[2]
			at := x.take(rows * wide * n)
			p.at[i*nw+v] = at
			for inner, j := range p.pack.at[v] {
				if j >= 0 {
					net.first = append(net.first, gemmTask{a: t.Blocks[i].Offset, b: eb.Offset + inner*k*n, c: at + j*n,
						m: rows, n: n, k: k, lda: k, ldb: n, ldc: wide * n})
				}
			}
		}
	}
	return p
}

// moves plans a piece of pass 2, rows (a, l, out), columns r': all that the operator brings there. down is the table of r' - w. It appends to the
// moves of net, and tells whether there was anything.
func (p *rightSource[T]) moves(net *network[T], down []int, a, out, l, rp int) bool {
	nw, before := len(p.w.wr.Sectors), len(net.moves)
	m, n, d := p.t.left().Sectors[l].Dim, p.env.Axes[2].Sectors[rp].Dim, p.w.states[out].dim
	for _, k := range p.w.by(leftOut)[a*len(p.w.states)+out] {
		r := down[rp*nw+k.right]
		if r < 0 {
			continue
		}
		t, ok := p.t.find(l, p.w.states[k.in], r)
		if !ok || p.at[t*nw+k.right] < 0 {
			continue
		}
		src, wide := p.at[t*nw+k.right], p.pack.wide[k.right]
		lds := p.w.states[k.in].dim * wide * n
		for _, e := range p.w.local[k.from:k.to] {
			net.moves = append(net.moves, moveTask[T]{src: src + (e.in*wide+p.pack.at[k.right][e.right])*n, dst: (e.left*m*d + e.out) * n,
				rows: m, cols: n, lds: lds, ldd: d * n, value: e.value})
		}
	}
	return len(net.moves) > before
}
