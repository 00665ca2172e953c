package mpo

import "rundle/mpo/ladder"

// suffixes interns what is left of a term from one of its factors on: a factor and the suffix that follows. Equal strings
// share their suffixes, so that the whole cost is one look-up a factor, and a string at a cut is known by one number.
// Suffix 0 is the empty one.
type suffixes struct {
	site, op, next []int32
	odd            []bool // an odd number of odd factors from here on
	ids            map[[3]int32]int32
}

func newSuffixes(s *ladder.Strings) *suffixes {
	x := &suffixes{site: []int32{int32(len(s.Axes))}, op: []int32{0}, next: []int32{0}, odd: []bool{false}}
	x.ids = make(map[[3]int32]int32, len(s.Factors))
	return x
}

// intern returns the suffix that begins with the factor and goes on with next.
func (x *suffixes) intern(f ladder.StringFactor, odd bool, next int32) int32 {
	key := [3]int32{f.Site, f.Op, next}
	if id, ok := x.ids[key]; ok {
		return id
	}
	id := int32(len(x.site))
	x.ids[key] = id
	x.site, x.op, x.next = append(x.site, f.Site), append(x.op, f.Op), append(x.next, next)
	x.odd = append(x.odd, x.odd[next] != odd)
	return id
}

// term interns the factors of a term from the right and returns its first suffix.
func (x *suffixes) term(s *ladder.Strings, t int) int32 {
	var id int32
	for f := s.Start[t+1] - 1; f >= s.Start[t]; f-- {
		factor := s.Factors[f]
		id = x.intern(factor, s.Tables[factor.Site].Odd[factor.Op], id)
	}
	return id
}
