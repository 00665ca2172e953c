package ladder

import (
	"fmt"
	"slices"
	"strings"
)

// IndexValue is the value of an index at a place.
type IndexValue struct {
	Name   string
	Leg    string  // the leg, or empty:
	Number float64 // the number
}

// Value is the leg's name, an int, or a float64 where the number is not whole.
func (v IndexValue) Value() any {
	switch {
	case v.Leg != "":
		return v.Leg
	case v.Number == float64(int(v.Number)):
		return int(v.Number)
	}
	return v.Number
}

// String is "j = 3".
func (v IndexValue) String() string { return fmt.Sprintf("%s = %v", v.Name, v.Value()) }

// Place is one assignment of a term's indices and what the formula is there.
type Place struct {
	At   []IndexValue // j first where it occurs
	Poly *Polynomial
}

// maxPlaces bounds the assignments that are tried.
const maxPlaces = 50_000_000

// walk calls visit for every assignment that where allows, with the formula's value. Places that lack a site are left out.
func (t *compiled) walk(f *frame, visit func(v value) error) error {
	size := 1.0
	for _, d := range t.domains {
		switch {
		case !d.ranged:
			size *= float64(len(d.values))
		case !d.bound: // the bounds are numbers
			lo, err := d.from.eval(f)
			if err != nil {
				return err
			}
			hi, err := d.to.eval(f)
			if err != nil {
				return err
			}
			size *= float64(max(0, hi-lo+1))
		}
	}
	tooMany := t.at.fail("shorten the ranges; \"j+1..j+5\" is one, too", "more than %d million places", maxPlaces/1_000_000)
	if size > maxPlaces {
		return tooMany
	}
	tried := 0
	var from func(k int) error
	from = func(k int) error {
		if k == len(t.domains) {
			return t.place(f, visit)
		}
		d := &t.domains[k]
		if !d.ranged {
			for _, x := range d.values {
				f.vars[d.slot] = x
				if err := from(k + 1); err != nil {
					return err
				}
			}
			return nil
		}
		lo, err := d.from.eval(f)
		if err != nil {
			return err
		}
		hi, err := d.to.eval(f)
		if err != nil {
			return err
		}
		for x := lo; x <= hi; x++ {
			if tried++; tried > maxPlaces {
				return tooMany
			}
			f.vars[d.slot] = float64(x)
			if err := from(k + 1); err != nil {
				return err
			}
		}
		return nil
	}
	return from(0)
}

func (t *compiled) place(f *frame, visit func(v value) error) error {
	f.begin()
	if t.where != nil {
		if ok, err := t.where.test(f); err != nil || !ok {
			return err
		}
	}
	v, err := t.body.eval(f)
	if err == errAbsent {
		t.missed(f)
		return nil
	}
	if err != nil {
		return t.at.wrap(err)
	}
	return visit(v)
}

// missed notes a place that a summand alone would have had.
func (t *compiled) missed(f *frame) {
	for _, part := range t.parts {
		f.used = 0
		if v, err := part.eval(f); err == nil && v.ops != nil {
			if f.halves++; f.halves == 1 {
				f.half = placeName(t.indices(f))
			}
			return
		}
	}
}

// indices returns the assignment that f stands at.
func (t *compiled) indices(f *frame) []IndexValue {
	at := make([]IndexValue, len(t.domains))
	for k, d := range t.domains {
		at[k] = IndexValue{Name: d.name, Number: f.vars[d.slot]}
		if d.leg {
			at[k] = IndexValue{Name: d.name, Leg: f.ladder.legs[int(f.vars[d.slot])].name}
		}
	}
	return at
}

func placeName(at []IndexValue) string {
	s := make([]string, len(at))
	for i, v := range at {
		s[i] = v.String()
	}
	return strings.Join(s, ", ")
}

// Polynomial returns the sum of a term over all its places.
func (s *Scope) Polynomial(t Term) (*Polynomial, error) {
	p, _, err := s.sum(t)
	return p, err
}

