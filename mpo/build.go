package mpo

import (
	"fmt"
	"math"

	"rundle/internal/dense"
	"rundle/mpo/ladder"
	"rundle/mps/block"
)

// Options of Build. The zero value is the good default.
type Options struct {
	// Tolerance below which a combination of crossing strings counts as dependent, relative to the largest coupling among
	// those it hangs together with. 0: 1e-13.
	Tolerance float64
	// Work bounds the operations of a single rank decision. Strings that hang together in a larger set are kept as the
	// vertex cover has them, at most as many as the operator rank if their couplings are not tuned. 0: 2e11, some 4000 strings.
	Work float64
	// Raw leaves out the compression: the bonds are those of the vertex covers.
	Raw bool
}

func (o Options) settle() Options {
	if o.Tolerance == 0 {
		o.Tolerance = 1e-13
	}
	if o.Work == 0 {
		o.Work = 2e11
	}
	return o
}

// Build returns the sum of strings s as an operator of the smallest bonds. It returns an error if a coupling is not finite,
// if the terms change the charge in different ways, or if s is complex and T is not; a malformed s panics.
func Build[T dense.Scalar](s *ladder.Strings, opt Options) (*Operator[T], error) {
	opt = opt.settle()
	if len(s.Axes) == 0 {
		return nil, fmt.Errorf("operator on no sites; a ladder has at least one")
	}
	if !s.Real && !dense.IsComplex[T]() {
		return nil, fmt.Errorf("operator with complex matrix elements asked for in real arithmetic; use complex128")
	}
	m, err := assemble[T](s)
	if err != nil {
		return nil, err
	}
	if !m.trim() {
		m.clear()
		return m.operator(), nil
	}
	if !opt.Raw {
		m.compress(opt)
	}
	return m.operator(), nil
}

// assembly walks the cuts from left to right. At each cut it holds the crossing terms as edges between the indices of the
// bond and the suffixes that are to follow.
type assembly[T dense.Scalar] struct {
	*automaton[T]
	s       *ladder.Strings
	strings *suffixes
	written [][][]part[T] // per site and operator of the table: its expansion in the site's basis

	starts  [][]started[T] // terms by the site at which they leave the vacant index
	live    []edge[T]      // crossing terms left of the current site, by index
	cover   coverer
	nodes   map[node]int32 // left strings that end in a factor at this site
	passing [2][]int32     // left strings that pass, by parity and index
	lefts   []node
	rightOf []int32 // suffix to right vertex of the current cut, or none
	rights  []int32
}

type started[T dense.Scalar] struct {
	suffix int32
	v      T
}

// edge is a crossing term: v times the string of index left, to be followed by a suffix.
type edge[T dense.Scalar] struct {
	left, suffix int32
	v            T
}

// node is a left string at a cut: an index of the bond before and the operator of the table at the site. The parity of what
// follows sets strings apart whose Jordan-Wigner fillers differ.
type node struct {
	left, op int32
	odd      bool
}

func assemble[T dense.Scalar](s *ladder.Strings) (*automaton[T], error) {
	a := &assembly[T]{automaton: newAutomaton[T](s.Group, append([]block.Axis(nil), s.Axes...), s.Charge), s: s,
		strings: newSuffixes(s), nodes: make(map[node]int32)}
	a.expandTables()
	if err := a.sortTerms(); err != nil {
		return nil, err
	}
	a.rightOf = make([]int32, len(a.strings.site))
	fill(a.rightOf, none)
	for i := range s.Axes {
		a.step(i)
	}
	return a.automaton, nil
}

// expandTables finds the basis of each site, once for like sites.
func (a *assembly[T]) expandTables() {
	type found struct {
		basis   *basis[T]
		written [][]part[T]
	}
	known := make(map[*ladder.OpTable]found)
	a.written = make([][][]part[T], len(a.s.Tables))
	for i, t := range a.s.Tables {
		f, ok := known[t]
		if !ok {
			f.basis, f.written = independent[T](t, a.s.Axes[i].Dim())
			known[t] = f
		}
		a.bases[i], a.written[i] = f.basis, f.written
	}
}

