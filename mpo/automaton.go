package mpo

import (
	"cmp"
	"slices"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// automaton is an operator under construction: the same network as Operator, but its site tensors are written in a basis
// of local operators in which element 0 is the identity, and two indices of each bond have fixed numbers.
type automaton[T dense.Scalar] struct {
	group  block.Group
	phys   []block.Axis
	bases  []*basis[T] // one per site
	cells  [][]cell[T] // one list per site, any order
	joints []joint     // one per bond

	dropped float64 // sum of what the compression left out, in couplings
}

// The fixed indices; crossing strings are numbered from crossing on.
const (
	vacant   = 0
	done     = 1
	crossing = 2
)

// cell is v times element k of the site's basis, from index l of the left bond to index r of the right one.
type cell[T dense.Scalar] struct {
	l, r, k int32
	v       T
}

// joint is a bond: which of the fixed indices are there, and the charge of every index (also of the absent fixed ones).
type joint struct {
	vacant, done bool
	charges      []block.Charge
}

// newAutomaton returns one without cells, with the bonds' fixed indices absent but for the two ends.
func newAutomaton[T dense.Scalar](g block.Group, phys []block.Axis, charge block.Charge) *automaton[T] {
	n := len(phys)
	m := &automaton[T]{group: g, phys: phys, bases: make([]*basis[T], n), cells: make([][]cell[T], n), joints: make([]joint, n+1)}
	for b := range m.joints {
		m.joints[b].charges = []block.Charge{{}, charge}
	}
	m.joints[0].vacant, m.joints[n].done = true, true
	return m
}

// mirror reverses the order of the sites: left and right, vacant and done change places.
func (m *automaton[T]) mirror() {
	slices.Reverse(m.bases)
	slices.Reverse(m.cells)
	slices.Reverse(m.joints)
	slices.Reverse(m.phys)
	swap := [2]int32{done, vacant}
	for _, cells := range m.cells {
		for i := range cells {
			c := &cells[i]
			c.l, c.r = c.r, c.l
			if c.l < crossing {
				c.l = swap[c.l]
			}
			if c.r < crossing {
				c.r = swap[c.r]
			}
		}
	}
	for b := range m.joints {
		j := &m.joints[b]
		j.vacant, j.done = j.done, j.vacant
		j.charges[vacant], j.charges[done] = j.charges[done], j.charges[vacant]
	}
}

// gather sorts cells by left index, basis element and right index, adds up equal ones and drops what cancels to the given
// part of the summed magnitudes.
func gather[T dense.Scalar](cells []cell[T], tolerance float64) []cell[T] {
	cells = sortedCells(cells)
	out := cells[:0]
	for i := 0; i < len(cells); {
		c, size := cells[i], dense.Abs(cells[i].v)
		for i++; i < len(cells) && c.l == cells[i].l && c.r == cells[i].r && c.k == cells[i].k; i++ {
			c.v += cells[i].v
			size += dense.Abs(cells[i].v)
		}
		if dense.Abs(c.v) > tolerance*size {
			out = append(out, c)
		}
	}
	return out
}

// sortedCells returns the cells in order: a counting sort by left index, then one comparison a pair inside each.
func sortedCells[T dense.Scalar](cells []cell[T]) []cell[T] {
	var last int32
	for _, c := range cells {
		last = max(last, c.l)
	}
	at := make([]int, last+2)
	for _, c := range cells {
		at[c.l+1]++
	}
	for l := range last + 1 {
		at[l+1] += at[l]
	}
	out := make([]cell[T], len(cells))
	for _, c := range cells {
		out[at[c.l]] = c
		at[c.l]++
	}
	start := 0
	for _, end := range at[:last+1] { // each now points behind its own
		slices.SortFunc(out[start:end], func(a, b cell[T]) int {
			return cmp.Compare(uint64(a.k)<<32|uint64(a.r), uint64(b.k)<<32|uint64(b.r))
		})
		start = end
	}
	return out
}

// trim removes the indices that no path from the left end to the right end passes. It reports whether a path is left.
func (m *automaton[T]) trim() bool {
	n := len(m.cells)
	live := make([][]bool, n+1)
	for b := range live {
		live[b] = make([]bool, len(m.joints[b].charges))
	}
	live[0][vacant] = true
	for i, cells := range m.cells {
		for _, c := range cells {
			if live[i][c.l] {
				live[i+1][c.r] = true
			}
		}
	}
	back := make([]bool, len(live[n]))
	back[done] = live[n][done]
	live[n] = back
	for i := n - 1; i >= 0; i-- {
		back := make([]bool, len(live[i]))
		for _, c := range m.cells[i] {
			if live[i+1][c.r] {
				back[c.l] = true
			}
		}
		for j := range back {
			live[i][j] = live[i][j] && back[j]
		}
	}
	if !live[0][vacant] {
		return false
	}
	m.keep(live)
	return true
}

// keep drops the indices not marked and the cells at them, and renumbers the rest in order.
func (m *automaton[T]) keep(live [][]bool) {
	names := make([][]int32, len(live))
	for b, marks := range live {
		j := &m.joints[b]
		j.vacant, j.done = marks[vacant], marks[done]
		names[b] = []int32{vacant, done}
		charges := j.charges[:crossing:crossing]
		for i := crossing; i < len(marks); i++ {
			names[b] = append(names[b], int32(len(charges)))
			if marks[i] {
				charges = append(charges, j.charges[i])
			}
		}
		j.charges = charges
	}
	for i, cells := range m.cells {
		out := cells[:0]
		for _, c := range cells {
			if live[i][c.l] && live[i+1][c.r] {
				c.l, c.r = names[i][c.l], names[i+1][c.r]
				out = append(out, c)
			}
		}
		m.cells[i] = out
	}
}

// clear makes the automaton that of the operator zero: one index on each bond and no path.
func (m *automaton[T]) clear() {
	n := len(m.cells)
	for b := range m.joints {
		j := &m.joints[b]
		j.vacant, j.done, j.charges = b < n, b == n, j.charges[:crossing]
	}
	for i := range m.cells {
		m.cells[i] = nil
		if i < n-1 {
			m.cells[i] = []cell[T]{{l: vacant, r: vacant, k: 0, v: dense.FromFloat[T](1)}}
		}
	}
}

// operator writes the automaton as matrix elements, with the indices of each bond sorted by charge.
func (m *automaton[T]) operator() *Operator[T] {
	o := &Operator[T]{Group: m.group, Phys: m.phys, Bonds: make([]Bond, len(m.joints)), Sites: make([][]Entry[T], len(m.cells))}
	names := make([][]int32, len(m.joints))
	for b := range m.joints {
		o.Bonds[b], names[b] = m.joints[b].sorted()
	}
	for i, cells := range m.cells {
		var entries []Entry[T]
		for _, c := range cells {
			entries = m.bases[i].write(entries, names[i][c.l], names[i+1][c.r], c)
		}
		o.Sites[i] = settle(entries)
	}
	return o
}

// sorted orders the indices by charge, within a charge vacant first and done last, and returns the new number of each.
func (j *joint) sorted() (Bond, []int32) {
	var order []int32
	if j.vacant {
		order = append(order, vacant)
	}
	for i := crossing; i < len(j.charges); i++ {
		order = append(order, int32(i))
	}
	if j.done {
		order = append(order, done)
	}
	slices.SortStableFunc(order, func(a, b int32) int { return j.charges[a].Compare(j.charges[b]) })
	b := Bond{Charges: make([]block.Charge, len(order)), Vacant: none, Done: none}
	names := make([]int32, len(j.charges))
	for to, from := range order {
		b.Charges[to], names[from] = j.charges[from], int32(to)
		switch from {
		case vacant:
			b.Vacant = to
		case done:
			b.Done = to
		}
	}
	return b, names
}

// open writes an operator as an automaton over matrix units, to be worked on. It copies.
func open[T dense.Scalar](o *Operator[T]) *automaton[T] {
	m, entries := number(o)
	for i := range entries {
		m.cells[i], m.bases[i] = units(entries[i], o.Phys[i].Dim())
	}
	return m
}

// number returns an automaton with the bonds of an operator and no cells, and the operator's entries in its numbers.
func number[T dense.Scalar](o *Operator[T]) (*automaton[T], [][]Entry[T]) {
	m := newAutomaton[T](o.Group, slices.Clone(o.Phys), o.Charge())
	names := make([][]int32, len(o.Bonds))
	for b, bond := range o.Bonds {
		j := &m.joints[b]
		j.vacant, j.done = bond.Vacant >= 0, bond.Done >= 0
		names[b] = make([]int32, bond.Dim())
		for i, c := range bond.Charges {
			switch i {
			case bond.Vacant:
				names[b][i] = vacant
			case bond.Done:
				names[b][i] = done
			default:
				names[b][i] = int32(len(j.charges))
				j.charges = append(j.charges, c)
			}
		}
	}
	numbered := make([][]Entry[T], o.Len())
	for i, entries := range o.Sites {
		numbered[i] = slices.Clone(entries)
		for j := range entries {
			e := &numbered[i][j]
			e.Left, e.Right = names[i][e.Left], names[i+1][e.Right]
		}
	}
	return m, numbered
}
