package mpo

import (
	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// operand names a slab that a product reads.
type operand uint8

const (
	theta operand = iota
	leftEnvironment
	leftMixed
	rightEnvironment
	rightMixed
	between // the space of a band
	braSite
	operands
)

// scaledGemm is C (+)= alpha A B on offsets into slabs.
type scaledGemm[T dense.Scalar] struct {
	fromA, fromB  operand
	overwrite     bool
	a, b, c       int
	m, n, k       int
	lda, ldb, ldc int
	opA, opB      dense.Op
	alpha         T
}

func (g *scaledGemm[T]) flops() float64 { return 2 * float64(g.m) * float64(g.n) * float64(g.k) }

// projectionChain computes a part of the result from ends, beginnings and local terms: products[from:to], then moves[movesFrom:movesTo].
type projectionChain struct {
	from, to, movesFrom, movesTo int
	at, rows, cols, ld           int // of the result
}

// feedTask is a move into the space of a band.
type feedTask[T dense.Scalar] struct {
	moveTask[T]
	from      operand
	overwrite bool
}

// band computes what goes through for some rows of one left sector of the result, by products into x, moves from x to y, products with y and moves from
// x into the result. All bands follow all chains.
type band struct{ first, feeds, last, moves span }

// lists hold the tasks of a plan, in the order of their use.
type lists[T dense.Scalar] struct {
	products []scaledGemm[T]
	moves    []moveTask[T]
	feeds    []feedTask[T]
}

func (l *lists[T]) tasks() int { return len(l.products) + len(l.moves) + len(l.feeds) }

// run runs a band with its space.
func (l *lists[T]) run(b *band, slabs *[operands][]T, space, dst []T) {
	slabs[between] = space
	for j := b.first.from; j < b.first.to; j++ {
		g := &l.products[j]
		g.run(slabs[g.fromA], slabs[g.fromB], space)
	}
	for j := b.feeds.from; j < b.feeds.to; j++ {
		f := &l.feeds[j]
		if f.overwrite {
			for k := range f.rows {
				clear(space[f.dst+k*f.ldd:][:f.cols])
			}
		}
		move(&f.moveTask, slabs[f.from], space)
	}
	for j := b.last.from; j < b.last.to; j++ {
		g := &l.products[j]
		g.run(slabs[g.fromA], slabs[g.fromB], dst)
	}
	for j := b.moves.from; j < b.moves.to; j++ {
		move(&l.moves[j], space, dst)
	}
}

func (g *scaledGemm[T]) run(a, b, c []T) {
	beta := dense.FromFloat[T](1)
	if g.overwrite {
		beta = dense.FromFloat[T](0)
	}
	dense.Gemm(g.opA, g.opB, g.m, g.n, g.k, g.alpha, a[g.a:], g.lda, b[g.b:], g.ldb, beta, c[g.c:], g.ldc)
}

// projection is the plan of a projected Hamiltonian. Each part of the result has one writer at a time, and what it adds comes in a fixed order.
type projection[T dense.Scalar] struct {
	key           projectionKey
	lefts, rights *mixtures[T]
	lists[T]
	chains  []projectionChain
	bands   []band
	scratch int // elements of the space of a band

	flops, chainFlops, bandFlops float64
}

// projectionKey is what a plan depends on, besides its sites.
type projectionKey struct {
	theta, left, right *block.Structure
	vacant, done       place // where the environments are the identity
}

func (k *projectionKey) equal(o *projectionKey) bool {
	return k.vacant == o.vacant && k.done == o.done && k.theta.Equal(o.theta) && k.left.Equal(o.left) && k.right.Equal(o.right)
}

// projection returns the plan for the sites from first on: the last one made there if it fits, a new one otherwise.
func (p *Planner[T]) projection(first int, w *window[T], key projectionKey) *projection[T] {
	slot := &p.projections[2*first+len(key.theta.Axes)-3]
	if *slot != nil && (*slot).key.equal(&key) {
		return *slot
	}
	if *slot != nil {
		p.tasks -= (*slot).tasks()
		*slot = nil
	}
	plan := p.draw(w, key)
	if p.tasks+plan.tasks() <= planTasks {
		p.tasks += plan.tasks()
		*slot = plan
	}
	return plan
}

// planTasks bounds the products and moves of the plans that a planner keeps: about 100 MB.
const planTasks = 1 << 20

func (p *projection[T]) tasks() int {
	return p.lists.tasks() + len(p.chains)
}

// scheme returns the scheme of a window, the last one made if it fits.
func (w *window[T]) scheme(vacant, done place) *scheme[T] {
	at := 0
	if vacant != nowhere {
		at++
	}
	if done != nowhere {
		at += 2
	}
	if w.schemes[at] == nil {
		w.schemes[at] = newScheme(w, vacant, done)
	}
	return w.schemes[at]
}

// drawing is a projection under construction.
type drawing[T dense.Scalar] struct {
	*projection[T]
	w                 *window[T]
	s                 *scheme[T]
	t                 ket
	left, right       *block.Structure
	downLeft, upRight []int        // sectors of l with the charge l' - a, by l' and a; of r' with r + w, by r and w
	downRight         []int        // of r with r' - w, by r' and w
	endsTo, beginsTo  [][]use[T]   // by outgoing group
	localTo           [][]local[T] // by outgoing group
	work              []float64    // of the chains
	bandWork          []float64
	feedsOf           [][]feed[T] // by y
}

func (p *Planner[T]) draw(w *window[T], key projectionKey) *projection[T] {
	s := w.scheme(key.vacant, key.done)
	t := asKet(key.theta)
	d := &drawing[T]{projection: &projection[T]{key: key, lefts: newMixtures(s.lefts, key.left, true), rights: newMixtures(s.rights, key.right, false)},
		w: w, s: s, t: t, left: key.left, right: key.right,
		downLeft:  steps(w.group, t.left(), -1, w.wl, t.left()),
		upRight:   steps(w.group, t.right(), +1, w.wr, t.right()),
		downRight: steps(w.group, t.right(), -1, w.wr, t.right())}
	d.endsTo, d.beginsTo, d.localTo = make([][]use[T], len(w.states)), make([][]use[T], len(w.states)), make([][]local[T], len(w.states))
	for _, u := range s.ends {
		d.endsTo[u.out.sector] = append(d.endsTo[u.out.sector], u)
	}
	for _, u := range s.begins {
		d.beginsTo[u.out.sector] = append(d.beginsTo[u.out.sector], u)
	}
	for _, u := range s.local {
		d.localTo[u.out.sector] = append(d.localTo[u.out.sector], u)
	}
	for i := range t.Blocks {
		d.chainsOf(i)
	}
	if len(s.xs) > 0 || len(s.ys) > 0 {
		d.feedsOf = make([][]feed[T], len(s.ys))
		for _, f := range s.feeds {
			d.feedsOf[f.y] = append(d.feedsOf[f.y], f)
		}
		for lp := range t.left().Sectors {
			d.bandsOf(lp)
		}
	}
	d.finish()
	return d.projection
}

// inner returns the place of the rows of one state in block i: the offset, the distance of rows, and the size.
func (d *drawing[T]) inner(i int, s place) (at, ld, m, n int) {
	m, states, n := d.t.shape(i)
	return d.t.Blocks[i].Offset + s.inner*n, states * n, m, n
}

// chainsOf plans the chains of a block of the result, one or more for each of its states.
func (d *drawing[T]) chainsOf(i int) {
	lp, out, rp := d.t.at(i)
	for j := range d.w.states[out].dim {
		to := place{out, j}
		at, ld, m, n := d.inner(i, to)
		var products []scaledGemm[T]
		for _, u := range d.endsTo[out] {
			if u.out == to {
				d.end(&products, u, lp, rp, at, ld)
			}
		}
		for _, u := range d.beginsTo[out] {
			if u.out == to {
				d.begin(&products, u, lp, rp, at, ld)
			}
		}
		var moves []moveTask[T]
		for _, u := range d.localTo[out] {
			if u.out != to {
				continue
			}
			if b, ok := d.t.find(lp, d.w.states[u.in.sector], rp); ok {
				from, lds, _, _ := d.inner(b, u.in)
				moves = append(moves, moveTask[T]{src: from, dst: at, rows: m, cols: n, lds: lds, ldd: ld, value: u.value})
			}
		}
		d.cut(products, moves, at, ld, m, n)
	}
}

// end adds the product of a mixture on the left with t to the result at sectors lp, rp, which stands at at.
func (d *drawing[T]) end(list *[]scaledGemm[T], u use[T], lp, rp, at, ld int) {
	sector := d.s.lefts[u.mixture].sector
	l := d.downLeft[lp*len(d.w.wl.Sectors)+sector]
	if l < 0 {
		return
	}
	b, ok := d.t.find(l, d.w.states[u.in.sector], rp)
	if !ok {
		return
	}
	e, ok := d.left.Find(lp, sector, l)
	if !ok {
		return
	}
	from, ldb, k, n := d.inner(b, u.in)
	g := scaledGemm[T]{fromB: theta, b: from, ldb: ldb, c: at, ldc: ld, m: d.t.left().Sectors[lp].Dim, n: n, k: k, alpha: u.factor}
	g.fromA, g.a, g.lda = d.lefts.matrix(u.mixture, e, l)
	*list = append(*list, g)
}

// begin adds the product of t with a mixture on the right.
func (d *drawing[T]) begin(list *[]scaledGemm[T], u use[T], lp, rp, at, ld int) {
	sector := d.s.rights[u.mixture].sector
	r := d.downRight[rp*len(d.w.wr.Sectors)+sector]
	if r < 0 {
		return
	}
	b, ok := d.t.find(lp, d.w.states[u.in.sector], r)
	if !ok {
		return
	}
	e, ok := d.right.Find(sector, r, rp)
	if !ok {
		return
	}
	from, lda, m, k := d.inner(b, u.in)
	g := scaledGemm[T]{fromA: theta, a: from, lda: lda, c: at, ldc: ld, m: m, n: d.t.right().Sectors[rp].Dim, k: k, alpha: u.factor}
	g.fromB, g.b, g.ldb = d.rights.matrix(u.mixture, e, r)
	*list = append(*list, g)
}

// A chain is cut along the longer side of its result when it is worth several tasks, so that one large block cannot keep a thread waiting. The rule looks
// at sizes only.
const (
	partFlops = 2e7 // least work of a part
	partWidth = 64  // least width of a part
	mostParts = 8
)

// cut adds the chain of m×n elements of the result at at, in parts.
func (d *drawing[T]) cut(products []scaledGemm[T], moves []moveTask[T], at, ld, m, n int) {
	total := float64(copyWeight*m*n) * float64(len(moves)+1)
	for i := range products {
		products[i].overwrite = i == 0
		total += products[i].flops()
	}
	d.chainFlops += total
	parts := max(1, min(mostParts, int(total/partFlops), max(m, n)/partWidth))
	for part := range parts {
		c := projectionChain{from: len(d.products), movesFrom: len(d.moves), at: at, rows: m, cols: n, ld: ld}
		if m >= n {
			from, to := part*m/parts, (part+1)*m/parts
			c.at, c.rows = at+from*ld, to-from
			for _, g := range products {
				g.a, g.c, g.m = g.a+from*g.lda, g.c+from*g.ldc, to-from
				d.products = append(d.products, g)
			}
			for _, v := range moves {
				v.src, v.dst, v.rows = v.src+from*v.lds, v.dst+from*v.ldd, to-from
				d.moves = append(d.moves, v)
			}
		} else {
			from, to := part*n/parts, (part+1)*n/parts
			c.at, c.cols = at+from, to-from
			for _, g := range products {
				g.b, g.c, g.n = g.b+from, g.c+from, to-from
				d.products = append(d.products, g)
			}
			for _, v := range moves {
				v.src, v.dst, v.cols = v.src+from, v.dst+from, to-from
				d.moves = append(d.moves, v)
			}
		}
		c.to, c.movesTo = len(d.products), len(d.moves)
		d.chains = append(d.chains, c)
		d.work = append(d.work, total/float64(parts))
	}
}

// finish puts the largest pieces first and adds up the work.
func (d *drawing[T]) finish() {
	d.chains = reorder(d.chains, task.ByWork(d.work))
	d.bands = reorder(d.bands, task.ByWork(d.bandWork))
	for i := range d.products {
		d.flops += d.products[i].flops()
	}
}

// clearGaps zeroes what lies between the blocks of a slab.
func clearGaps[T dense.Scalar](s *block.Structure, dst []T) {
	end := 0
	for i := range s.Blocks {
		b := &s.Blocks[i]
		clear(dst[end:b.Offset])
		end = b.Offset + b.Len
	}
	clear(dst[end:])
}
