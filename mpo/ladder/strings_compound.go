package ladder

import (
	"fmt"
	"math/cmplx"

	"rundle/mps/block"
)

// maxWays bounds the terms that one product may become on its way through the frames.
const maxWays = 1 << 16

// settle finds for a compound of a site an element that changes the charges by a definite amount and takes one gauge phase; false: there is none.
type settle func(site int32, op OpID) (OpID, bool)

// spell replaces compounds by what settle finds and writes out those that have nothing, so that the rest of the way may ask each
// operator what it changes. A product with too many of them is an error.
func (lb *labelling) spell(p *Polynomial, by settle) (*Polynomial, error) {
	some := false
	for _, f := range p.factors {
		if some = f.Op.compound() && !lb.definite(f.Site, f.Op); some {
			break
		}
	}
	if !some {
		return p, nil
	}
	b := NewBuilder(p.ladder)
	m := multiplier{ladder: p.ladder}
	for t := range p.NumTerms() {
		c, factors := p.Term(t)
		m.slots = m.slots[:0]
		ways := 1
		for _, f := range factors {
			s := slot{factor: f}
			if f.Op.compound() && !lb.definite(f.Site, f.Op) {
				op, ok := by(f.Site, f.Op)
				s.factor.Op = op
				if !ok {
					s.sum = p.ladder.Site(int(f.Site)).Parts(f.Op)
					if ways *= len(s.sum); ways > maxWays {
						return nil, tooLong(p, t)
					}
				}
			}
			m.slots = append(m.slots, s)
		}
		m.prefix = m.prefix[:0]
		if err := m.expand(&b.list, c, 0); err != nil {
			return nil, err
		}
		b.grown()
	}
	return b.Polynomial(), nil
}

// writeOut settles nothing: where charges are still to be found, every element counts.
func writeOut(int32, OpID) (OpID, bool) { return 0, false }

// definite reports whether all elements of a compound change the labels alike.
func (lb *labelling) definite(site int32, op OpID) bool {
	s := lb.at(int(site)).site
	parts := s.Parts(op)
	first := s.Raise(parts[0].Op)
	for _, x := range parts[1:] {
		for k, n := range s.Raise(x.Op) {
			if n != first[k] {
				return false
			}
		}
	}
	return true
}

func tooLong(p *Polynomial, t int) error {
	text := p.Format(t)
	if len(text) > 60 {
		text = text[:60] + "..."
	}
	return fmt.Errorf("the product %s is, in the charges and the arithmetic of this Hamiltonian, a sum of more than %d terms; shorten it", text, maxWays)
}

// settler keeps a compound together where the group cannot tell its elements apart: the gauge phases of the elements relative to the
// first enter the compound, that of the first is applied to it as to any operator.
func (f *Frames) settler(lb *labelling) settle {
	type key struct {
		charges *block.Charge
		angles  *float64
		class   int32
		op      OpID
	}
	type result struct {
		op OpID
		ok bool
	}
	known := make(map[key]result)
	return func(site int32, op OpID) (OpID, bool) {
		s := &f.Sites[site]
		k := key{class: lb.class[site], op: op, charges: &s.Charges[0]}
		if len(s.Angles) > 0 {
			k.angles = &s.Angles[0]
		}
		r, ok := known[k]
		if !ok {
			if f.oneCharge(lb, s, site, op) {
				r.op, r.ok = lb.dressed(s, site, op)
			}
			known[k] = r
		}
		return r.op, r.ok
	}
}

// oneCharge reports whether every element of an operator's matrix changes the charges alike.
func (f *Frames) oneCharge(lb *labelling, s *block.Frame, site int32, op OpID) bool {
	m, d := lb.at(int(site)).site.Matrix(op), s.Dim()
	first := true
	var charge block.Charge
	for i, out := range s.Order {
		for j, in := range s.Order {
			if m[out*d+in] == 0 {
				continue
			}
			c := f.Group.Sub(s.Charges[i], s.Charges[j])
			if !first && c != charge {
				return false
			}
			first, charge = false, c
		}
	}
	return true
}

// dressed returns the compound with the gauge phases of its elements relative to the first.
func (lb *labelling) dressed(s *block.Frame, site int32, op OpID) (OpID, bool) {
	if s.Angles == nil {
		return op, true
	}
	class := lb.at(int(site))
	parts := class.site.Parts(op)
	out := make([]Weighted, len(parts))
	var zero []int
	for i, x := range parts {
		raise := class.site.Raise(x.Op)
		if i == 0 {
			zero = raise
		}
		angle := 0.0
		for a, n := range class.toSteps(raise, zero) {
			angle += s.Angles[a] * float64(n)
		}
		out[i] = Weighted{x.Coef * cmplx.Rect(1, angle), x.Op}
	}
	w, err := class.site.ops.condense(mergeWeighted(out))
	if err != nil || len(w) != 1 {
		return op, false
	}
	return w[0].Op, true
}
