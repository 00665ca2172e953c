package ladder

import (
	"fmt"
	"math"
	"slices"

	"rundle/mps/block"
)

// Merged is a Hamiltonian made real by taking pairs of neighbouring sites as one, for bosons and spins, whose cut at an occupation of each
// leg forbids other modes (Modes). If the exchange of the legs times complex conjugation leaves the Hamiltonian alone, the states
//
//	|s s>,   (|s t> + |t s>)/sqrt2,   i (|s t> - |t s>)/sqrt2     s < t
//
// are their own images, and it is real between them. The user's sites may first need phases, as in Modes.
type Merged struct {
	Strings *Strings // real; a site of them is a pair of the ladder's sites or one that is left
	First   []int    // first of the ladder's sites in each

	ladder *Ladder
	turned *Frames // the user's frames with the phases that show the symmetry
}

// Merged looks for an exchange of neighbouring legs that makes the Hamiltonian real on merged sites; nil if there is none. The
// frames are complex ones of the Hamiltonian, and their charges are those of the result.
func (h *Hamiltonian) Merged(f *Frames) *Merged {
	l := h.Ladder()
	if h.Poly.NumTerms() > maxModeTerms || slices.ContainsFunc(f.Sites, func(s block.Frame) bool { return s.Rotation != 0 || s.Angles != nil }) {
		return nil
	}
	lb := newLabelling(l)
	for _, pairs := range exchanges(l, bosonOrSpin) {
		if slices.ContainsFunc(pairs, func(a int) bool { return !sameStates(&f.Sites[a], &f.Sites[a+1]) }) {
			continue // the charges tell the legs apart
		}
		x := exchange{lb: lb, partner: partners(l.Sites(), pairs)}
		angles, ok := x.symmetricGauge(h.Poly)
		if !ok {
			continue
		}
		m := &Merged{ladder: l, turned: f.turnedBy(lb, angles)}
		s, err := m.turned.Strings(h.Poly)
		if err != nil || slices.ContainsFunc(s.Tables, func(t *OpTable) bool { return t.Filler != 0 }) {
			return nil // fermions on another leg
		}
		if m.merge(s, pairs) {
			return m
		}
	}
	return nil
}

func bosonOrSpin(s Site) bool { return s.Kind() == KindBoson || s.Kind() == KindSpin }

func sameStates(a, b *block.Frame) bool {
	return slices.Equal(a.Order, b.Order) && slices.Equal(a.Charges, b.Charges)
}

// turnedBy returns complex frames with phases.
func (f *Frames) turnedBy(lb *labelling, angles []float64) *Frames {
	g := *f
	g.Sites = slices.Clone(f.Sites)
	for i := range g.Sites {
		g.Sites[i].Angles = angles[lb.first[i]:lb.first[i+1]]
	}
	return &g
}

// merge rewrites strings on the merged sites, and reports whether they are real.
func (m *Merged) merge(s *Strings, pairs []int) bool {
	w := mergeWriter{old: s, tables: make(map[[2]*OpTable]*mergedTable), index: make(map[string]int)}
	place := make([]int, len(s.Axes)) // merged site of each site
	for i := 0; i < len(s.Axes); i++ {
		two := len(pairs) > 0 && pairs[0] == i
		w.addSite(i, two)
		m.First = append(m.First, i)
		place[i] = len(m.First) - 1
		if two {
			pairs = pairs[1:]
			i++
			place[i] = place[i-1]
		}
	}
	for t := range s.Coef {
		w.term(s.Coef[t], s.Factors[s.Start[t]:s.Start[t+1]], place, m.First)
	}
	m.Strings = w.finish()
	return m.Strings != nil
}

// Split returns the matrix that takes merged site k to the user's, in the frames that Merged was given: rows count the stored states of the
// one site or the two, first site slower, columns the stored states of the merged one.
func (m *Merged) Split(k int, f *Frames) []complex128 {
	first := m.First[k]
	last := m.ladder.Sites()
	if k+1 < len(m.First) {
		last = m.First[k+1]
	}
	if last-first == 1 {
		return product(f.Unitary(m.ladder, first), adjoint(m.turned.Unitary(m.ladder, first)))
	}
	user := kronecker(f.Unitary(m.ladder, first), f.Unitary(m.ladder, first+1))
	turned := kronecker(m.turned.Unitary(m.ladder, first), m.turned.Unitary(m.ladder, first+1))
	p := newPairBasis(f.Group, m.turned.Sites[first].Axis())
	return product(user, product(adjoint(turned), adjoint(p.matrix)))
}

// pairBasis is the basis of a merged site.
type pairBasis struct {
	axis   block.Axis
	states []pairState
	matrix []complex128 // <merged|pair>, rows in the order of axis, columns first*d + second
}

// pairState is |s s> (sign 0), or the even (+1) or odd (-1) combination of |s t> and |t s>, s < t.
type pairState struct {
	s, t, sign int
	charge     block.Charge
}

func newPairBasis(g block.Group, site block.Axis) *pairBasis {
	q := site.Charges()
	p := &pairBasis{}
	for s := range q {
		p.states = append(p.states, pairState{s, s, 0, g.Add(q[s], q[s])})
		for t := s + 1; t < len(q); t++ {
			c := g.Add(q[s], q[t])
			p.states = append(p.states, pairState{s, t, +1, c}, pairState{s, t, -1, c})
		}
	}
	slices.SortStableFunc(p.states, func(a, b pairState) int { return a.charge.Compare(b.charge) })
	d := len(q)
	n := d * d
	p.matrix = make([]complex128, n*n)
	var sectors []block.Sector
	for i, x := range p.states {
		st, ts := x.s*d+x.t, x.t*d+x.s
		switch half := complex(math.Sqrt2/2, 0); x.sign {
		case 0:
			p.matrix[i*n+st] = 1
		case 1:
			p.matrix[i*n+st], p.matrix[i*n+ts] = half, half
		case -1: // the bra of i (|st> - |ts>)/sqrt2
			p.matrix[i*n+st], p.matrix[i*n+ts] = -half*1i, half*1i
		}
		if k := len(sectors) - 1; k >= 0 && sectors[k].Charge == x.charge {
			sectors[k].Dim++
		} else {
			sectors = append(sectors, block.Sector{Charge: x.charge, Dim: 1})
		}
	}
	p.axis = block.NewAxis(block.In, sectors...)
	return p
}

