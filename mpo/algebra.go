package mpo

import (
	"fmt"
	"slices"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// Scale returns c times o.
func Scale[T dense.Scalar](c T, o *Operator[T]) *Operator[T] {
	if c == dense.FromFloat[T](0) {
		m := open(o)
		m.clear()
		return m.operator()
	}
	scaled := &Operator[T]{Group: o.Group, Phys: o.Phys, Bonds: o.Bonds, Sites: make([][]Entry[T], o.Len())}
	for i, entries := range o.Sites {
		scaled.Sites[i] = slices.Clone(entries)
		for j := range entries {
			// Every path starts at the vacant index of the left end and leaves the vacant indices once.
			if e := &scaled.Sites[i][j]; int(e.Left) == o.Bonds[i].Vacant && int(e.Right) != o.Bonds[i+1].Vacant {
				e.Value *= c
			}
		}
	}
	return scaled
}

// Adjoint returns the Hermitian conjugate of o.
func Adjoint[T dense.Scalar](o *Operator[T]) *Operator[T] {
	adj := &Operator[T]{Group: o.Group, Phys: o.Phys, Bonds: make([]Bond, len(o.Bonds)), Sites: make([][]Entry[T], o.Len())}
	names := make([][]int32, len(o.Bonds))
	for b, bond := range o.Bonds {
		adj.Bonds[b], names[b] = bond.negated(o.Group)
	}
	for i, entries := range o.Sites {
		turned := make([]Entry[T], len(entries))
		for j, e := range entries {
			turned[j] = Entry[T]{names[i][e.Left], names[i+1][e.Right], e.In, e.Out, dense.Conj(e.Value)}
		}
		adj.Sites[i] = settle(turned)
	}
	return adj
}

// negated returns the bond with all charges negated and sorted again, and the new number of each index.
func (b Bond) negated(g block.Group) (Bond, []int32) {
	order := make([]int, b.Dim())
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(x, y int) int { return g.Neg(b.Charges[x]).Compare(g.Neg(b.Charges[y])) })
	n := Bond{Charges: make([]block.Charge, b.Dim()), Vacant: slices.Index(order, b.Vacant), Done: slices.Index(order, b.Done)}
	names := make([]int32, b.Dim())
	for to, from := range order {
		n.Charges[to], names[from] = g.Neg(b.Charges[from]), int32(to)
	}
	return n, names
}

// Add returns a + b with bonds compressed to the operator rank. Both act on the same space and add the same charge.
func Add[T dense.Scalar](a, b *Operator[T]) *Operator[T] {
	mustMatch("sum", a, b)
	if a.Charge() != b.Charge() {
		panic(fmt.Sprintf("mpo: sum of operators of charges %v and %v", a.Charge(), b.Charge()))
	}
	m, entries := number(a)
	other, more := number(b)
	shift := make([]int32, len(m.joints))
	for i := range m.joints {
		j, k := &m.joints[i], &other.joints[i]
		shift[i] = int32(len(j.charges)) - crossing
		j.charges = append(j.charges, k.charges[crossing:]...)
		j.vacant, j.done = j.vacant || k.vacant, j.done || k.done
	}
	for i := range entries {
		have := passes(entries[i])
		for _, e := range more[i] {
			if e.Left == e.Right && e.Left < crossing && have[e.Left] {
				continue // the identity that both share
			}
			if e.Left >= crossing {
				e.Left += shift[i]
			}
			if e.Right >= crossing {
				e.Right += shift[i+1]
			}
			entries[i] = append(entries[i], e)
		}
		m.cells[i], m.bases[i] = units(settle(entries[i]), a.Phys[i].Dim())
	}
	return m.finish(Options{}.settle())
}

// passes reports which of the fixed indices go on over a site.
func passes[T dense.Scalar](entries []Entry[T]) (yes [crossing]bool) {
	for _, e := range entries {
		if e.Left == e.Right && e.Left < crossing {
			yes[e.Left] = true
		}
	}
	return yes
}

// finish trims, compresses and writes the operator.
func (m *automaton[T]) finish(opt Options) *Operator[T] {
	for i := range m.cells {
		m.cells[i] = gather(m.cells[i], noise)
	}
	if !m.trim() {
		m.clear()
		return m.operator()
	}
	m.compress(opt)
	return m.operator()
}

