package modelfile

import (
	"errors"
	"fmt"
	"strconv"
	"strings"

	"rundle/mpo/ladder"
	"rundle/mpo/ladder/formula"
)

// term is a [[term]] section with what it says.
type term struct {
	*section
	term ladder.Term
}

// readTerms reads the [[term]] sections.
func (r *reader) readTerms() {
	all := r.several("term")
	if len(all) == 0 && r.table.byKey["term"] == nil {
		r.fault(0, "add [[term]] with formula = \"...\"", "no [[term]] section")
	}
	first := map[string]*entry{}
	for _, s := range all {
		t := ladder.Term{}
		if e := s.lookup("name"); e != nil {
			name, ok := s.text(e)
			if before := first[name]; ok && before != nil {
				r.repeated(e.value, "term", name, before.value)
			} else if ok {
				first[name] = e
				t.Name, s.name = name, fmt.Sprintf("[[term]] %q", name)
			}
		}
		t.Formula = s.formula(s.need("formula", "formula = \"...\""), formula.Parse)
		t.Each = s.each()
		t.Where = s.formula(s.lookup("where"), formula.ParseCondition)
		s.done()
		r.terms = append(r.terms, term{s, t})
	}
}

// formula returns a string that parses.
func (s *section) formula(e *entry, parse func(string) (formula.Node, error)) string {
	t, ok := s.text(e)
	if !ok || !s.syntax(e.value, parse) {
		return ""
	}
	return t
}

// each reads { l = "legs", k = "1..rungs-1", m = [0, 2], n = ["a", "c"] }.
func (s *section) each() ladder.Each {
	e := s.lookup("each")
	if e == nil {
		return nil
	}
	if e.value.kind != group {
		s.wrong(e, "a table of indices, as in each = { l = \"legs\" }")
		return nil
	}
	all := ladder.Each{}
	for _, index := range e.value.table.entries {
		if values := s.indexValues(index); values != nil {
			all[index.key] = values
		}
	}
	return all
}

func (s *section) indexValues(index *entry) any {
	v := index.value
	switch {
	case v.kind == text && (v.text == "legs" || v.text == "rungs"):
		return v.text
	case v.kind == text:
		if _, _, err := formula.ParseRange(v.text); err != nil {
			s.fault(v.at, "expected \"legs\", \"rungs\", a range such as \"1..rungs-1\" or a list", "index %q runs over %q", index.key, v.text)
			return nil
		}
		return v.text
	case v.kind != list:
		s.fault(v.at, "", "index %q runs over %s; expected \"legs\", \"rungs\", a range such as \"1..rungs-1\" or a list", index.key, v.kind)
		return nil
	case len(v.items) == 0:
		s.fault(v.at, "", "index %q runs over an empty list", index.key)
		return nil
	}
	all := make([]any, 0, len(v.items))
	for _, item := range v.items {
		switch item.kind {
		case integer:
			all = append(all, int(item.integer))
		case text:
			all = append(all, item.text)
		default:
			s.fault(item.at, "", "index %q runs over a list with %s; expected names of legs or whole numbers", index.key, item.kind)
			return nil
		}
	}
	return all
}

// buildHamiltonian sums the terms. If that fails each term is tried alone, which finds all faulty ones.
func (r *reader) buildHamiltonian() {
	var terms []ladder.Term
	for _, t := range r.terms {
		terms = append(terms, t.term)
	}
	h, err := r.model.Scope.Hamiltonian(terms...)
	if err == nil {
		r.model.Hamiltonian = h
		return
	}
	before := len(r.faults)
	for _, t := range r.terms {
		if _, err := r.model.Scope.Polynomial(t.term); err != nil {
			r.blameTerm(t.section, err)
		}
	}
	if len(r.faults) > before {
		return
	}
	r.blameTerm(r.culprit(err), err)
}

// culprit finds the term that an error about the whole sum is about.
func (r *reader) culprit(err error) *section {
	var l *ladder.Error
	for _, t := range r.terms {
		if errors.As(err, &l) && l.Term != "" && (l.Term == t.term.Name || t.term.Name == "" && l.Term == t.term.Formula) {
			return t.section
		}
	}
	for _, t := range r.terms {
		if _, alone := r.model.Scope.Hamiltonian(t.term); alone != nil {
			return t.section
		}
	}
	return r.terms[0].section
}

// blameTerm notes a fault of a section with a formula.
func (r *reader) blameTerm(s *section, err error) {
	at := s.at
	if e := s.table.byKey["formula"]; e != nil {
		at = e.value.at
	}
	if e := s.table.byKey["each"]; e != nil {
		at = indexAtFault(e.value.table, err, at)
	}
	r.blame(err, at, s.values()...)
}

// indexAtFault is the index of each that an error is about, or the item of its list that the error quotes; else at.
func indexAtFault(each *table, err error, at int) int {
	var l *ladder.Error
	if !errors.As(err, &l) {
		return at
	}
	for _, index := range each.entries {
		if l.Part != fmt.Sprintf("each %q", index.key) {
			continue
		}
		for _, item := range index.value.items {
			if item.kind == text && strings.Contains(l.Msg, strconv.Quote(item.text)) {
				return item.at
			}
		}
		return index.at
	}
	return at
}
