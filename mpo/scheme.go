package mpo

import (
	"fmt"

	"rundle/internal/dense"
)

// scheme says how the entries of a window act on a tensor t between two environments L and R, in as few matrix products as they allow.
// Where the environments of "nothing placed yet" on the left and of "all placed" on the right are the identity, entries between
//
//	vacant and done    are local: scaled copies of t, or part of a mixture below;
//	any a and done     end terms of the left: sum_a v L[a], mixed beforehand into one matrix for a pair of states, times t;
//	vacant and any w   begin terms of the right: t times a mixture sum_w v R[w];
//	others             go through: x = L[a] t, then y as a sum of such x, then y R[w].
//
// An end may instead be a scaled copy of x = L[a] t, which serves all outgoing states; a beginning may add to a y. A smallest vertex cover decides:
// entries are edges between their mixture and their x or y.
type scheme[T dense.Scalar] struct {
	lefts, rights []mixture[T]
	ends, begins  []use[T]
	local         []local[T]
	xs            []corner   // x = L[at] t[state]
	finish        []local[T] // what x adds to the result: in is a number of xs
	ys            []corner   // y[state], multiplied by R[at]
	feeds         []feed[T]
}

// mixture is a sum of the matrices that an environment has at some indices of one sector, and unit times the identity.
type mixture[T dense.Scalar] struct {
	sector int
	terms  []mixTerm[T]
	unit   T
}

type mixTerm[T dense.Scalar] struct {
	inner int
	value T
}

// use applies factor times a mixture between two states.
type use[T dense.Scalar] struct {
	mixture int
	out, in place
	factor  T
}

// local is a scaled copy between two states.
type local[T dense.Scalar] struct {
	out, in place
	value   T
}

// corner is an index of an MPO bond with a state: incoming on the left, outgoing on the right.
type corner struct{ at, state place }

// feed adds value times an x, or where x is -1 times t at the state in, to a y.
type feed[T dense.Scalar] struct {
	y, x  int
	in    place
	value T
}

// fullEntry is an entry with its four indices as places.
type fullEntry[T dense.Scalar] struct {
	left, right, out, in place
	value                T
}

// nowhere is the place of an index that is not there.
var nowhere = place{-1, -1}

// newScheme sorts the entries of a window. vacant and done are nowhere unless the environments there are the identity.
func newScheme[T dense.Scalar](w *window[T], vacant, done place) *scheme[T] {
	s := &scheme[T]{}
	var ends, begins, locals []fullEntry[T]
	x, y := make(map[corner]int), make(map[corner]int)
	for _, k := range w.links {
		for _, e := range w.local[k.from:k.to] {
			f := fullEntry[T]{place{k.left, e.left}, place{k.right, e.right}, place{k.out, e.out}, place{k.in, e.in}, e.value}
			switch begin, end := f.left == vacant, f.right == done; {
			case begin && end:
				locals = append(locals, f)
			case end:
				ends = append(ends, f)
			case begin:
				begins = append(begins, f)
			default:
				i := numbered(x, &s.xs, corner{f.left, f.in})
				s.feeds = append(s.feeds, feed[T]{numbered(y, &s.ys, corner{f.right, f.out}), i, f.in, f.value})
			}
		}
	}
	mixed := covered(ends, x, fromLeft[T])
	lefts := newMixer[T]()
	for i, f := range ends {
		if mixed[i] {
			lefts.add(f.out, f.in, f.left, f.value)
			continue
		}
		n := numbered(x, &s.xs, corner{f.left, f.in})
		s.finish = append(s.finish, local[T]{f.out, place{n, 0}, f.value})
	}
	mixed = covered(begins, y, fromRight[T])
	rights := newMixer[T]()
	for i, f := range begins {
		if mixed[i] {
			rights.add(f.out, f.in, f.right, f.value)
			continue
		}
		s.feeds = append(s.feeds, feed[T]{numbered(y, &s.ys, corner{f.right, f.out}), -1, f.in, f.value})
	}
	s.settle(w, lefts, rights, locals)
	return s
}

func fromLeft[T dense.Scalar](f *fullEntry[T]) (n corner, far place) {
	return corner{f.left, f.in}, f.right
}
func fromRight[T dense.Scalar](f *fullEntry[T]) (n corner, far place) {
	return corner{f.right, f.out}, f.left
}

// numbered returns the place of a corner in a list, and appends it if it is new.
func numbered(known map[corner]int, list *[]corner, n corner) int {
	i, ok := known[n]
	if !ok {
		i = len(*list)
		known[n] = i
		*list = append(*list, n)
	}
	return i
}

