package mpo

import "rundle/internal/dense"

// Space of a band, in elements: at most, so that x and y stay in the second-level cache or near it, and rows that it should not go below for it.
const (
	bandSpace = 1 << 18
	bandRows  = 32
)

// strip is the tasks of a band under construction.
type strip[T dense.Scalar] struct {
	lp, from, rows int
	space          slab
	x              []int // place of x, by number and right sector; -1: not planned, -2: not there
	first, last    []scaledGemm[T]
	feeds          []feedTask[T]
	moves          []moveTask[T]
}

// bandsOf plans what goes through into the sector lp, in bands of rows of equal size.
func (d *drawing[T]) bandsOf(lp int) {
	m := d.t.left().Sectors[lp].Dim
	whole := d.strip(lp, 0, m)
	if len(whole.last) == 0 && len(whole.moves) == 0 {
		return
	}
	work := whole.work()
	d.bandFlops += work
	parts := max(1, min(mostParts, int(work/partFlops), m/partWidth))
	if rows := max(bandRows, bandSpace*m/max(1, whole.space.size)); rows < m {
		parts = max(parts, (m+rows-1)/rows)
	}
	for part := range parts {
		from, to := part*m/parts, (part+1)*m/parts
		s := whole
		if parts > 1 {
			s = d.strip(lp, from, to-from)
		}
		b := band{first: span{from: len(d.products)}, feeds: span{from: len(d.feeds)}, moves: span{from: len(d.moves)}}
		d.products = append(d.products, s.first...)
		b.first.to, b.last.from = len(d.products), len(d.products)
		d.products = append(d.products, s.last...)
		b.last.to = len(d.products)
		d.feeds = append(d.feeds, s.feeds...)
		b.feeds.to = len(d.feeds)
		d.moves = append(d.moves, s.moves...)
		b.moves.to = len(d.moves)
		d.bands = append(d.bands, b)
		d.bandWork = append(d.bandWork, work/float64(parts))
		d.scratch = max(d.scratch, s.space.size)
	}
}

func (s *strip[T]) work() (work float64) {
	for _, list := range [][]scaledGemm[T]{s.first, s.last} {
		for i := range list {
			work += list[i].flops()
		}
	}
	for _, f := range s.feeds {
		work += copyWeight * float64(f.rows) * float64(f.cols)
	}
	for _, f := range s.moves {
		work += copyWeight * float64(f.rows) * float64(f.cols)
	}
	return work
}

// strip plans rows from.. of the sector lp.
func (d *drawing[T]) strip(lp, from, rows int) *strip[T] {
	right := d.t.right().Sectors
	s := &strip[T]{lp: lp, from: from, rows: rows, x: make([]int, len(d.s.xs)*len(right))}
	for i := range s.x {
		s.x[i] = -1
	}
	for q := range d.s.ys {
		for r := range right {
			d.through(s, q, r)
		}
	}
	for _, f := range d.s.finish {
		for r := range right {
			to, ok := d.t.find(lp, d.w.states[f.out.sector], r)
			if !ok {
				continue
			}
			if x := d.partial(s, f.in.sector, r); x >= 0 {
				at, ldd, _, n := d.inner(to, f.out)
				s.moves = append(s.moves, moveTask[T]{src: x, dst: at + from*ldd, rows: rows, cols: n, lds: n, ldd: ldd, value: f.value})
			}
		}
	}
	return s
}

// partial returns the place of x number i at the right sector r; negative if there is none.
func (d *drawing[T]) partial(s *strip[T], i, r int) int {
	at := &s.x[i*len(d.t.right().Sectors)+r]
	if *at != -1 {
		return *at
	}
	*at = -2
	x := d.s.xs[i]
	l := d.downLeft[s.lp*len(d.w.wl.Sectors)+x.at.sector]
	if l < 0 {
		return *at
	}
	b, ok := d.t.find(l, d.w.states[x.state.sector], r)
	if !ok {
		return *at
	}
	e, ok := d.left.Find(s.lp, x.at.sector, l)
	if !ok {
		return *at
	}
	eb := &d.left.Blocks[e]
	from, ldb, k, n := d.inner(b, x.state)
	lda := eb.Shape[1] * k
	*at = s.space.take(s.rows * n)
	s.first = append(s.first, scaledGemm[T]{fromA: leftEnvironment, fromB: theta, overwrite: true, alpha: 1,
		a: eb.Offset + x.at.inner*k + s.from*lda, lda: lda, b: from, ldb: ldb, c: *at, ldc: n, m: s.rows, n: n, k: k})
	return *at
}

// through plans y number q at the right sector r and its product. A y that is a multiple of one x or t is read from there.
func (d *drawing[T]) through(s *strip[T], q, r int) {
	y := d.s.ys[q]
	rp := d.upRight[r*len(d.w.wr.Sectors)+y.at.sector]
	if rp < 0 {
		return
	}
	to, ok := d.t.find(s.lp, d.w.states[y.state.sector], rp)
	if !ok {
		return
	}
	e, ok := d.right.Find(y.at.sector, r, rp)
	if !ok {
		return
	}
	eb := &d.right.Blocks[e]
	k, n := eb.Shape[1], eb.Shape[2]
	var feeds []feedTask[T]
	for _, f := range d.feedsOf[q] {
		v := feedTask[T]{moveTask: moveTask[T]{rows: s.rows, cols: k, lds: k, ldd: k, value: f.value}, from: between}
		if f.x >= 0 {
			if v.src = d.partial(s, f.x, r); v.src < 0 {
				continue
			}
		} else {
			b, ok := d.t.find(s.lp, d.w.states[f.in.sector], r)
			if !ok {
				continue
			}
			v.from = theta
			v.src, v.lds, _, _ = d.inner(b, f.in)
			v.src += s.from * v.lds
		}
		feeds = append(feeds, v)
	}
	if len(feeds) == 0 {
		return
	}
	at, ldc, _, _ := d.inner(to, y.state)
	g := scaledGemm[T]{fromA: feeds[0].from, a: feeds[0].src, lda: feeds[0].lds, alpha: feeds[0].value,
		fromB: rightEnvironment, b: eb.Offset + y.at.inner*k*n, ldb: n, c: at + s.from*ldc, ldc: ldc, m: s.rows, n: n, k: k}
	if len(feeds) > 1 {
		g.fromA, g.a, g.lda, g.alpha = between, s.space.take(s.rows*k), k, 1
		for i := range feeds {
			feeds[i].dst, feeds[i].overwrite = g.a, i == 0
		}
		s.feeds = append(s.feeds, feeds...)
	}
	s.last = append(s.last, g)
}
