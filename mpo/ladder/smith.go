package ladder

import (
	"fmt"
	"math"
	"slices"
	"sort"
)

// Linear relations between integer variables, or between angles, solved exactly in the integers.
//
// The terms of a Hamiltonian give relations sum_v n_v x_v = 0, one for each way in which they move labels between the sites. The group
// Z^n / <relations> classifies what they leave alone: its elements are the values of all conserved charges together. The same relations with
// a right-hand side, sum_v n_v theta_v = rhs modulo pi, are the condition that a choice of phases makes all coefficients real. Both are
// solved by one elimination: relations with a unit coefficient define a variable by the others (nearly all do in practice, which
// keeps long ladders cheap); what remains is brought to Smith normal form, component by component.

// entry is a coefficient n of variable at.
type entry struct {
	at int32
	n  exact
}

// phase is an angle modulo pi, in (-pi/2, pi/2], with a bound of its rounding error.
type phase struct {
	angle, err float64
}

// angleTolerance is the rounding error granted to one angle and to one operation with it.
const angleTolerance = 1e-13

func phaseOf(angle float64) phase {
	return phase{angle: math.Remainder(angle, math.Pi), err: angleTolerance}
}

// plus returns p + k q.
func (p phase) plus(k exact, q phase) phase {
	if q == (phase{}) || k.isZero() {
		return p
	}
	f := k.float()
	return phase{
		angle: math.Remainder(p.angle+math.Remainder(f*q.angle, math.Pi), math.Pi),
		err:   p.err + math.Abs(f)*q.err,
	}
}

// over returns p / k, one of the k solutions of k x = p.
func (p phase) over(k exact) phase {
	f := k.float()
	return phase{angle: p.angle / f, err: p.err / math.Abs(f)}
}

// vanishes reports whether the angle is zero modulo pi within its error.
func (p phase) vanishes() bool { return math.Abs(math.Remainder(p.angle, math.Pi)) <= p.err }

// relation states sum_v n_v x_v = rhs (modulo pi); terms sorted by variable, no zeros.
type relation struct {
	terms []entry
	rhs   phase
}

// solution describes all solutions of a list of relations. Variable v is
//
//	x_v = shift_v + sum_g image_v,g y_g
//
// with y_g free (modulus 0) or, for angles, a multiple of pi/modulus. For integers the image is the class of the unit vector of v in
// the quotient Z^n / <relations>, a direct sum of Z_modulus (Z where the modulus is 0).
type solution struct {
	moduli []exact
	image  [][]entry
	shift  []phase
	bad    []int // relations that contradict earlier ones; -1 for a contradiction found among several
}

// elimination is the state of the sparse part.
type elimination struct {
	known []*relation // known[v]: x_v = sum terms + rhs; nil: v is free
	uses  []int64     // how many definitions lean on v, roughly
	limit int32       // variables from here on are tags, never defined
	acc   []exact     // scratch, zero between calls
	hit   []int32
}

func newElimination(n, limit int) *elimination {
	return &elimination{known: make([]*relation, n), uses: make([]int64, n), limit: int32(limit), acc: make([]exact, n)}
}

// deferred is a relation without a unit coefficient.
type deferred struct {
	relation
	source int
}

// solveRelations eliminates relations between n variables. Short relations first give the sparsest result.
func solveRelations(n int, relations []relation) *solution {
	e := newElimination(n, n)
	s := &solution{}
	order := make([]int, len(relations))
	for i := range order {
		order[i] = i
	}
	sort.SliceStable(order, func(a, b int) bool { return len(relations[order[a]].terms) < len(relations[order[b]].terms) })
	var rest []deferred
	for _, i := range order {
		rest = e.take(deferred{relations[i], i}, rest, s)
	}
	for again := true; again; {
		waiting := rest
		rest, again = nil, false
		for _, d := range waiting {
			before := len(rest) + len(s.bad)
			rest = e.take(d, rest, s)
			again = again || len(rest)+len(s.bad) == before // it vanished or defined a variable
		}
		again = again && len(rest) > 0
	}
	e.finish(rest, s)
	return s
}

// take substitutes what is known into a relation and uses it: to define a variable, or as a check, or puts it off.
func (e *elimination) take(d deferred, rest []deferred, s *solution) []deferred {
	d.relation = e.substitute(d.relation)
	if len(d.terms) == 0 {
		if !d.rhs.vanishes() {
			s.bad = append(s.bad, d.source)
		}
		return rest
	}
	pivot := -1
	for i, t := range d.terms {
		if t.at < e.limit && t.n.isUnit() && (pivot < 0 || e.uses[t.at] <= e.uses[d.terms[pivot].at]) {
			pivot = i
		}
	}
	if pivot < 0 {
		return append(rest, d)
	}
	p := d.terms[pivot]
	def := &relation{rhs: phase{}.plus(p.n, d.rhs)}
	minus := p.n.neg()
	for i, t := range d.terms {
		if i != pivot {
			def.terms = append(def.terms, entry{t.at, t.n.times(minus)})
			e.uses[t.at] += 1 + e.uses[p.at]
		}
	}
	e.known[p.at] = def
	return rest
}