// covered tells for each entry whether it goes into the mixture of its states and its far index; otherwise its corner, as at gives both, must be
// there. Nodes that are known already serve for nothing.
func covered[T dense.Scalar](entries []fullEntry[T], known map[corner]int, at func(*fullEntry[T]) (n corner, far place)) []bool {
	pairs, nodes := make(map[[3]place]int), make(map[corner]int)
	var adjacent [][]int32
	edges := make([][2]int, len(entries))
	for i := range entries {
		f := &entries[i]
		n, far := at(f)
		if _, ok := known[n]; ok {
			edges[i] = [2]int{-1, -1}
			continue
		}
		p := [3]place{f.out, f.in, far}
		if _, ok := pairs[p]; !ok {
			pairs[p] = len(adjacent)
			adjacent = append(adjacent, nil)
		}
		if _, ok := nodes[n]; !ok {
			nodes[n] = len(nodes)
		}
		edges[i] = [2]int{pairs[p], nodes[n]}
		adjacent[pairs[p]] = append(adjacent[pairs[p]], int32(nodes[n]))
	}
	g := graph{right: len(nodes), start: []int32{0}}
	for _, list := range adjacent {
		g.adj = append(g.adj, list...)
		g.start = append(g.start, int32(len(g.adj)))
	}
	var c coverer
	inMixture, _ := c.cover(&g)
	mixed := make([]bool, len(entries))
	for i, e := range edges {
		mixed[i] = e[0] >= 0 && inMixture[e[0]]
	}
	return mixed
}

// mixer collects the mixtures of one side by their states.
type mixer[T dense.Scalar] struct {
	known map[[2]place]int
	uses  []use[T]
	mixes []mixture[T] // one a use
}

func newMixer[T dense.Scalar]() *mixer[T] { return &mixer[T]{known: make(map[[2]place]int)} }

func (m *mixer[T]) add(out, in, at place, value T) {
	i, ok := m.known[[2]place{out, in}]
	if !ok {
		i = len(m.uses)
		m.known[[2]place{out, in}] = i
		m.uses = append(m.uses, use[T]{out: out, in: in})
		m.mixes = append(m.mixes, mixture[T]{sector: at.sector})
	}
	m.mixes[i].terms = append(m.mixes[i].terms, mixTerm[T]{at.inner, value})
}

// distinct lists the mixtures that are not multiples of one another, and what takes each use to its own.
func (m *mixer[T]) distinct() ([]mixture[T], []use[T]) {
	var list []mixture[T]
	known := make(map[string]int)
	uses := append([]use[T](nil), m.uses...)
	for i, x := range m.mixes {
		y, factor := x.normalized()
		key := fmt.Sprint(y)
		n, ok := known[key]
		if !ok {
			n = len(list)
			known[key] = n
			list = append(list, y)
		}
		uses[i].mixture, uses[i].factor = n, factor
	}
	return list, uses
}

// normalized returns the mixture divided by its largest coefficient, and that.
func (m mixture[T]) normalized() (mixture[T], T) {
	largest, factor := -1, m.unit
	for i, t := range m.terms {
		if dense.Abs(t.value) > dense.Abs(factor) {
			largest, factor = i, t.value
		}
	}
	out := mixture[T]{sector: m.sector, unit: m.unit / factor}
	if largest < 0 {
		out.unit = 1
	}
	for i, t := range m.terms {
		value := t.value / factor
		if i == largest {
			value = 1
		}
		out.terms = append(out.terms, mixTerm[T]{t.inner, value})
	}
	return out, factor
}

// settle makes the mixtures. Local terms become part of them where states have one, unless that took more mixtures than the bonds have
// indices.
func (s *scheme[T]) settle(w *window[T], lefts, rights *mixer[T], locals []fullEntry[T]) {
	var rest []local[T]
	for _, f := range locals {
		at := [2]place{f.out, f.in}
		if i, ok := lefts.known[at]; ok {
			lefts.mixes[i].unit += f.value
		} else if i, ok := rights.known[at]; ok {
			rights.mixes[i].unit += f.value
		} else {
			rest = append(rest, local[T]{f.out, f.in, f.value})
		}
	}
	s.lefts, s.ends = lefts.distinct()
	s.rights, s.begins = rights.distinct()
	s.local = rest
	if len(s.lefts) <= w.wl.Dim()+spareMixtures && len(s.rights) <= w.wr.Dim()+spareMixtures {
		return
	}
	for _, m := range []*mixer[T]{lefts, rights} {
		for i := range m.mixes {
			m.mixes[i].unit = 0
		}
	}
	s.lefts, s.ends = lefts.distinct()
	s.rights, s.begins = rights.distinct()
	s.local = s.local[:0]
	for _, f := range locals {
		s.local = append(s.local, local[T]{f.out, f.in, f.value})
	}
}

// spareMixtures is how many mixtures beyond the bond dimension local terms may cause.
const spareMixtures = 4