// sortTerms interns the terms, files them by the site where they begin and marks the bonds that vacant and done strings pass.
func (a *assembly[T]) sortTerms() error {
	n := len(a.s.Axes)
	a.starts = make([][]started[T], n)
	constant, lastStart, firstEnd := dense.FromFloat[T](0), 0, n-1
	for t, coef := range a.s.Coef {
		if err := a.checkTerm(t); err != nil {
			return err
		}
		v := dense.FromComplex[T](coef)
		id := a.strings.term(a.s, t)
		if id == 0 {
			constant += v
			continue
		}
		start, end := int(a.strings.site[id]), int(a.s.Factors[a.s.Start[t+1]-1].Site)
		if a.strings.odd[id] {
			start = 0 // its filler reaches from the left end
		}
		a.starts[start] = append(a.starts[start], started[T]{id, v})
		lastStart, firstEnd = max(lastStart, start), min(firstEnd, end)
	}
	if constant != dense.FromFloat[T](0) {
		// Where the last term begins a vacant string is at hand, and a done one behind it more often than not.
		firstEnd = min(firstEnd, lastStart)
		a.cells[lastStart] = append(a.cells[lastStart], cell[T]{vacant, done, 0, constant})
	}
	one := dense.FromFloat[T](1)
	for b := 1; b < n; b++ {
		a.joints[b].vacant, a.joints[b].done = b <= lastStart, b > firstEnd
		if b <= lastStart {
			a.cells[b-1] = append(a.cells[b-1], cell[T]{vacant, vacant, 0, one})
		}
		if b > firstEnd {
			a.cells[b] = append(a.cells[b], cell[T]{done, done, 0, one})
		}
	}
	return nil
}

// checkTerm returns an error for a coupling or a charge that does not fit; wrong factors are a programmer's error.
func (a *assembly[T]) checkTerm(t int) error {
	c := a.s.Coef[t]
	if math.IsNaN(real(c)) || math.IsInf(real(c), 0) || math.IsNaN(imag(c)) || math.IsInf(imag(c), 0) {
		return fmt.Errorf("term %d of %d has the coupling %v; expected a finite number", t, len(a.s.Coef), c)
	}
	if imag(c) != 0 && !dense.IsComplex[T]() {
		return fmt.Errorf("term %d of %d has the complex coupling %v in real arithmetic; use complex128", t, len(a.s.Coef), c)
	}
	var q block.Charge
	last := int32(-1)
	for _, f := range a.s.Factors[a.s.Start[t]:a.s.Start[t+1]] {
		if f.Site <= last || int(f.Site) >= len(a.s.Axes) || f.Op < 0 || int(f.Op) >= len(a.s.Tables[f.Site].Matrices) {
			panic(fmt.Sprintf("mpo: term %d has the factor %+v after site %d, on %d sites", t, f, last, len(a.s.Axes)))
		}
		last = f.Site
		q = a.s.Group.Add(q, a.s.Tables[f.Site].Charges[f.Op])
	}
	if q != a.s.Charge {
		return fmt.Errorf("term %d of %d changes the charge by %v, the sum by %v; split it by charge", t, len(a.s.Coef), q, a.s.Charge)
	}
	return nil
}

// step takes the crossing terms over site i and chooses the indices of the bond behind it.
func (a *assembly[T]) step(i int) {
	clear(a.nodes)
	a.lefts, a.rights = a.lefts[:0], a.rights[:0]
	for p := range a.passing {
		a.passing[p] = grow(a.passing[p], len(a.joints[i].charges))
		fill(a.passing[p], none)
	}
	edges := a.edges(i)
	a.choose(i, edges)
	for _, r := range a.rights {
		a.rightOf[r] = none
	}
}

// pair is an edge of the cut's graph between a left string and a right one (a vertex number, not a suffix).
type pair[T dense.Scalar] struct {
	u, v int32
	c    T
}

// edges lists the cut behind site i; what ends at the site goes to the done index.
func (a *assembly[T]) edges(i int) []pair[T] {
	edges := make([]pair[T], 0, len(a.live)+len(a.starts[i]))
	add := func(left, suffix int32, v T) {
		op, next := int32(0), suffix
		if int(a.strings.site[suffix]) == i {
			op, next = a.strings.op[suffix], a.strings.next[suffix]
		} else if a.strings.odd[suffix] {
			op = a.s.Tables[i].Filler
		}
		if next == 0 {
			a.emit(i, left, done, op, v)
			return
		}
		edges = append(edges, pair[T]{a.leftVertex(left, op, a.strings.odd[next], next == suffix), a.rightVertex(next), v})
	}
	for _, e := range a.live {
		add(e.left, e.suffix, e.v)
	}
	for _, t := range a.starts[i] {
		add(vacant, t.suffix, t.v)
	}
	return edges
}

