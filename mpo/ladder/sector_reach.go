package ladder

import (
	"fmt"
	"math/bits"
	"slices"
	"sort"
)

// Which totals a ladder can hold. The labels of every site run through an interval (of sites without double occupation: a triangle), so a total is
// base + sum over columns of x*w with 0 <= x <= count, one column for each distinct vector of weights. As long as the box around
// all totals is of moderate size the set is kept as bits, and adding a column is a few shifts of it; beyond, the columns are searched
// in depth, with a budget.

// column is a set of labels with equal weights.
type column struct {
	w     []int64
	count int64
}

// triangle is n pairs of labels of which at most one is raised by one.
type triangle struct {
	a, b []int64
	n    int64
}

// reach answers questions about the totals of a list of charges.
type reach struct {
	charges   []*charge
	base      []int64
	columns   []column
	triangles []triangle
	low, high []int64 // bounds of the totals, moduli not applied

	lattice *lattice // of the weights
	axes    []int    // charges that determine the others: those with a pivot in the lattice
	stride  []int64  // of the bits, per axis
	set     []uint64 // nil: the box is too large
}

// largestBox bounds the bits kept, largestFill the words passed for triangles, searchSteps the steps of a search in depth.
const (
	largestBox  = 1 << 27
	largestFill = 1 << 29
	searchSteps = 4_000_000
)

func newReach(lb *labelling, charges []*charge) *reach {
	r := &reach{charges: charges, base: make([]int64, len(charges))}
	r.collect(lb)
	r.bound()
	r.lattice = newLattice(len(charges))
	for _, w := range r.vectors() {
		row := make([]exact, len(w))
		for k, x := range w {
			row[k] = exactOf(x)
		}
		r.lattice.insert(row)
	}
	volume := int64(1)
	for k := range charges {
		if r.lattice.basis[k] == nil {
			continue
		}
		r.axes, r.stride = append(r.axes, k), append(r.stride, volume)
		if volume *= r.high[k] - r.low[k] + 1; volume > largestBox {
			return r
		}
	}
	slow := int64(0) // triangles are added one by one
	for _, t := range r.triangles {
		slow += t.n
	}
	if slow*(volume/64) <= largestFill {
		r.fill(volume)
	}
	return r
}

// collect gathers the columns, in the order in which the sites show them.
func (r *reach) collect(lb *labelling) {
	at := make(map[string]int)
	pair := make(map[string]int)
	weights := func(v int) []int64 {
		w := make([]int64, len(r.charges))
		for k, c := range r.charges {
			w[k] = int64(c.weight[v])
		}
		return w
	}
	for i := range lb.sites() {
		cl, f := lb.at(i), int(lb.first[i])
		for k, c := range r.charges {
			if c.base != nil {
				r.base[k] += int64(c.base[i])
			}
		}
		if cl.site.Kind() == KindElectron && !cl.site.Double() {
			a, b := weights(f), weights(f+1)
			key := fmt.Sprint(a, b)
			if _, ok := pair[key]; !ok {
				pair[key] = len(r.triangles)
				r.triangles = append(r.triangles, triangle{a: a, b: b})
			}
			r.triangles[pair[key]].n++
			continue
		}
		for a := range cl.species {
			w := weights(f + a)
			count := int64(0)
			for _, s := range cl.steps {
				count = max(count, int64(s[a]), -int64(s[a]))
			}
			if cl.species[a] == spin {
				for k := range w {
					w[k] = -w[k]
				}
			}
			r.addColumn(at, w, count)
		}
	}
}

// addColumn merges columns that are equal up to sign: -x w is count*(-w) + (count-x) w.
func (r *reach) addColumn(at map[string]int, w []int64, count int64) {
	sign := int64(0)
	for _, x := range w {
		if x != 0 {
			sign = x
			break
		}
	}
	if sign == 0 {
		return
	}
	if sign < 0 {
		for k := range w {
			r.base[k] += w[k] * count
			w[k] = -w[k]
		}
	}
	key := fmt.Sprint(w)
	if _, ok := at[key]; !ok {
		at[key] = len(r.columns)
		r.columns = append(r.columns, column{w: w})
	}
	r.columns[at[key]].count += count
}

func (r *reach) vectors() [][]int64 {
	var out [][]int64
	for _, c := range r.columns {
		out = append(out, c.w)
	}
	for _, t := range r.triangles {
		out = append(out, t.a, t.b)
	}
	return out
}

func (r *reach) bound() {
	r.low, r.high = append([]int64(nil), r.base...), append([]int64(nil), r.base...)
	for k := range r.charges {
		for _, c := range r.columns {
			r.low[k] += min(0, c.w[k]*c.count)
			r.high[k] += max(0, c.w[k]*c.count)
		}
		for _, t := range r.triangles {
			r.low[k] += min(0, t.a[k], t.b[k]) * t.n
			r.high[k] += max(0, t.a[k], t.b[k]) * t.n
		}
	}
}