// ShiftIdentity returns o + c·1. The operator must add no charge.
func ShiftIdentity[T dense.Scalar](o *Operator[T], c T) *Operator[T] {
	m := open(o)
	at := 0 // where the last path leaves the vacant index: behind it is a done index more often than not
	for b := range m.joints {
		if m.joints[b].vacant {
			at = b
		}
	}
	shares := make([]T, o.Len())
	shares[at] = c
	return shift(o, shares).finish(Options{}.settle())
}

// shift adds shares[i] times the identity at each site, with vacant and done indices where the shares need them.
func shift[T dense.Scalar](o *Operator[T], shares []T) *automaton[T] {
	if o.Charge() != (block.Charge{}) {
		panic(fmt.Sprintf("mpo: multiple of the identity added to an operator of charge %v", o.Charge()))
	}
	m, entries := number(o)
	first, last := len(shares), -1
	for i, c := range shares {
		if c != dense.FromFloat[T](0) {
			first, last = min(first, i), max(last, i)
		}
	}
	one := dense.FromFloat[T](1)
	for i, c := range shares {
		have := passes(entries[i])
		for s := range int32(o.Phys[i].Dim()) {
			if i < last && !have[vacant] {
				m.joints[i+1].vacant = true
				entries[i] = append(entries[i], Entry[T]{vacant, vacant, s, s, one})
			}
			if i > first && !have[done] {
				m.joints[i].done = true
				entries[i] = append(entries[i], Entry[T]{done, done, s, s, one})
			}
			entries[i] = append(entries[i], Entry[T]{vacant, done, s, s, c})
		}
		m.cells[i], m.bases[i] = units(settle(entries[i]), o.Phys[i].Dim())
	}
	return m
}

// Product returns a·b: b acts first. Its bonds are compressed to the operator rank.
func Product[T dense.Scalar](a, b *Operator[T]) *Operator[T] {
	o, _ := product(a, b, Options{}.settle())
	return o
}

// product returns a·b and what its compression left out, in couplings.
func product[T dense.Scalar](a, b *Operator[T], opt Options) (o *Operator[T], dropped float64) {
	mustMatch("product", a, b)
	m := newAutomaton[T](a.Group, append([]block.Axis(nil), a.Phys...), a.Group.Add(a.Charge(), b.Charge()))
	index := map[[2]int32]int32{{0, 0}: vacant} // pairs of indices on the bond before the site
	for i := range a.Sites {
		index = m.multiply(i, a, b, index)
	}
	o = m.finish(opt)
	return o, m.dropped
}

// multiply fills site i of the product of a and b and returns the pairs of indices behind it.
func (m *automaton[T]) multiply(i int, a, b *Operator[T], before map[[2]int32]int32) map[[2]int32]int32 {
	j := &m.joints[i+1]
	ba, bb := a.Bonds[i+1], b.Bonds[i+1]
	behind := make(map[[2]int32]int32)
	number := func(p [2]int32) int32 {
		if n, ok := behind[p]; ok {
			return n
		}
		n := int32(len(j.charges))
		switch {
		case int(p[0]) == ba.Vacant && int(p[1]) == bb.Vacant:
			n, j.vacant = vacant, true
		case int(p[0]) == ba.Done && int(p[1]) == bb.Done:
			n, j.done = done, true
		default:
			j.charges = append(j.charges, m.group.Add(ba.Charges[p[0]], bb.Charges[p[1]]))
		}
		behind[p] = n
		return n
	}
	byLeft := make(map[int32][]Entry[T])
	for _, f := range b.Sites[i] {
		byLeft[f.Left] = append(byLeft[f.Left], f)
	}
	partners := make(map[int32][]int32) // indices of b that occur with one of a, in order of b
	for _, p := range sortedPairs(before) {
		partners[p[0]] = append(partners[p[0]], p[1])
	}
	var product []Entry[T]
	for _, e := range a.Sites[i] {
		for _, lb := range partners[e.Left] {
			for _, f := range byLeft[lb] {
				if f.Out == e.In {
					product = append(product, Entry[T]{before[[2]int32{e.Left, lb}], number([2]int32{e.Right, f.Right}), e.Out, f.In, e.Value * f.Value})
				}
			}
		}
	}
	m.cells[i], m.bases[i] = units(settle(product), m.phys[i].Dim())
	return behind
}

// sortedPairs lists the keys in order, so that the numbers given next do not depend on the map.
func sortedPairs(m map[[2]int32]int32) [][2]int32 {
	pairs := make([][2]int32, 0, len(m))
	for p := range m {
		pairs = append(pairs, p)
	}
	slices.SortFunc(pairs, func(a, b [2]int32) int { return slices.Compare(a[:], b[:]) })
	return pairs
}