// sum is Polynomial with warnings.
func (s *Scope) sum(t Term) (*Polynomial, []string, error) {
	c, err := s.compile(t)
	if err != nil {
		return nil, nil, err
	}
	f := newFrame(s.ladder, c.slots)
	f.track = s.ladder.boundary == Periodic || s.ladder.across == Periodic
	rings := ringPairs{}
	b := NewBuilder(s.ladder)
	places := 0
	err = c.walk(f, func(v value) error {
		places++
		if v.ops == nil {
			b.Add(v.z)
			return b.full(c.at)
		}
		if f.track {
			rings.see(c, f, v.ops)
		}
		if err := f.mul.writeOut(&b.list, v.ops); err != nil {
			return c.at.wrap(err)
		}
		b.grown()
		return b.full(c.at)
	})
	if err != nil {
		return nil, nil, err
	}
	p := b.Polynomial()
	if bad, ok := p.finite(); !ok {
		return nil, nil, c.at.fail("check the numbers in it", "a coefficient is not a finite number: %s", bad)
	}
	return p, c.warnings(places, f, &rings), nil
}

func (b *Builder) full(at origin) error { return at.wrap(b.list.full()) }

// Places returns a term at each of its places, in the order of the indices.
func (s *Scope) Places(t Term) ([]Place, error) {
	c, err := s.compile(t)
	if err != nil {
		return nil, err
	}
	f := newFrame(s.ladder, c.slots)
	var places []Place
	terms := 0
	err = c.walk(f, func(v value) error {
		var out list
		out.reset()
		if v.ops == nil {
			out.close(v.z)
		} else if err := f.mul.writeOut(&out, v.ops); err != nil {
			return c.at.wrap(err)
		}
		p := &Polynomial{s.ladder, out.merged()}
		at := c.indices(f)
		if bad, ok := p.finite(); !ok {
			return c.at.fail("check the numbers in it", "a coefficient is not a finite number at %s: %s", placeName(at), bad)
		}
		places = append(places, Place{at, p})
		if terms += p.NumTerms() + 1; terms > MaxTerms {
			return c.at.wrap(errTooMany)
		}
		return nil
	})
	return places, err
}

// ringPairs finds places that wrap around a ring and repeat another place.
type ringPairs struct {
	seen  map[[2]uint64]ringPlace
	count int
	first string
}

type ringPlace struct {
	at      []IndexValue
	wrapped bool
}

// see takes note of a place that acts on several sites.
func (r *ringPairs) see(c *compiled, f *frame, ops *list) {
	slices.Sort(f.touched)
	sites := slices.Compact(f.touched)
	if len(sites) < 2 {
		return
	}
	// The set of sites and the set of operator products, both without order.
	key := [2]uint64{14695981039346656037, 0}
	for _, s := range sites {
		key[0] = mix(key[0], uint64(s))
	}
	for i := range ops.coef {
		h := uint64(1469598103934665603)
		for _, x := range ops.term(i) {
			h = mix(mix(h, uint64(x.Site)), uint64(x.Op))
		}
		key[1] += h
	}
	if r.seen == nil {
		r.seen = make(map[[2]uint64]ringPlace)
	}
	old, ok := r.seen[key]
	if !ok {
		p := ringPlace{wrapped: f.wrapped}
		if len(r.seen) < 1<<16 { // names for the message only
			p.at = c.indices(f)
		}
		r.seen[key] = p
		return
	}
	if old.wrapped || f.wrapped {
		if r.count++; r.count == 1 {
			r.first = fmt.Sprintf("(%s) and (%s)", placeName(old.at), placeName(c.indices(f)))
		}
	}
}

// mix is a step of a 64-bit hash (FNV-1a on words, then a shift so that high bits come down).
func mix(h, x uint64) uint64 {
	h = (h ^ x) * 1099511628211
	return h ^ h>>29
}

func (t *compiled) warnings(places int, f *frame, r *ringPairs) []string {
	var w []string
	name := fmt.Sprintf("term %q", t.term.title())
	if places == 0 {
		w = append(w, name+" has no place on this ladder")
	}
	if places > 0 && f.halves > 0 {
		w = append(w, fmt.Sprintf("%s leaves out %s where only some of its summands have all their sites, first %s; if those are meant, write the summands as terms of their own",
			name, plural(f.halves, "place"), f.half))
	}
	if r.count > 0 {
		w = append(w, fmt.Sprintf("%s counts %s twice on the ring, first at %s; end a long range r at rungs/2, on an even ring with where = \"2*r < rungs or j < r\"",
			name, plural(r.count, "set")+" of sites", r.first))
	}
	return w
}