// emit appends the cells of v times an operator of the table.
func (a *assembly[T]) emit(i int, l, r, op int32, v T) {
	for _, p := range a.written[i][op] {
		a.cells[i] = append(a.cells[i], cell[T]{l, r, p.k, v * p.v})
	}
}

func (a *assembly[T]) leftVertex(left, op int32, odd, passes bool) int32 {
	var at *int32
	if passes {
		at = &a.passing[0][left]
		if odd {
			at = &a.passing[1][left]
		}
		if *at != none {
			return *at
		}
	}
	n := node{left, op, odd}
	id, ok := a.nodes[n]
	if !ok {
		id = int32(len(a.lefts))
		a.nodes[n] = id
		a.lefts = append(a.lefts, n)
	}
	if passes {
		*at = id
	}
	return id
}

func (a *assembly[T]) rightVertex(suffix int32) int32 {
	if a.rightOf[suffix] == none {
		a.rightOf[suffix] = int32(len(a.rights))
		a.rights = append(a.rights, suffix)
	}
	return a.rightOf[suffix]
}

// choose covers the cut: a left string in the cover becomes an index and keeps its terms' couplings for later; a right
// string in the cover becomes an index that sums what leads to it from left strings outside the cover.
func (a *assembly[T]) choose(i int, edges []pair[T]) {
	g, edges := a.rows(edges)
	inLeft, inRight := a.cover.cover(g)
	j := &a.joints[i+1]
	leftIndex, rightIndex := make([]int32, len(a.lefts)), make([]int32, len(a.rights))
	for u, n := range a.lefts {
		if inLeft[u] {
			leftIndex[u] = int32(len(j.charges))
			q := a.s.Group.Add(a.joints[i].charges[n.left], a.s.Tables[i].Charges[n.op])
			j.charges = append(j.charges, q)
			a.emit(i, n.left, leftIndex[u], n.op, dense.FromFloat[T](1))
		}
	}
	fill(rightIndex, none)
	a.live = a.live[:0]
	for _, e := range edges {
		if inLeft[e.u] {
			a.live = append(a.live, edge[T]{leftIndex[e.u], a.rights[e.v], e.c})
			continue
		}
		if !inRight[e.v] {
			panic("mpo: an edge outside the vertex cover")
		}
		n := a.lefts[e.u]
		if rightIndex[e.v] == none {
			rightIndex[e.v] = int32(len(j.charges))
			q := a.s.Group.Add(a.joints[i].charges[n.left], a.s.Tables[i].Charges[n.op])
			j.charges = append(j.charges, q)
			a.live = append(a.live, edge[T]{rightIndex[e.v], a.rights[e.v], dense.FromFloat[T](1)})
		}
		a.emit(i, n.left, rightIndex[e.v], n.op, e.c)
	}
}

// rows sorts the edges by left vertex, adds up parallel ones and returns them with their graph.
func (a *assembly[T]) rows(edges []pair[T]) (*graph, []pair[T]) {
	g := &graph{right: len(a.rights), start: make([]int32, len(a.lefts)+1), adj: make([]int32, 0, len(edges))}
	at := make([]int32, len(a.lefts)+1)
	for _, e := range edges {
		at[e.u+1]++
	}
	for u := range a.lefts {
		at[u+1] += at[u]
	}
	sorted := make([]pair[T], len(edges))
	for _, e := range edges {
		sorted[at[e.u]] = e
		at[e.u]++
	}
	seen := make([]int32, len(a.rights)) // place + 1 of the edge of the current row
	out := sorted[:0]
	for from := 0; from < len(sorted); {
		u, first := sorted[from].u, len(out)
		for ; from < len(sorted) && sorted[from].u == u; from++ {
			e := sorted[from]
			if p := int(seen[e.v]) - 1; p >= first && p < len(out) && out[p].v == e.v {
				out[p].c += e.c
				continue
			}
			seen[e.v] = int32(len(out) + 1)
			out = append(out, e)
		}
		kept := out[:first]
		for _, e := range out[first:] {
			if e.c != dense.FromFloat[T](0) {
				kept = append(kept, e)
				g.adj = append(g.adj, e.v)
			}
		}
		out = kept
		g.start[u+1] = int32(len(g.adj))
	}
	return g, out
}
