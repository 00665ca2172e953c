package mpo

import (
	"math"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// compress brings every bond to the operator rank of its crossing strings: a sweep to the right makes the left strings of
// each bond independent, a sweep to the left the right ones. The fixed indices stay exact; strings are judged up to
// multiples of the identity where a vacant (done) index can take those over.
func (m *automaton[T]) compress(opt Options) {
	m.sweep(opt)
	m.mirror()
	m.trim()
	m.sweep(opt)
	m.mirror()
	m.trim()
}

// sweep removes, from left to right, the indices whose left strings depend on others.
//
// With it go two numbers an index, the binary exponents of the largest product of matrix entries on a path from the left end
// to it and from it to the right end. An entry with both factors is the largest coupling that passes it: ranks are judged on
// such numbers, whatever the share of the coupling on either side.
func (m *automaton[T]) sweep(opt Options) {
	right := m.reach()
	left := []int{vacant: 0, done: 0}
	for i := range m.cells {
		if i+1 < len(m.cells) {
			r := reducer[T]{automaton: m, opt: opt, site: i, left: left, right: right[i+1]}
			right[i+1] = r.run()
		}
		next := unreached(len(m.joints[i+1].charges))
		for _, c := range m.cells[i] {
			next[c.r] = max(next[c.r], left[c.l]+exponent(c.v))
		}
		left = next
	}
}

// far is the exponent of an index that nothing reaches.
const far = math.MinInt / 4

func unreached(n int) []int {
	e := make([]int, n)
	for i := range e {
		e[i] = far
	}
	return e
}

// reach returns the exponents towards the right end for all bonds.
func (m *automaton[T]) reach() [][]int {
	n := len(m.cells)
	right := make([][]int, n+1)
	right[n] = unreached(len(m.joints[n].charges))
	right[n][done] = 0
	for i := n - 1; i >= 0; i-- {
		right[i] = unreached(len(m.joints[i].charges))
		for _, c := range m.cells[i] {
			right[i][c.l] = max(right[i][c.l], right[i+1][c.r]+exponent(c.v))
		}
	}
	return right
}

// reducer makes the columns of one site independent: a column is what an index of the bond behind the site sums over rows,
// the pairs (index of the bond before, basis element).
type reducer[T dense.Scalar] struct {
	*automaton[T]
	opt         Options
	site        int
	left, right []int // exponents of the bonds before and behind the site
	takes       bool  // the vacant index goes on over the site and can take what columns have of the identity

	columns [][]cell[T]   // cells by column, sorted by row; l and k name the row
	like    []multiple[T] // columns that are multiples of earlier ones
	ones    []T           // what each column has of the identity, if takes
	kept    []T           // as much of it as stays with the column

	images  [][]image[T] // columns in the new indices, vacant left out
	charges []block.Charge
	reach   []int // exponents of the new indices towards the right end
	out     []cell[T]
}

// multiple says that a column is ratio times column of; the zero value says that it is not.
type multiple[T dense.Scalar] struct {
	of    int32
	ratio T
}

// image is a part of an old index in the new ones.
type image[T dense.Scalar] struct {
	index int32
	v     T
}

// run reduces the bond behind the site and returns its exponents towards the right end.
func (r *reducer[T]) run() []int {
	r.takes = r.joints[r.site].vacant && r.joints[r.site+1].vacant
	r.split()
	changed := r.findMultiples()
	groups := r.connected()
	plans := make([]*elimination[T], len(groups))
	for g, columns := range groups {
		plans[g] = r.examine(columns)
		changed = changed || plans[g] != nil
	}
	if !changed {
		return r.right
	}
	r.charges = append([]block.Charge(nil), r.joints[r.site+1].charges[:crossing]...)
	r.reach = append([]int(nil), r.right[:crossing]...)
	r.images = make([][]image[T], len(r.columns))
	for g, columns := range groups {
		if plans[g] == nil {
			r.retain(columns)
		} else {
			r.replace(columns, plans[g])
		}
	}
	r.follow()
	r.cells[r.site] = gather(r.out, noise)
	r.joints[r.site+1].charges = r.charges
	return r.reach
}

func (r *reducer[T]) identityRow(c cell[T]) bool { return r.takes && c.l == vacant && c.k == 0 }

// split files the site's cells by column.
func (r *reducer[T]) split() {
	r.cells[r.site] = gather(r.cells[r.site], noise)
	n := len(r.joints[r.site+1].charges)
	r.columns, r.like, r.ones, r.kept = make([][]cell[T], n), make([]multiple[T], n), make([]T, n), make([]T, n)
	for _, c := range r.cells[r.site] {
		switch {
		case c.r < crossing:
			r.out = append(r.out, c)
		case r.identityRow(c):
			r.ones[c.r] = c.v
		default:
			r.columns[c.r] = append(r.columns[c.r], c)
		}
	}
}

// findMultiples finds columns that are multiples of an earlier one; it reports whether there are any, or columns that are
// empty but for the identity.
func (r *reducer[T]) findMultiples() bool {
	found := false
	byShape := make(map[uint64][]int32)
	for c := crossing; c < len(r.columns); c++ {
		col := r.columns[c]
		if len(col) == 0 {
			found = true
			continue
		}
		h := shapeHash(col)
		for _, e := range byShape[h] {
			if ratio, ok := columnQuotient(col, r.columns[e]); ok {
				r.like[c] = multiple[T]{e, ratio}
				found = true
				break
			}
		}
		if r.like[c].of == 0 {
			byShape[h] = append(byShape[h], int32(c))
		}
	}
	return found
}

// shapeHash hashes the rows of a column (FNV-1a over 32-bit words).
func shapeHash[T dense.Scalar](col []cell[T]) uint64 {
	h := uint64(14695981039346656037)
	for _, c := range col {
		h = (h ^ uint64(uint32(c.l))) * 1099511628211
		h = (h ^ uint64(uint32(c.k))) * 1099511628211
	}
	return h
}

// columnQuotient returns q with a = q b to the last digits, if there is one.
func columnQuotient[T dense.Scalar](a, b []cell[T]) (q T, ok bool) {
	if len(a) != len(b) {
		return q, false
	}
	q = a[0].v / b[0].v
	for i := range a {
		if a[i].l != b[i].l || a[i].k != b[i].k || dense.Abs(a[i].v-q*b[i].v) > noise*dense.Abs(a[i].v) {
			return q, false
		}
	}
	return q, true
}

// connected returns the sets of columns that share rows, directly or over others; multiples are left out.
func (r *reducer[T]) connected() [][]int32 {
	parent := make([]int32, len(r.columns))
	for c := range parent {
		parent[c] = int32(c)
	}
	find := func(c int32) int32 {
		for parent[c] != c {
			parent[c] = parent[parent[c]]
			c = parent[c]
		}
		return c
	}
	var owner cell[T] // the first cell of the current row: cells are sorted by row
	for _, c := range r.cells[r.site] {
		if c.r < crossing || r.like[c.r].of != 0 || r.identityRow(c) {
			continue
		}
		if owner.r == 0 || owner.l != c.l || owner.k != c.k {
			owner = c
			continue
		}
		a, b := find(owner.r), find(c.r)
		parent[max(a, b)] = min(a, b)
	}
	var groups [][]int32
	place := make(map[int32]int)
	for c := crossing; c < len(r.columns); c++ {
		if r.like[c].of != 0 || len(r.columns[c]) == 0 {
			continue
		}
		root := find(int32(c))
		g, ok := place[root]
		if !ok {
			g = len(groups)
			place[root] = g
			groups = append(groups, nil)
		}
		groups[g] = append(groups[g], int32(c))
	}
	return groups
}

// examine returns nil if the columns are independent, else their elimination.
func (r *reducer[T]) examine(columns []int32) *elimination[T] {
	if len(columns) == 1 {
		return nil
	}
	top := far
	for _, c := range columns {
		for _, x := range r.columns[c] {
			top = max(top, exponent(x.v)+r.left[x.l]+r.right[c])
		}
	}
	e := &elimination[T]{columns: make([][]rowValue[T], len(columns))}
	rows := make(map[[2]int32]int32)
	for j, c := range columns {
		for _, x := range r.columns[c] {
			key := [2]int32{x.l, x.k}
			row, ok := rows[key]
			if !ok {
				row = int32(len(rows))
				rows[key] = row
				e.rows = append(e.rows, key)
			}
			e.columns[j] = append(e.columns[j], rowValue[T]{row, ldexp(x.v, r.left[x.l]+r.right[c]-top)})
		}
	}
	if e.independent(r.opt) {
		return nil
	}
	r.dropped += math.Ldexp(e.reduce(r.opt.Tolerance), top)
	return e
}

func (r *reducer[T]) newIndex(like int32, reach int) int32 {
	r.charges = append(r.charges, r.joints[r.site+1].charges[like])
	r.reach = append(r.reach, reach)
	return int32(len(r.charges) - 1)
}

// retain gives independent columns new numbers and leaves their cells, the identity included.
func (r *reducer[T]) retain(columns []int32) {
	for _, c := range columns {
		to := r.newIndex(c, r.right[c])
		r.images[c] = []image[T]{{to, dense.FromFloat[T](1)}}
		r.kept[c] = r.ones[c]
		for _, x := range r.columns[c] {
			r.out = append(r.out, cell[T]{x.l, to, x.k, x.v})
		}
		if r.ones[c] != dense.FromFloat[T](0) {
			r.out = append(r.out, cell[T]{vacant, to, 0, r.ones[c]})
		}
	}
}

// replace puts in place of dependent columns as many as their rank: each has a one in its pivot row, zeros in those of the
// others, and the old columns' entries in the pivot rows are what the new ones carry on to the right.
func (r *reducer[T]) replace(columns []int32, e *elimination[T]) {
	pivot := make(map[[2]int32]int32, len(e.pivots))
	for j, p := range e.pivots {
		to := r.newIndex(columns[0], far)
		pivot[e.rows[p]] = to
		at := r.left[e.rows[p][0]]
		for _, x := range e.result[j] {
			row := e.rows[x.row]
			r.out = append(r.out, cell[T]{row[0], to, row[1], ldexp(x.v, at-r.left[row[0]])})
		}
	}
	for _, c := range columns {
		for _, x := range r.columns[c] {
			if to, ok := pivot[[2]int32{x.l, x.k}]; ok {
				r.images[c] = append(r.images[c], image[T]{to, x.v})
				r.reach[to] = max(r.reach[to], r.right[c]+exponent(x.v))
			}
		}
	}
}

// follow carries the change over to the next site: old rows become sums of new ones and of the vacant one.
func (r *reducer[T]) follow() {
	var next []cell[T]
	for _, x := range r.cells[r.site+1] {
		if x.l < crossing {
			next = append(next, x)
			continue
		}
		c, ratio := x.l, dense.FromFloat[T](1)
		if like := r.like[c]; like.of != 0 {
			c, ratio = like.of, like.ratio
		}
		for _, im := range r.images[c] {
			next = append(next, cell[T]{im.index, x.r, x.k, ratio * im.v * x.v})
		}
		if rest := r.ones[x.l] - ratio*r.kept[c]; dense.Abs(rest) > r.opt.Tolerance*dense.Abs(r.ones[x.l]) {
			next = append(next, cell[T]{vacant, x.r, x.k, rest * x.v})
		}
	}
	r.cells[r.site+1] = gather(next, r.opt.Tolerance) // what cancels here has gone through rounded eliminations
}