// offset is the distance in bits that a vector moves.
func (r *reach) offset(w []int64) int64 {
	sum := int64(0)
	for i, k := range r.axes {
		sum += w[k] * r.stride[i]
	}
	return sum
}

// fill builds the set of totals.
func (r *reach) fill(volume int64) {
	r.set = make([]uint64, (volume+63)/64)
	start := make([]int64, len(r.charges))
	for k := range start {
		start[k] = r.base[k] - r.low[k]
	}
	at := r.offset(start)
	r.set[at/64] |= 1 << (at % 64)
	scratch := make([]uint64, len(r.set))
	for _, c := range r.columns {
		step := r.offset(c.w)
		for done, next := int64(0), int64(1); done < c.count; next *= 2 {
			next = min(next, c.count-done) // multiples 0..done are in; now 0..done+next
			r.orShifted(scratch, step*next)
			done += next
		}
	}
	for _, t := range r.triangles {
		a, b := r.offset(t.a), r.offset(t.b)
		for range t.n {
			copy(scratch, r.set)
			orShift(r.set, scratch, a)
			orShift(r.set, scratch, b)
		}
	}
}

func (r *reach) orShifted(scratch []uint64, by int64) {
	copy(scratch, r.set)
	orShift(r.set, scratch, by)
}

// orShift sets dst |= src moved by bits upwards (downwards if negative).
func orShift(dst, src []uint64, by int64) {
	if by < 0 {
		words, rest := int(-by/64), uint(-by%64)
		for i := range len(dst) - words {
			x := src[i+words] >> rest
			if rest != 0 && i+words+1 < len(src) {
				x |= src[i+words+1] << (64 - rest)
			}
			dst[i] |= x
		}
		return
	}
	words, rest := int(by/64), uint(by%64)
	for i := len(dst) - 1; i >= words; i-- {
		x := src[i-words] << rest
		if rest != 0 && i-words-1 >= 0 {
			x |= src[i-words-1] >> (64 - rest)
		}
		dst[i] |= x
	}
}

// reduce applies the moduli.
func (r *reach) reduce(p []int64) {
	for k, c := range r.charges {
		if q := int64(c.modulus); q != 0 {
			p[k] = (p[k]%q + q) % q
		}
	}
}

// visit calls do for the totals with the fixed values (nil: any), perhaps repeatedly, until do returns false. It reports whether the search was
// exhaustive or stopped by do.
func (r *reach) visit(fixed []*int64, do func(p []int64) bool) bool {
	matches := func(p []int64) bool {
		for k, v := range fixed {
			if v != nil && *v != p[k] {
				return false
			}
		}
		return true
	}
	if r.set == nil {
		return r.search(fixed, func(p []int64) bool { return !matches(p) || do(p) })
	}
	p := make([]int64, len(r.charges))
	for i, w := range r.set {
		for ; w != 0; w &= w - 1 {
			r.point(int64(i)*64+int64(bits.TrailingZeros64(w)), p)
			r.reduce(p)
			if matches(p) && !do(p) {
				return true
			}
		}
	}
	return true
}

// point writes the total at a bit.
func (r *reach) point(at int64, p []int64) {
	clear(p)
	for i := len(r.axes) - 1; i >= 0; i-- {
		k := r.axes[i]
		p[k] = at/r.stride[i] + r.low[k] - r.base[k]
		at %= r.stride[i]
	}
	if len(r.axes) < len(p) {
		r.complete(p)
	}
	for k := range p {
		p[k] += r.base[k]
	}
}

// complete finds the charges that follow from those of the axes: it writes p as a sum of the lattice's basis vectors.
func (r *reach) complete(p []int64) {
	want := append([]int64(nil), p...)
	clear(p)
	for _, k := range r.axes {
		b := r.lattice.basis[k]
		t := (want[k] - p[k]) / b[k].small
		for j := range p {
			p[j] += t * b[j].small
		}
	}
}

// search visits totals column by column. Intervals of what the later columns can add prune the fixed charges.
func (r *reach) search(fixed []*int64, do func(p []int64) bool) bool {
	s := &depthSearch{r: r, fixed: fixed, do: do, p: append([]int64(nil), r.base...), steps: searchSteps}
	s.columns = append([]column(nil), r.columns...)
	for _, t := range r.triangles { // the pair as two columns: bounds are checked together in descend
		s.columns = append(s.columns, column{t.a, t.n}, column{t.b, t.n})
	}
	s.paired = len(r.columns)
	n := len(s.columns)
	s.low, s.high = make([][]int64, n+1), make([][]int64, n+1)
	s.low[n], s.high[n] = make([]int64, len(r.charges)), make([]int64, len(r.charges))
	for i := n - 1; i >= 0; i-- {
		s.low[i], s.high[i] = append([]int64(nil), s.low[i+1]...), append([]int64(nil), s.high[i+1]...)
		for k, w := range s.columns[i].w {
			s.low[i][k] += min(0, w*s.columns[i].count)
			s.high[i][k] += max(0, w*s.columns[i].count)
		}
	}
	s.descend(0, 0)
	return s.steps > 0
}

