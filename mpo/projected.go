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

	group   block.Group
	wl, wm  block.Axis // MPO bond left of the sites; between them (two sites)
	wr      block.Axis
	phys    stateTable
	sectors [][]int // sector tuple of each combined sector
	entries []Entry[T]
	op      *Operator[T]
	first   int
	pairs   map[pairKey]int
}

// Project plans the Hamiltonian on sites first..first+count-1 (count 1 or 2) for the tensor structure theta.
func Project[T dense.Scalar](o *Operator[T], first, count int, left, right *block.Tensor[T], theta *block.Structure) *Projected[T] {
	p := &Projected[T]{Theta: theta, left: left, right: right, group: o.Group, op: o, first: first,
		wl: o.Bonds[first].Axis(block.In), wr: o.Bonds[first+count].Axis(block.In), pairs: make(map[pairKey]int)}
	p.entries = o.Sites[first]
	p.phys = newStateTable(o.Phys[first])
	for i := range o.Phys[first].Sectors {
		p.sectors = append(p.sectors, []int{i})
	}
	if count == 2 {
		p.wm = o.Bonds[first+1].Axis(block.In)
		p.entries = joinEntries(o.Sites[first], o.Sites[first+1], o.Phys[first+1].Dim())
		p.phys, p.sectors = joinStates(o.Phys[first], o.Phys[first+1])
	}
	p.plan()
	return p
}

// Flops returns the operations of one application.
func (p *Projected[T]) Flops() float64 {
	return p.net.firstFlops + p.net.lastFlops + 2*p.net.middleWork
}

// Apply sets dst = H src on slabs of the structure Theta.
func (p *Projected[T]) Apply(dst, src []T, ws *Workspace[T], pool *task.Pool) {
	p.net.run(dst, p.left.Data, src, nil, p.right.Data, ws, pool)
}

func (p *Projected[T]) find(l, s, r int) (int, bool) {
	var key [4]int
	n := 0
	key[n] = l
	n++
	for _, q := range p.sectors[s] {
		key[n] = q
		n++
	}
	key[n] = r
	return p.Theta.Find(key[:n+1]...)
}

// shape returns block t of theta as rows × states × columns.
func shape(b block.Block) (m, d, n int) {
	last := len(b.Shape) - 1
	d = 1
	for _, k := range b.Shape[1:last] {
		d *= k
	}
	return b.Shape[0], d, b.Shape[last]
}

// charge returns the total charge of a combined physical sector.
func (p *Projected[T]) charge(s int) block.Charge {
	var c block.Charge
	for i, q := range p.sectors[s] {
		c = p.group.Add(c, p.Theta.Axes[1+i].Sectors[q].Charge)
	}
	return c
}

// combined returns the combined physical sector of a block of theta.
func (p *Projected[T]) combined(b block.Block) int {
	if len(p.Theta.Axes) == 3 {
		return b.Sectors[1]
	}
	return b.Sectors[1]*len(p.Theta.Axes[2].Sectors) + b.Sectors[2]
}

// firstLeft plans pass 1: env(l', a, l) · theta(l, s, r), rows (l', a), columns (s, r).
func (p *Projected[T]) firstLeft(x *slab) {
	for t, tb := range p.Theta.Blocks {
		l := tb.Sectors[0]
		m, d, n := shape(tb)
		for a := range p.wl.Sectors {
			lp, ok := p.left.Axes[0].Find(p.group.Add(p.Theta.Axes[0].Sectors[l].Charge, p.wl.Sectors[a].Charge))
			if !ok {
				continue
			}
			e, ok := p.left.Find(lp, a, l)
			if !ok {
				continue
			}
			eb := p.left.Blocks[e]
			rows := eb.Shape[0] * eb.Shape[1]
			at := x.take(rows * d * n)
			p.pairs[pairKey{t, a}] = at
			p.net.first = append(p.net.first, gemmTask{a: eb.Offset, b: tb.Offset, c: at, m: rows, n: d * n, k: m, lda: m, ldb: d * n, ldc: d * n})
		}
	}
}

