package mpo

import (
	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// growing is a Growth under construction. In what follows outer is a sector of the ket's bond of the result, and far one of the bra's bond on the
// other side of the site, which are summed over.
type growing[T dense.Scalar] struct {
	*Growth[T]
	w        *window[T]
	s        *growthScheme[T]
	ket, bra ket
	ketAt    []int // block by outer and state sector; -1: none
	braAt    []int // by far and state sector
	work     []float64
}

func (p *Planner[T]) grown(site int, w *window[T], key growthKey) *Growth[T] {
	to := nowhere
	axes := []block.Axis{w.wl, key.ket.Axes[0], key.bra.Axes[0].Reversed()}
	if key.left {
		axes = []block.Axis{key.bra.Axes[2], w.wr, key.ket.Axes[2].Reversed()}
	}
	if key.same != nowhere && key.left {
		to = placeOf(w.wr, p.op.Bonds[site+1].Vacant)
	} else if key.same != nowhere {
		to = placeOf(w.wl, p.op.Bonds[site].Done)
	}
	s := w.growthScheme(key.left, key.same, to)
	g := &growing[T]{Growth: &Growth[T]{Out: block.NewStructure(w.group, axes, block.Charge{}), key: key, mixed: newMixtures(s.mixes, key.env, key.left)},
		w: w, s: s, ket: asKet(key.ket), bra: asKet(key.bra)}
	outer, far := g.ket.left(), g.bra.right()
	if key.left {
		outer, far = g.ket.right(), g.bra.left()
	}
	g.ketAt, g.braAt = blocksAt(g.ket, key.left, outer, len(w.states)), blocksAt(g.bra, !key.left, far, len(w.states))
	for o := range outer.Sectors {
		g.bandsOf(o, outer.Sectors[o].Dim, len(far.Sectors))
	}
	g.bands = reorder(g.bands, task.ByWork(g.work))
	for i := range g.products {
		g.flops += g.products[i].flops()
	}
	return g.Growth
}

// blocksAt lists the blocks of a site tensor by the sectors of its right or left bond and of its state.
func blocksAt(k ket, right bool, bond block.Axis, states int) []int {
	at := make([]int, len(bond.Sectors)*states)
	for i := range at {
		at[i] = -1
	}
	for i := range k.Blocks {
		l, s, r := k.at(i)
		if right {
			l = r
		}
		at[l*states+s] = i
	}
	return at
}

// growthStrip is the tasks of a band under construction.
type growthStrip[T dense.Scalar] struct {
	outer, from, n int // columns (rows, on the right) from.. of outer
	steps          []strip[T]
	written        []bool // blocks of the result by index: each index of its sector has had its first product
	space          int
}

// bandsOf plans the part of the result at one sector of n states, in bands of equal width.
func (g *growing[T]) bandsOf(outer, n, far int) {
	whole := g.strip(outer, 0, n, far)
	work := 0.0
	for i := range whole.steps {
		work += whole.steps[i].work()
	}
	g.bandWork += work
	parts := max(1, min(mostParts, int(work/partFlops), n/partWidth))
	if width := max(bandRows, bandSpace*n/max(1, whole.space)); width < n {
		parts = max(parts, (n+width-1)/width)
	}
	for part := range parts {
		from, to := part*n/parts, (part+1)*n/parts
		s := whole
		if parts > 1 {
			s = g.strip(outer, from, to-from, far)
		}
		b := growthBand{steps: span{from: len(g.steps)}, blanks: span{from: len(g.blanks)}, units: span{from: len(g.units)}}
		for i := range s.steps {
			t := &s.steps[i]
			d := band{first: span{from: len(g.products)}, feeds: span{from: len(g.feeds)}}
			g.products = append(g.products, t.first...)
			d.first.to, d.last.from = len(g.products), len(g.products)
			g.products = append(g.products, t.last...)
			d.last.to = len(g.products)
			g.feeds = append(g.feeds, t.feeds...)
			d.feeds.to = len(g.feeds)
			g.steps = append(g.steps, d)
		}
		b.steps.to = len(g.steps)
		g.rest(s)
		b.blanks.to, b.units.to = len(g.blanks), len(g.units)
		g.bands = append(g.bands, b)
		g.work = append(g.work, work/float64(parts))
		g.scratch = max(g.scratch, s.space)
	}
}

// strip plans n columns (rows) of one sector of the result. In one step after the other it adds what the far sectors bring.
func (g *growing[T]) strip(outer, from, n, far int) *growthStrip[T] {
	s := &growthStrip[T]{outer: outer, from: from, n: n, written: make([]bool, g.places())}
	for c := range far {
		t := strip[T]{x: make([]int, len(g.s.xs))}
		for i := range t.x {
			t.x[i] = -1
		}
		for i := range g.s.ys {
			g.sum(s, &t, &g.s.ys[i], c)
		}
		if len(t.last) > 0 {
			s.steps = append(s.steps, t)
			s.space = max(s.space, t.space.size)
		}
	}
	return s
}

// matrices of the result are numbered by block and index within the sector.
func (g *growing[T]) places() int { return len(g.Out.Blocks) * g.widest() }

func (g *growing[T]) widest() (n int) {
	for _, s := range g.Out.Axes[g.bond()].Sectors {
		n = max(n, s.Dim)
	}
	return n
}

// bond is the axis of the result that is the operator's.
func (g *growing[T]) bond() int {
	if g.key.left {
		return 1
	}
	return 0
}

// sum plans a y at the far sector c and its product.
func (g *growing[T]) sum(s *growthStrip[T], t *strip[T], y *sum3[T], c int) {
	b := g.braAt[c*len(g.w.states)+y.state.sector]
	if b < 0 {
		return
	}
	l, _, r := g.bra.at(b)
	var to int
	var ok bool
	if g.key.left {
		to, ok = g.Out.Find(r, y.at.sector, s.outer)
	} else {
		to, ok = g.Out.Find(y.at.sector, s.outer, l)
	}
	if !ok {
		return
	}
	rows, cols := g.size(s, c)
	var products []scaledGemm[T]
	for _, m := range y.mixed {
		if p, ok := g.first(s, m.in, g.s.mixes[m.from].sector, c); ok {
			g.environment(&p, m.from, -1)
			p.alpha = m.value
			products = append(products, p)
		}
	}
	var feeds []feedTask[T]
	for _, x := range y.xs {
		if at := g.partial(s, t, x.from, c); at >= 0 {
			feeds = append(feeds, feedTask[T]{moveTask: moveTask[T]{src: at, lds: cols, value: x.value}, from: between})
		}
	}
	for _, k := range y.kets {
		if b := g.ketAt[s.outer*len(g.w.states)+k.in.sector]; b >= 0 && g.inner(b) == c {
			at, ld := g.ketMatrix(s, b, k.in)
			feeds = append(feeds, feedTask[T]{moveTask: moveTask[T]{src: at, lds: ld, value: k.value}, from: theta})
		}
	}
	if len(products)+len(feeds) == 0 {
		return
	}
	last := scaledGemm[T]{fromB: between, ldb: cols, alpha: 1}
	if len(products) == 0 && len(feeds) == 1 {
		last.fromB, last.b, last.ldb, last.alpha = feeds[0].from, feeds[0].src, feeds[0].lds, feeds[0].value
	} else {
		last.b = t.space.take(rows * cols)
		for i := range products {
			products[i].c, products[i].overwrite = last.b, i == 0
		}
		for i := range feeds {
			f := &feeds[i]
			f.dst, f.rows, f.cols, f.ldd, f.overwrite = last.b, rows, cols, cols, i == 0 && len(products) == 0
		}
		t.first, t.feeds = append(t.first, products...), append(t.feeds, feeds...)
	}
	g.last(s, t, last, b, to, y)
}

// size is that of an x or y at the far sector c.
func (g *growing[T]) size(s *growthStrip[T], c int) (rows, cols int) {
	if g.key.left {
		return g.bra.left().Sectors[c].Dim, s.n
	}
	return s.n, g.bra.right().Sectors[c].Dim
}

// inner is the sector of a block of the ket on the bond of the environment.
func (g *growing[T]) inner(b int) int {
	l, _, r := g.ket.at(b)
	if g.key.left {
		return l
	}
	return r
}

// ketMatrix returns where the columns (rows) of a strip stand in a block of the ket, for one state.
func (g *growing[T]) ketMatrix(s *growthStrip[T], b int, state place) (at, ld int) {
	_, states, n := g.ket.shape(b)
	at, ld = g.ket.Blocks[b].Offset+state.inner*n, states*n
	if g.key.left {
		return at + s.from, ld
	}
	return at + s.from*ld, ld
}

// first plans the product of the ket at a state with a matrix of the environment in some sector, which is left open.
func (g *growing[T]) first(s *growthStrip[T], in place, sector, c int) (p scaledGemm[T], ok bool) {
	b := g.ketAt[s.outer*len(g.w.states)+in.sector]
	if b < 0 {
		return p, false
	}
	k := g.inner(b)
	rows, cols := g.size(s, c)
	at, ld := g.ketMatrix(s, b, in)
	p = scaledGemm[T]{m: rows, n: cols, ldc: cols, alpha: 1, overwrite: true}
	if g.key.left {
		p.a, ok = g.key.env.Find(c, sector, k)
		p.fromB, p.b, p.ldb, p.k = theta, at, ld, g.ket.left().Sectors[k].Dim
	} else {
		p.b, ok = g.key.env.Find(sector, k, c)
		p.fromA, p.a, p.lda, p.k = theta, at, ld, g.ket.right().Sectors[k].Dim
	}
	return p, ok
}

// environment sets the matrix of the environment in p, whose block p names: a mixture, or if that is negative the index inner.
func (g *growing[T]) environment(p *scaledGemm[T], mixture, inner int) {
	e := p.b
	if g.key.left {
		e = p.a
	}
	b := &g.key.env.Blocks[e]
	var from operand
	var at, ld int
	switch {
	case mixture >= 0 && g.key.left:
		from, at, ld = g.mixed.matrix(mixture, e, b.Sectors[2])
	case mixture >= 0:
		from, at, ld = g.mixed.matrix(mixture, e, b.Sectors[1])
	case g.key.left:
		from, at, ld = leftEnvironment, b.Offset+inner*b.Shape[2], b.Shape[1]*b.Shape[2]
	default:
		from, at, ld = rightEnvironment, b.Offset+inner*b.Shape[1]*b.Shape[2], b.Shape[2]
	}
	if g.key.left {
		p.fromA, p.a, p.lda = from, at, ld
	} else {
		p.fromB, p.b, p.ldb = from, at, ld
	}
}

// partial returns the place of x number i at the far sector c; negative if there is none.
func (g *growing[T]) partial(s *growthStrip[T], t *strip[T], i, c int) int {
	if t.x[i] != -1 {
		return t.x[i]
	}
	t.x[i] = -2
	x := g.s.xs[i]
	p, ok := g.first(s, x.state, x.at.sector, c)
	if !ok {
		return -2
	}
	g.environment(&p, -1, x.at.inner)
	p.c = t.space.take(p.m * p.n)
	t.first = append(t.first, p)
	t.x[i] = p.c
	return p.c
}

// last plans the product of y with block b of the bra into block to of the result.
func (g *growing[T]) last(s *growthStrip[T], t *strip[T], p scaledGemm[T], b, to int, y *sum3[T]) {
	bb, ob := &g.bra.Blocks[b], &g.Out.Blocks[to]
	m, d, n := g.bra.shape(b)
	at, ld := bb.Offset+y.state.inner*n, d*n
	if g.key.left {
		p.fromA, p.a, p.lda, p.opA = braSite, at, ld, dense.ConjTrans
		p.m, p.n, p.k = n, s.n, m
		p.c, p.ldc = ob.Offset+y.at.inner*ob.Shape[2]+s.from, ob.Shape[1]*ob.Shape[2]
	} else {
		p.fromA, p.a, p.lda = p.fromB, p.b, p.ldb
		p.fromB, p.b, p.ldb, p.opB = braSite, at, ld, dense.ConjTrans
		p.m, p.n, p.k = s.n, m, n
		p.c, p.ldc = ob.Offset+(y.at.inner*ob.Shape[1]+s.from)*ob.Shape[2], ob.Shape[2]
	}
	w := &s.written[to*g.widest()+y.at.inner]
	p.overwrite, *w = !*w, true
	t.last = append(t.last, p)
}

// rest lists what no product overwrites of a strip of the result.
func (g *growing[T]) rest(s *growthStrip[T]) {
	bond, outer := g.bond(), g.bond()+1
	for to := range g.Out.Blocks {
		b := &g.Out.Blocks[to]
		if b.Sectors[outer] != s.outer {
			continue
		}
		for i := range b.Shape[bond] {
			if s.written[to*g.widest()+i] {
				continue
			}
			z := blank{b.Offset + i*b.Shape[2] + s.from, b.Shape[0], s.n, b.Shape[1] * b.Shape[2]}
			if !g.key.left {
				z = blank{b.Offset + (i*b.Shape[1]+s.from)*b.Shape[2], s.n, b.Shape[2], b.Shape[2]}
			}
			g.blanks = append(g.blanks, z)
			if (place{b.Sectors[bond], i}) == g.s.same {
				at := z.at + s.from*z.ld
				if !g.key.left {
					at = z.at + s.from
				}
				g.units = append(g.units, unitTask{at, s.n, z.ld + 1})
			}
		}
	}
}