// depthSearch is a search over the numbers of raised labels of each column.
type depthSearch struct {
	r         *reach
	fixed     []*int64
	do        func([]int64) bool
	columns   []column
	paired    int // from here on columns come in pairs of triangles
	p         []int64
	low, high [][]int64 // what columns from i on can add
	steps     int
}

// descend chooses the number of column i, from the middle outwards; before is that of the column before. It returns false to stop.
func (s *depthSearch) descend(i int, before int64) bool {
	if s.steps--; s.steps <= 0 {
		return false
	}
	if i == len(s.columns) {
		p := append([]int64(nil), s.p...)
		s.r.reduce(p)
		return s.do(p)
	}
	c := s.columns[i]
	from, to := int64(0), c.count
	if i >= s.paired && (i-s.paired)%2 == 1 {
		to -= before
	}
	for k, v := range s.fixed {
		if v == nil || s.r.charges[k].modulus != 0 || c.w[k] == 0 {
			continue
		}
		least, most := *v-s.p[k]-s.high[i+1][k], *v-s.p[k]-s.low[i+1][k] // of x w
		if c.w[k] < 0 {
			least, most = -most, -least
		}
		w := max(c.w[k], -c.w[k])
		from, to = max(from, ceilDiv(least, w)), min(to, -ceilDiv(-most, w))
	}
	middle := (from + to) / 2
	for d := int64(0); d <= 2*(to-from)+1; d++ {
		x := middle + (d+1)/2
		if d%2 == 0 {
			x = middle - d/2
		}
		if x < from || x > to {
			continue
		}
		s.move(c.w, x)
		goOn := s.descend(i+1, x)
		s.move(c.w, -x)
		if !goOn {
			return false
		}
	}
	return true
}

func (s *depthSearch) move(w []int64, x int64) {
	for k := range w {
		s.p[k] += w[k] * x
	}
}

func ceilDiv(a, b int64) int64 {
	q := a / b
	if a%b > 0 {
		q++
	}
	return q
}

// holds reports whether a state with these totals exists; when a search ends without an answer, the benefit of the doubt is given.
func (r *reach) holds(point []int64) bool {
	fixed := make([]*int64, len(point))
	for k := range point {
		fixed[k] = &point[k]
	}
	found := false
	sure := r.visit(fixed, func([]int64) bool {
		found = true
		return false
	})
	return found || !sure
}

// nearest returns up to n existing totals closest to point, by the sum of the differences in the user's units.
func (r *reach) nearest(point []int64, n int) [][]int64 {
	var best [][]int64
	consider := func(p []int64) bool {
		before := func(q []int64) bool { return r.closer(point, q, p) }
		if len(best) == n && before(best[n-1]) {
			return true
		}
		at := sort.Search(len(best), func(i int) bool { return !before(best[i]) })
		if at < len(best) && slices.Equal(best[at], p) {
			return true
		}
		best = slices.Insert(best, at, slices.Clone(p))
		best = best[:min(n, len(best))]
		return true
	}
	if r.set != nil {
		r.visit(make([]*int64, len(point)), consider)
	} else {
		r.probe(point, consider)
	}
	return best
}

// closer reports whether a is closer to point than b; of equally close ones the smaller comes first.
func (r *reach) closer(point, a, b []int64) bool {
	x, y := r.distance(point, a), r.distance(point, b)
	if x != y {
		return x < y
	}
	return slices.Compare(a, b) < 0
}

func (r *reach) distance(p, q []int64) int64 {
	sum := int64(0)
	for k, c := range r.charges {
		d := max(p[k]-q[k], q[k]-p[k])
		if m := int64(c.modulus); m != 0 {
			d = min(d, m-d)
		}
		if !c.halves {
			d *= 2
		}
		sum += d
	}
	return sum
}

// probe tries changes of one value at a time.
func (r *reach) probe(point []int64, consider func([]int64) bool) {
	for k := range point {
		for d := int64(1); d <= 4; d++ {
			for _, x := range []int64{-d, d} {
				p := append([]int64(nil), point...)
				p[k] += x
				r.reduce(p)
				fixed := make([]*int64, len(p))
				for i := range p {
					fixed[i] = &p[i]
				}
				r.visit(fixed, func(q []int64) bool {
					consider(q)
					return false
				})
			}
		}
	}
}