func (p *Projected[T]) plan() {
	var x, y slab
	p.firstLeft(&x)
	groups := groupEntries(p.entries, p.wl, p.wr, p.phys)
	g, th := p.group, p.Theta
	last := len(th.Axes) - 1
	charges := make([]block.Charge, len(p.sectors))
	for s := range p.sectors {
		charges[s] = p.charge(s)
	}
	for _, ob := range th.Blocks {
		lp, sp, rp := ob.Sectors[0], p.combined(ob), ob.Sectors[last]
		m, d, np := shape(ob)
		var chain []gemmTask
		for w := range p.wr.Sectors {
			r, ok := th.Axes[last].Find(g.Sub(th.Axes[last].Sectors[rp].Charge, p.wr.Sectors[w].Charge))
			if !ok {
				continue
			}
			e, ok := p.right.Find(w, r, rp)
			if !ok {
				continue
			}
			nw, n := p.wr.Sectors[w].Dim, th.Axes[last].Sectors[r].Dim
			var moves []moveTask[T]
			for s := range p.sectors {
				q := g.Sub(th.Axes[last].Sectors[r].Charge, charges[s])
				l, ok := th.Axes[0].Find(q)
				if !ok {
					continue
				}
				a, ok := p.wl.Find(g.Sub(th.Axes[0].Sectors[lp].Charge, q))
				if !ok {
					continue
				}
				group := groups[groupKey{int32(a), int32(w), int32(sp), int32(s)}]
				if len(group) == 0 {
					continue
				}
				t, ok := p.find(l, s, r)
				if !ok {
					continue
				}
				src, ok := p.pairs[pairKey{t, a}]
				if !ok {
					continue
				}
				na, ds := p.wl.Sectors[a].Dim, p.phys.dims[s]
				for _, e := range group {
					moves = append(moves, moveTask[T]{src: src + (e.left*ds+e.in)*n, dst: (e.out*nw + e.right) * n,
						rows: m, cols: n, lds: na * ds * n, ldd: d * nw * n, value: e.value})
				}
			}
			if len(moves) == 0 {
				continue
			}
			at := y.take(m * d * nw * n)
			p.net.middle = append(p.net.middle, finishPiece(at, m*d*nw*n, moves))
			chain = append(chain, gemmTask{a: at, b: p.right.Blocks[e].Offset, c: ob.Offset, m: m * d, n: np, k: nw * n,
				lda: nw * n, ldb: np, ldc: np, add: len(chain) > 0})
		}
		if len(chain) > 0 {
			p.net.last = append(p.net.last, chain)
		}
	}
	p.net.xSize, p.net.ySize = x.size, y.size
	p.net.seal()
}

// joinEntries multiplies the MPO tensors of two neighbouring sites into the entries of one, with combined states
// out = out1*d2 + out2, and sums what coincides.
func joinEntries[T dense.Scalar](one, two []Entry[T], d2 int) []Entry[T] {
	byLeft := make(map[int32][]Entry[T])
	for _, e := range two {
		byLeft[e.Left] = append(byLeft[e.Left], e)
	}
	var all []Entry[T]
	for _, e := range one {
		for _, f := range byLeft[e.Right] {
			all = append(all, Entry[T]{Left: e.Left, Right: f.Right, Out: e.Out*int32(d2) + f.Out, In: e.In*int32(d2) + f.In, Value: e.Value * f.Value})
		}
	}
	return settle(all)
}

// joinStates returns the state table of two sites taken together and the sector pair of each combined sector.
func joinStates(a, b block.Axis) (stateTable, [][]int) {
	ta, tb := newStateTable(a), newStateTable(b)
	var t stateTable
	var pairs [][]int
	for i, da := range ta.dims {
		for j, db := range tb.dims {
			pairs = append(pairs, []int{i, j})
			t.dims = append(t.dims, da*db)
		}
	}
	for i := range ta.sector {
		for j := range tb.sector {
			s := ta.sector[i]*int32(len(tb.dims)) + tb.sector[j]
			t.sector = append(t.sector, s)
			t.inner = append(t.inner, ta.inner[i]*int32(tb.dims[tb.sector[j]])+tb.inner[j])
		}
	}
	return t, pairs
}
