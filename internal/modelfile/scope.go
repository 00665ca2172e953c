package modelfile

import (
	"rundle/mpo/ladder"
	"rundle/mpo/ladder/formula"
)

// maxConstants bounds the names of a file.
const maxConstants = 1000

// readScope reads [constants] and [profile].
func (r *reader) readScope() {
	r.constants = ladder.Constants{}
	good := r.model.Ladder != nil
	constants := r.single("constants")
	profiles := r.single("profile")
	if n := len(constants.table.entries) + len(profiles.table.entries); n > maxConstants {
		r.fault(constants.at, "", "%d constants and profiles; expected at most %d", n, maxConstants)
		return
	}
	broken := map[string]bool{}
	for _, e := range constants.table.entries {
		r.names[e.key] = e
		if dependsOn(e.value, broken) || !r.readConstant(constants, e) {
			broken[e.key], good = true, false
		}
	}
	for _, e := range profiles.table.entries {
		p, ok := r.readProfile(profiles, e)
		if ok && good {
			if _, err := ladder.NewScope(r.model.Ladder, r.constants, p); err != nil {
				sub := section{table: profiles.table}
				r.blame(err, e.at, sub.values()...)
				ok = false
			}
		}
		good = good && ok
		r.profiles = append(r.profiles, p)
		r.known = append(r.known, e.key)
	}
	if !good {
		return
	}
	scope, err := ladder.NewScope(r.model.Ladder, r.constants, r.profiles...)
	if err != nil {
		r.blame(err, constants.at)
		return
	}
	r.model.Scope = scope
}

// readConstant reads a number or evaluates a formula of earlier constants.
func (r *reader) readConstant(s *section, e *entry) bool {
	v := e.value
	x := v.float
	switch v.kind {
	case integer, float:
		if !r.finite(v, e.key) {
			return false
		}
	case text:
		if !r.syntax(v, formula.Parse) {
			return false
		}
		if r.model.Ladder == nil {
			return true
		}
		scope, err := ladder.NewScope(r.model.Ladder, r.constants)
		if err == nil {
			x, err = scope.Number(v.text)
		}
		if err != nil {
			r.blame(r.ahead(err, s, e), v.at, v)
			return false
		}
	default:
		s.wrong(e, "a number or a formula in quotes")
		return false
	}
	if r.model.Ladder != nil {
		// The constant alone: an error is then about its name or value.
		if _, err := ladder.NewScope(r.model.Ladder, ladder.Constants{e.key: x}); err != nil {
			r.blame(err, e.at, v)
			return false
		}
	}
	r.constants[e.key] = x
	r.known = append(r.known, e.key)
	return true
}

// dependsOn reports whether a formula uses one of the names: those at fault already, which need no second error.
func dependsOn(v *value, names map[string]bool) bool {
	if v.kind != text {
		return false
	}
	for name := range namesIn(v.text) {
		if names[name] {
			return true
		}
	}
	return false
}

// ahead adds a hint where a constant is used before the line that defines it.
func (r *reader) ahead(err error, s *section, e *entry) error {
	n, parseErr := formula.Parse(e.value.text)
	if parseErr != nil {
		return err
	}
	formula.Walk(n, func(n formula.Node) bool {
		name, ok := n.(*formula.Name)
		if !ok {
			return true
		}
		if later := s.table.byKey[name.Ident]; later != nil && later.at >= e.at {
			err = formula.Errorf(e.value.text, name.At, "constants are read from top to bottom: move it up", "%q is not defined before this line", name.Ident)
		}
		return true
	})
	return err
}

// readProfile reads a formula, a list of numbers, or a table with a formula and a seed.
func (r *reader) readProfile(s *section, e *entry) (ladder.Profile, bool) {
	p := ladder.Profile{Name: e.key}
	if before := r.names[e.key]; before != nil {
		r.repeated(&value{at: e.at}, "constant or profile", e.key, before.value)
		return p, false
	}
	r.names[e.key] = e
	v := e.value
	if v.kind == group {
		sub := &section{source: r.source, name: "profile \"" + e.key + "\"", at: v.at, table: v.table}
		inner := sub.need("formula", "formula = \"uniform(-W, W)\"")
		seed, _ := sub.whole(sub.lookup("seed"), 0, 1<<62)
		sub.done()
		if _, ok := sub.text(inner); !ok {
			return p, false
		}
		p.Seed, v = uint64(seed), inner.value
	}
	switch v.kind {
	case text:
		p.Formula = v.text
		if _, err := formula.Parse(v.text); err != nil {
			r.blame(err, v.at, v)
			return p, false
		}
		return p, true
	case list:
		for _, item := range v.items {
			if item.kind != integer && item.kind != float {
				r.fault(item.at, "", "profile %q holds %s; expected numbers", e.key, item.kind)
				return p, false
			}
			if !r.finite(item, e.key) {
				return p, false
			}
			p.Values = append(p.Values, item.float)
		}
		if lad := r.model.Ladder; lad != nil && len(p.Values) != lad.Rungs() && len(p.Values) != lad.Sites() {
			r.fault(v.at, "", "profile %q has %d numbers; expected one a rung, %d, or one a site, %d", e.key, len(p.Values), lad.Rungs(), lad.Sites())
			return p, false
		}
		return p, true
	}
	s.wrong(e, "a formula, a list of numbers or { formula = ..., seed = ... }")
	return p, false
}