// substitute returns the relation in terms of free variables: sum terms = rhs.
func (e *elimination) substitute(r relation) relation {
	lean := true
	for _, t := range r.terms {
		if e.known[t.at] != nil {
			lean = false
			e.resolve(t.at)
		}
	}
	if lean {
		return r
	}
	rhs := r.rhs
	for _, t := range r.terms {
		if def := e.known[t.at]; def != nil {
			e.add(def.terms, t.n)
			rhs = rhs.plus(t.n.neg(), def.rhs)
		} else {
			e.addOne(t.at, t.n)
		}
	}
	return relation{terms: e.drain(), rhs: rhs}
}

// resolve rewrites the definition of v in terms of free variables, and shortens the way of all it leans on.
func (e *elimination) resolve(v int32) {
	def := e.known[v]
	lean := true
	for _, t := range def.terms {
		if e.known[t.at] != nil {
			lean = false
			e.resolve(t.at)
		}
	}
	if lean {
		return
	}
	rhs := def.rhs
	for _, t := range def.terms {
		if inner := e.known[t.at]; inner != nil {
			e.add(inner.terms, t.n)
			rhs = rhs.plus(t.n, inner.rhs)
		} else {
			e.addOne(t.at, t.n)
		}
	}
	e.known[v] = &relation{terms: e.drain(), rhs: rhs}
}

func (e *elimination) add(terms []entry, k exact) {
	for _, t := range terms {
		e.addOne(t.at, t.n.times(k))
	}
}

func (e *elimination) addOne(v int32, n exact) {
	if e.acc[v].isZero() {
		e.hit = append(e.hit, v)
	}
	e.acc[v] = e.acc[v].plus(n)
}

// drain returns the accumulated sum, sorted and without zeros, and clears it.
func (e *elimination) drain() []entry {
	slices.Sort(e.hit)
	var out []entry
	for i, v := range e.hit {
		if i > 0 && e.hit[i-1] == v {
			continue // passed through zero on the way
		}
		if !e.acc[v].isZero() {
			out = append(out, entry{v, e.acc[v]})
		}
		e.acc[v] = exact{}
	}
	e.hit = e.hit[:0]
	return out
}

// finish brings the relations without units to Smith normal form and writes down the solution.
func (e *elimination) finish(rest []deferred, s *solution) {
	n := len(e.known)
	s.image, s.shift = make([][]entry, n), make([]phase, n)
	done := make([]bool, n)
	for _, c := range components(n, merge(rest, s)) {
		c.solve(s)
		for _, v := range c.vars {
			done[v] = true
		}
	}
	for v := range n {
		if e.known[v] == nil && !done[v] {
			s.image[v] = []entry{{int32(len(s.moduli)), exactOf(1)}}
			s.moduli = append(s.moduli, exact{})
		}
	}
	out := elimination{acc: make([]exact, len(s.moduli))}
	for v := range n {
		if e.known[v] == nil {
			continue
		}
		e.resolve(int32(v))
		shift := e.known[v].rhs
		for _, t := range e.known[v].terms {
			out.add(s.image[t.at], t.n)
			shift = shift.plus(t.n, s.shift[t.at])
		}
		s.image[v], s.shift[v] = out.drain(), shift
	}
	for v := range s.image {
		s.image[v] = reduced(s.image[v], s.moduli)
	}
}

// reduced brings the entries below the moduli and drops those that vanish.
func reduced(terms []entry, moduli []exact) []entry {
	out := terms[:0:0]
	for _, t := range terms {
		if r := t.n.residue(moduli[t.at]); !r.isZero() {
			out = append(out, entry{t.at, r})
		}
	}
	return out
}

// merge drops repeated relations; repetitions with another right-hand side are contradictions.
func merge(rest []deferred, s *solution) []deferred {
	seen := make(map[string]int)
	var out []deferred
	for _, d := range rest {
		if d.terms[0].n.sign() < 0 {
			flipped := relation{rhs: phase{}.plus(exactOf(-1), d.rhs)}
			for _, t := range d.terms {
				flipped.terms = append(flipped.terms, entry{t.at, t.n.neg()})
			}
			d.relation = flipped
		}
		key := fmt.Sprint(d.terms)
		i, ok := seen[key]
		if !ok {
			seen[key] = len(out)
			out = append(out, d)
			continue
		}
		if !d.rhs.plus(exactOf(-1), out[i].rhs).vanishes() {
			s.bad = append(s.bad, d.source)
		}
	}
	return out
}

// component is a set of relations that share no variable with the others.
type component struct {
	vars []int32
	rows []deferred
}

