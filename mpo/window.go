package mpo

import (
	"cmp"
	"slices"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// window is an operator on one site, or on two neighbours taken together, sorted by the charge sectors of its bonds and states: what
// every plan of a contraction asks of it, whatever the state.
type window[T dense.Scalar] struct {
	group  block.Group
	wl, wr block.Axis   // MPO bonds on the left and on the right, In
	states []stateGroup // the sectors of the site, or the pairs of sectors of the two sites
	links  []link
	local  []localEntry[T]

	tables  [faces][][]link     // see by
	schemes [4]*scheme[T]       // by which environments are the identity
	growths [4]*growthScheme[T] // by side, and whether there is an identity
}

// stateGroup is a sector of the states of a window.
type stateGroup struct {
	charge block.Charge
	dim    int
	at     [2]int // positions on the axes of the one site or the two
}

// link is the entries between fixed sectors of both bonds and of the outgoing and incoming states: local[from:to] of its window. Charge
// conservation leaves at most one sector of each kind when the other three are given.
type link struct {
	left, right, out, in int
	from, to             int
}

// localEntry is an MPO entry with its indices counted inside their sectors.
type localEntry[T dense.Scalar] struct {
	left, right, out, in int
	value                T
}

// newWindow sorts the entries of one site, or of the two neighbours that phys names joined by joinEntries.
func newWindow[T dense.Scalar](g block.Group, left, right Bond, phys []block.Axis, entries []Entry[T]) *window[T] {
	w := &window[T]{group: g, wl: left.Axis(block.In), wr: right.Axis(block.In)}
	l, r := places(w.wl), places(w.wr)
	var state []place
	w.states, state = stateGroups(g, phys)
	type keyed struct {
		link
		localEntry[T]
	}
	all := make([]keyed, len(entries))
	for i, e := range entries {
		a, b, out, in := l[e.Left], r[e.Right], state[e.Out], state[e.In]
		all[i] = keyed{link{left: a.sector, right: b.sector, out: out.sector, in: in.sector},
			localEntry[T]{a.inner, b.inner, out.inner, in.inner, e.Value}}
	}
	slices.SortStableFunc(all, func(x, y keyed) int { return x.compare(y.link) })
	w.local = make([]localEntry[T], len(all))
	for i, e := range all {
		w.local[i] = e.localEntry
		if i == 0 || e.compare(all[i-1].link) != 0 {
			e.from = i
			w.links = append(w.links, e.link)
		}
		w.links[len(w.links)-1].to = i + 1
	}
	return w
}

func (k link) compare(o link) int {
	return cmp.Or(cmp.Compare(k.left, o.left), cmp.Compare(k.right, o.right), cmp.Compare(k.out, o.out), cmp.Compare(k.in, o.in))
}

// place tells where a state of an axis stands: its sector, and its number inside.
type place struct{ sector, inner int }

func places(a block.Axis) []place {
	all := make([]place, 0, a.Dim())
	for i, s := range a.Sectors {
		for k := range s.Dim {
			all = append(all, place{i, k})
		}
	}
	return all
}

// stateGroups lists the sectors of one physical axis, or the pairs of sectors of two, and where each state (out1*d2 + out2) stands.
func stateGroups(g block.Group, phys []block.Axis) ([]stateGroup, []place) {
	var groups []stateGroup
	for i, s := range phys[0].Sectors {
		groups = append(groups, stateGroup{s.Charge, s.Dim, [2]int{i, 0}})
	}
	first := places(phys[0])
	if len(phys) == 1 {
		return groups, first
	}
	second := places(phys[1])
	width := len(phys[1].Sectors)
	var pairs []stateGroup
	for i, s := range groups {
		for k, t := range phys[1].Sectors {
			pairs = append(pairs, stateGroup{g.Add(s.charge, t.Charge), s.dim * t.Dim, [2]int{i, k}})
		}
	}
	var all []place
	for _, a := range first {
		for _, b := range second {
			all = append(all, place{a.sector*width + b.sector, a.inner*phys[1].Sectors[b.sector].Dim + b.inner})
		}
	}
	return pairs, all
}

// face names two of the four sectors of a link: one bond and one of the states.
type face int

const (
	leftOut face = iota
	rightOut
	leftIn
	rightIn
	faces = 4
)

// by returns the links by the two sectors of a face, at bond sector * len(states) + state sector, those of one place by increasing state,
// then bond sector of the other two.
func (w *window[T]) by(f face) [][]link {
	if w.tables[f] != nil {
		return w.tables[f]
	}
	bond := w.wl
	if f == rightOut || f == rightIn {
		bond = w.wr
	}
	table := make([][]link, len(bond.Sectors)*len(w.states))
	for _, k := range w.links {
		at := 0
		switch f {
		case leftOut:
			at = k.left*len(w.states) + k.out
		case rightOut:
			at = k.right*len(w.states) + k.out
		case leftIn:
			at = k.left*len(w.states) + k.in
		case rightIn:
			at = k.right*len(w.states) + k.in
		}
		table[at] = append(table[at], k)
	}
	for _, list := range table {
		slices.SortStableFunc(list, func(x, y link) int {
			if f == leftOut || f == rightOut {
				return cmp.Compare(x.in, y.in)
			}
			return 0 // links are in order of the other bond and the outgoing state
		})
	}
	w.tables[f] = table
	return table
}

// steps tabulates a charge rule between two axes: steps[i*len(b.Sectors)+k] is the sector of to with the charge q_i + sign*q_k, -1 where it has
// none.
func steps(g block.Group, a block.Axis, sign int, b, to block.Axis) []int {
	table := make([]int, 0, len(a.Sectors)*len(b.Sectors))
	for _, x := range a.Sectors {
		for _, y := range b.Sectors {
			q := g.Sub(x.Charge, y.Charge)
			if sign > 0 {
				q = g.Add(x.Charge, y.Charge)
			}
			pos, ok := to.Find(q)
			if !ok {
				pos = -1
			}
			table = append(table, pos)
		}
	}
	return table
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
