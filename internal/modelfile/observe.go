package modelfile

import (
	"fmt"

	"rundle/mpo/ladder"
	"rundle/mpo/ladder/formula"
)

// observed is an [[observe]] section with what it says.
type observed struct {
	*section
	Observation
}

// readObserve reads the [[observe]] sections.
func (r *reader) readObserve() {
	first := map[string]*entry{}
	for _, s := range r.several("observe") {
		o := Observation{Kind: Values}
		e := s.lookup("name")
		if name, ok := s.text(e); ok {
			o.Name, s.name = name, fmt.Sprintf("[[observe]] %q", name)
			if before := first[name]; before != nil {
				r.repeated(e.value, "observation", name, before.value)
			}
			first[name] = e
		}
		if e := s.lookup("kind"); e != nil {
			kind, ok := s.choice(e, string(Values), string(Correlations), string(Entanglement))
			if !ok {
				continue
			}
			o.Kind = Kind(kind)
		}
		switch o.Kind {
		case Values:
			s.need("name", "name = \"density\"")
			o.Term = ladder.Term{Name: o.Name, Formula: s.formula(s.need("formula", "formula = \"n[l,j]\""), formula.Parse), Each: s.each()}
			o.Term.Where = s.formula(s.lookup("where"), formula.ParseCondition)
		case Correlations:
			s.need("name", "name = \"coherence\"")
			s.correlations(&o)
		case Entanglement:
			r.onlyOne(s)
			o.SpectrumTo, _ = s.positive(s.lookup("spectrum_to"))
			if o.Name == "" {
				o.Name = string(Entanglement)
			}
		}
		s.done()
		r.observed = append(r.observed, observed{s, o})
		r.model.Observe = append(r.model.Observe, o)
	}
}

func (r *reader) onlyOne(s *section) {
	for _, o := range r.observed {
		if o.Kind == Entanglement {
			r.fault(s.at, "keep one of them", "[[observe]] with kind = \"entanglement\" for the second time")
		}
	}
}

// correlations reads of, each, where and connected. Each operator keeps the indices that it uses.
func (s *section) correlations(o *Observation) {
	e := s.need("of", "of = [\"b^+[l,j]\", \"b[l,j]\"]")
	pair, ok := s.words(e)
	each := s.each()
	where := s.formula(s.lookup("where"), formula.ParseCondition)
	o.Connected, _ = s.flag(s.lookup("connected"))
	if !ok {
		return
	}
	if len(pair) != 2 {
		s.fault(e.value.at, "as in of = [\"b^+[l,j]\", \"b[l,j]\"]", "\"of\" in %s holds %d formulas; expected two", s.label(), len(pair))
		return
	}
	used := map[string]bool{}
	for k, t := range []*ladder.Term{&o.Term, &o.Second} {
		if !s.syntax(e.value.items[k], formula.Parse) {
			return
		}
		*t = ladder.Term{Name: o.Name, Formula: pair[k], Where: where}
		names := namesIn(pair[k])
		for index, values := range each {
			if names[index] {
				if t.Each == nil {
					t.Each = ladder.Each{}
				}
				t.Each[index] = values
				used[index] = true
			}
		}
	}
	for index := range each {
		if !used[index] {
			s.fault(s.table.byKey["each"].value.table.byKey[index].at, "", "index %q is in neither formula", index)
		}
	}
}

// namesIn lists the names of a formula that parses.
func namesIn(src string) map[string]bool {
	names := map[string]bool{}
	n, err := formula.Parse(src)
	if err != nil {
		return names
	}
	formula.Walk(n, func(n formula.Node) bool {
		if name, ok := n.(*formula.Name); ok {
			names[name.Ident] = true
		}
		return true
	})
	return names
}

// checkObserve evaluates the formulas once, so that a fault shows before any work is done.
func (r *reader) checkObserve() {
	for _, o := range r.observed {
		for _, t := range []ladder.Term{o.Term, o.Second} {
			if t.Formula == "" {
				continue
			}
			if _, err := r.model.Scope.Places(t); err != nil {
				r.blameTerm(o.section, err)
			}
		}
	}
}