// mergeWriter writes strings on merged sites.
type mergeWriter struct {
	old    *Strings
	sites  []*mergedTable
	tables map[[2]*OpTable]*mergedTable
	index  map[string]int // of a product of factors among the terms
	coef   []complex128
	size   []float64 // sum of |coefficient|, to tell what has cancelled
	terms  [][]StringFactor
}

// mergedTable holds the operators of one kind of merged site.
type mergedTable struct {
	OpTable
	axis  block.Axis
	parts map[[2]int32][]weightedOp // by the operators on both sites
	pair  *pairBasis                // nil: a site that is left alone
	old   [2]*OpTable
	group block.Group
}

func (w *mergeWriter) addSite(i int, two bool) {
	s := w.old
	key := [2]*OpTable{s.Tables[i]}
	if two {
		key[1] = s.Tables[i+1]
	}
	t := w.tables[key]
	if t == nil {
		t = &mergedTable{axis: s.Axes[i], parts: make(map[[2]int32][]weightedOp), old: key, group: s.Group}
		if two {
			t.pair = newPairBasis(s.Group, s.Axes[i])
			t.axis = t.pair.axis
		}
		d := t.axis.Dim()
		one := make([]complex128, d*d)
		for i := range d {
			one[i*d+i] = 1
		}
		t.parts[[2]int32{}] = []weightedOp{t.place(one, block.Charge{})}
		w.tables[key] = t
	}
	w.sites = append(w.sites, t)
}

// of returns the real operators whose sum, with coefficients 1 and i, a product of operators on the site or the two is.
func (t *mergedTable) of(ops [2]int32) []weightedOp {
	if parts, ok := t.parts[ops]; ok {
		return parts
	}
	m, charge := t.old[0].Matrices[ops[0]], t.old[0].Charges[ops[0]]
	if t.pair != nil {
		m = product(t.pair.matrix, product(kronecker(m, t.old[1].Matrices[ops[1]]), adjoint(t.pair.matrix)))
		charge = t.group.Add(charge, t.old[1].Charges[ops[1]])
	}
	var parts []weightedOp
	re, im := separate(m)
	for k, part := range [2][]complex128{re, im} {
		if part != nil {
			p := t.place(part, charge)
			p.coef *= [2]complex128{1, 1i}[k]
			parts = append(parts, p)
		}
	}
	t.parts[ops] = parts
	return parts
}

// place files a real matrix, up to its sign once.
func (t *mergedTable) place(m []complex128, charge block.Charge) weightedOp {
	for i, old := range t.Matrices {
		if t.Charges[i] == charge {
			if s := proportion(old, m); s != 0 {
				return weightedOp{int32(i), complex(s, 0)}
			}
		}
	}
	t.Matrices, t.Charges, t.Odd = append(t.Matrices, m), append(t.Charges, charge), append(t.Odd, false)
	return weightedOp{int32(len(t.Matrices) - 1), 1}
}

// term adds a string, written out in real operators.
func (w *mergeWriter) term(c complex128, factors []StringFactor, place, first []int) {
	type way struct {
		coef complex128
		list []StringFactor
	}
	ways := []way{{coef: c}}
	for i := 0; i < len(factors); i++ {
		k := place[factors[i].Site]
		var ops [2]int32
		ops[int(factors[i].Site)-first[k]] = factors[i].Op
		if i+1 < len(factors) && place[factors[i+1].Site] == k {
			i++
			ops[1] = factors[i].Op
		}
		var next []way
		for _, p := range w.sites[k].of(ops) {
			for _, x := range ways {
				y := way{x.coef * p.coef, x.list[:len(x.list):len(x.list)]}
				if p.op != 0 {
					y.list = append(y.list, StringFactor{int32(k), p.op})
				}
				next = append(next, y)
			}
		}
		ways = next
	}
	for _, x := range ways {
		key := fmt.Sprint(x.list)
		i, ok := w.index[key]
		if !ok {
			i = len(w.terms)
			w.index[key] = i
			w.terms, w.coef, w.size = append(w.terms, x.list), append(w.coef, 0), append(w.size, 0)
		}
		w.coef[i] += x.coef
		w.size[i] += math.Hypot(real(x.coef), imag(x.coef))
	}
}

// finish returns the strings, nil if they are not real.
func (w *mergeWriter) finish() *Strings {
	out := &Strings{Group: w.old.Group, Charge: w.old.Charge, Start: []int32{0}, Real: true}
	for _, t := range w.sites {
		out.Axes, out.Tables = append(out.Axes, t.axis), append(out.Tables, &t.OpTable)
	}
	for i, c := range w.coef {
		tiny := modeRounding * w.size[i]
		if math.Abs(imag(c)) > tiny {
			return nil
		}
		if math.Abs(real(c)) > tiny {
			out.Coef = append(out.Coef, complex(real(c), 0))
			out.Factors = append(out.Factors, w.terms[i]...)
			out.Start = append(out.Start, int32(len(out.Factors)))
		}
	}
	return out
}