// components splits relations into independent sets, in the order of their first variables.
func components(n int, rest []deferred) []component {
	root := make([]int32, n)
	for v := range root {
		root[v] = int32(v)
	}
	find := func(v int32) int32 {
		for root[v] != v {
			root[v] = root[root[v]]
			v = root[v]
		}
		return v
	}
	for _, d := range rest {
		for _, t := range d.terms[1:] {
			a, b := find(d.terms[0].at), find(t.at)
			root[max(a, b)] = min(a, b)
		}
	}
	at := make(map[int32]*component)
	for _, d := range rest {
		r := find(d.terms[0].at)
		c := at[r]
		if c == nil {
			c = &component{}
			at[r] = c
		}
		c.rows = append(c.rows, d)
	}
	for v := range root {
		if c := at[find(int32(v))]; c != nil {
			c.vars = append(c.vars, int32(v))
		}
	}
	out := make([]component, 0, len(at))
	for _, c := range at {
		out = append(out, *c)
	}
	sort.Slice(out, func(i, j int) bool { return out[i].vars[0] < out[j].vars[0] })
	return out
}

// solve adds the component's generators to the solution.
func (c component) solve(s *solution) {
	place := make(map[int32]int, len(c.vars))
	for i, v := range c.vars {
		place[v] = i
	}
	m := smithMatrix{cols: len(c.vars), right: make([][]exact, len(c.vars))}
	for i := range m.right {
		m.right[i] = make([]exact, m.cols)
		m.right[i][i] = exactOf(1)
	}
	for _, d := range c.rows {
		row := make([]exact, m.cols)
		for _, t := range d.terms {
			row[place[t.at]] = t.n
		}
		m.rows, m.rhs = append(m.rows, row), append(m.rhs, d.rhs)
	}
	diagonal := m.diagonalize()
	for i := len(diagonal); i < len(m.rows); i++ {
		if !m.rhs[i].vanishes() {
			s.bad = append(s.bad, -1)
		}
	}
	for i := range m.cols {
		y := phase{}
		modulus := exact{}
		if i < len(diagonal) {
			modulus, y = diagonal[i], m.rhs[i].over(diagonal[i])
		}
		generator := int32(-1)
		if !modulus.isUnit() {
			generator = int32(len(s.moduli))
			s.moduli = append(s.moduli, modulus)
		}
		for j, v := range c.vars {
			k := m.right[j][i]
			if k.isZero() {
				continue
			}
			s.shift[v] = s.shift[v].plus(k, y)
			if generator >= 0 {
				s.image[v] = append(s.image[v], entry{generator, k})
			}
		}
	}
}

// smithMatrix is a dense integer matrix on its way to diagonal form U M V; right accumulates V, and U acts on the right-hand sides.
type smithMatrix struct {
	cols  int
	rows  [][]exact
	rhs   []phase
	right [][]exact
}

// diagonalize returns the nonzero diagonal of U M V, positive; V is left in right. The entries need not divide one another.
func (m *smithMatrix) diagonalize() []exact {
	var diagonal []exact
	for t := 0; t < len(m.rows) && t < m.cols; t++ {
		if !m.bringPivot(t) {
			break
		}
		for !m.clear(t) {
			m.bringPivot(t)
		}
		if m.rows[t][t].sign() < 0 {
			m.rows[t][t] = m.rows[t][t].neg()
			m.rhs[t] = phase{}.plus(exactOf(-1), m.rhs[t])
		}
		diagonal = append(diagonal, m.rows[t][t])
	}
	return diagonal
}

// bringPivot moves the smallest nonzero entry of the block from (t, t) on to (t, t).
func (m *smithMatrix) bringPivot(t int) bool {
	r, c := -1, -1
	for i := t; i < len(m.rows); i++ {
		for j := t; j < m.cols; j++ {
			x := m.rows[i][j]
			if !x.isZero() && (r < 0 || x.cmpAbs(m.rows[r][c]) < 0) {
				r, c = i, j
			}
		}
	}
	if r < 0 {
		return false
	}
	m.rows[t], m.rows[r] = m.rows[r], m.rows[t]
	m.rhs[t], m.rhs[r] = m.rhs[r], m.rhs[t]
	for _, row := range m.rows {
		row[t], row[c] = row[c], row[t]
	}
	for _, row := range m.right {
		row[t], row[c] = row[c], row[t]
	}
	return true
}

// clear reduces row t and column t by the pivot, and reports whether nothing but the pivot is left.
func (m *smithMatrix) clear(t int) bool {
	clean := true
	p := m.rows[t][t]
	for i := t + 1; i < len(m.rows); i++ {
		if m.rows[i][t].isZero() {
			continue
		}
		q := m.rows[i][t].nearest(p).neg()
		for j := t; j < m.cols; j++ {
			m.rows[i][j] = m.rows[i][j].plus(m.rows[t][j].times(q))
		}
		m.rhs[i] = m.rhs[i].plus(q, m.rhs[t])
		clean = clean && m.rows[i][t].isZero()
	}
	for j := t + 1; j < m.cols; j++ {
		if m.rows[t][j].isZero() {
			continue
		}
		q := m.rows[t][j].nearest(p).neg()
		for _, row := range m.rows[t:] {
			row[j] = row[j].plus(row[t].times(q))
		}
		for _, row := range m.right {
			row[j] = row[j].plus(row[t].times(q))
		}
		clean = clean && m.rows[t][j].isZero()
	}
	return clean
}
