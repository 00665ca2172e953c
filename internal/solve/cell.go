package solve

import (
	"cmp"
	"slices"

	"rundle/mpo/ladder"
)

// Cell is the unit cell of a ladder: which sites the terms couple, in the bulk. Links are sorted by their legs and shift.
type Cell struct {
	Legs  []string `json:"legs"`
	Links []Link   `json:"links"`
}

// Link couples the site of one leg on rung j with that of another on rung j + Shift, Shift >= 0.
type Link struct {
	From  string `json:"from"`
	To    string `json:"to"`
	Shift int    `json:"shift"`
}

// cellOf collects the pairs of sites that occur together in a term.
func cellOf(h *ladder.Hamiltonian) Cell {
	lad := h.Ladder()
	legs := lad.Legs()
	number := map[string]int{}
	for k, name := range legs {
		number[name] = k
	}
	type key struct{ from, to, shift int }
	seen := map[key]bool{}
	for i := range h.Poly.NumTerms() {
		_, factors := h.Poly.Term(i)
		for x := range factors {
			a, ra, _ := lad.SiteAt(int(factors[x].Site))
			for _, f := range factors[x+1:] {
				b, rb, _ := lad.SiteAt(int(f.Site))
				from, to, shift := number[a], number[b], rb-ra
				if n := lad.Rungs(); lad.Boundary() == ladder.Periodic && shift > n/2 {
					shift -= n
				}
				if shift < 0 || shift == 0 && from > to {
					from, to, shift = to, from, -shift
				}
				seen[key{from, to, shift}] = true
			}
		}
	}
	c := Cell{Legs: legs}
	keys := make([]key, 0, len(seen))
	for k := range seen {
		keys = append(keys, k)
	}
	slices.SortFunc(keys, func(a, b key) int { return cmp.Or(a.shift-b.shift, a.from-b.from, a.to-b.to) })
	for _, k := range keys {
		c.Links = append(c.Links, Link{legs[k.from], legs[k.to], k.shift})
	}
	return c
}
