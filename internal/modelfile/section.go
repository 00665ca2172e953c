package modelfile

import (
	"fmt"
	"math"
	"slices"
	"strconv"
)

// section reads one table of the file: it remembers which keys were asked for, so that done can refuse the rest.
type section struct {
	*source
	name  string // as errors show it: "[ladder]", "[[leg]]"
	at    int
	table *table
	asked []string
}

// sections lists the keys of the top level.
var sections = []string{"title", "ladder", "leg", "constants", "profile", "term", "sector", "solve", "observe"}

// single opens a section with single brackets; the section is empty if the file does not have it.
func (s *section) single(key string) *section {
	e := s.lookup(key)
	sub := &section{source: s.source, name: "[" + key + "]", table: newTable(0, header)}
	switch {
	case e == nil:
	case e.value.appended:
		s.fault(e.value.at, "write ["+key+"]", "[[%s]] with double brackets; there is one such section", key)
	case e.value.kind != group:
		s.wrong(e, "a section ["+key+"]")
	default:
		sub.at, sub.table = e.value.at, e.value.table
	}
	return sub
}

// several opens the sections with double brackets of one name.
func (s *section) several(key string) []*section {
	e := s.lookup(key)
	if e == nil {
		return nil
	}
	if e.value.kind == group {
		s.fault(e.value.at, "write [["+key+"]]", "[%s] with single brackets; there may be several such sections", key)
		return nil
	}
	var all []*section
	for _, item := range e.value.items {
		if item.kind != group {
			s.fault(item.at, "write [["+key+"]]", "%q holds %s; expected sections", key, item.kind)
			continue
		}
		all = append(all, &section{source: s.source, name: "[[" + key + "]]", at: item.at, table: item.table})
	}
	if e.value.kind != list {
		s.wrong(e, "sections [["+key+"]]")
	}
	return all
}

// lookup returns the entry of a key, nil if absent.
func (s *section) lookup(key string) *entry {
	if !slices.Contains(s.asked, key) {
		s.asked = append(s.asked, key)
	}
	return s.table.byKey[key]
}

// need is lookup with a fault where the key is absent.
func (s *section) need(key, example string) *entry {
	e := s.lookup(key)
	if e == nil {
		s.fault(s.at, "add "+example, "%s has no key %q", s.name, key)
	}
	return e
}

// wrong notes a value of the wrong type.
func (s *section) wrong(e *entry, want string) {
	s.fault(e.value.at, "", "key %q in %s is %s; expected %s", e.key, s.label(), e.value.kind, want)
}

func (s *section) label() string {
	if s.name == "" {
		return "the file"
	}
	return s.name
}

// done refuses the keys that nothing asked for.
func (s *section) done() {
	for _, e := range s.table.entries {
		if !slices.Contains(s.asked, e.key) {
			s.fault(e.at, hint(e.key, "keys here", s.asked), "unknown key %q in %s", e.key, s.label())
		}
	}
}

// text returns a string that is not empty; e is nil where there is none.
func (s *section) text(e *entry) (string, bool) {
	switch {
	case e == nil:
		return "", false
	case e.value.kind != text:
		s.wrong(e, "a string in quotes")
		return "", false
	case e.value.text == "":
		s.fault(e.value.at, "", "key %q in %s is empty", e.key, s.label())
		return "", false
	}
	return e.value.text, true
}

// choice returns one of the given words.
func (s *section) choice(e *entry, words ...string) (string, bool) {
	t, ok := s.text(e)
	if ok && !slices.Contains(words, t) {
		s.fault(e.value.at, hint(t, "expected one of", words), "%s = %q in %s", e.key, t, s.label())
		return "", false
	}
	return t, ok
}

// whole returns a whole number from least to most.
func (s *section) whole(e *entry, least, most int64) (int64, bool) {
	switch {
	case e == nil:
		return 0, false
	case e.value.kind != integer:
		s.wrong(e, "a whole number, such as "+e.key+" = "+strconv.FormatInt(max(least, min(most, 4)), 10))
		return 0, false
	case e.value.integer < least:
		s.fault(e.value.at, between(least, most), "%s = %d in %s is too small", e.key, e.value.integer, s.label())
		return 0, false
	case e.value.integer > most:
		s.fault(e.value.at, between(least, most), "%s = %d in %s is too large", e.key, e.value.integer, s.label())
		return 0, false
	}
	return e.value.integer, true
}

func between(least, most int64) string {
	if most == math.MaxInt64 {
		return fmt.Sprintf("expected %d or more", least)
	}
	return fmt.Sprintf("expected %d to %d", least, most)
}

// positive returns a finite number above zero.
func (s *section) positive(e *entry) (float64, bool) {
	x, ok := s.number(e)
	if ok && x <= 0 {
		s.fault(e.value.at, "expected a number above 0", "%s = %v in %s", e.key, x, s.label())
		return 0, false
	}
	return x, ok
}

// number returns a finite number.
func (s *section) number(e *entry) (float64, bool) {
	if e == nil {
		return 0, false
	}
	if e.value.kind != float && e.value.kind != integer {
		s.wrong(e, "a number")
		return 0, false
	}
	return e.value.float, s.finite(e.value, e.key)
}

// finite refuses nan and inf.
func (s *source) finite(v *value, key string) bool {
	if math.IsNaN(v.float) || math.IsInf(v.float, 0) {
		s.fault(v.at, "expected a finite number", "%s is %s", key, v.text)
		return false
	}
	return true
}

func (s *section) flag(e *entry) (value, ok bool) {
	if e == nil {
		return false, false
	}
	if e.value.kind != boolean {
		s.wrong(e, "true or false")
		return false, false
	}
	return e.value.boolean, true
}

// words returns a list of strings.
func (s *section) words(e *entry) ([]string, bool) {
	if e == nil {
		return nil, false
	}
	if e.value.kind != list {
		s.wrong(e, "a list of strings")
		return nil, false
	}
	var all []string
	for _, item := range e.value.items {
		if item.kind != text {
			s.fault(item.at, "", "key %q in %s holds %s; expected strings in quotes", e.key, s.label(), item.kind)
			return nil, false
		}
		all = append(all, item.text)
	}
	return all, true
}
