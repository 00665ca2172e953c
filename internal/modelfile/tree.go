package modelfile

import "strings"

// kind is the type of a TOML value.
type kind byte

const (
	text kind = iota
	integer
	float
	boolean
	date
	list
	group // a table
)

// String names the kind as errors do.
func (k kind) String() string {
	return [...]string{"a string", "a whole number", "a number", "true or false", "a date or time", "a list", "a table"}[k]
}

// value is a TOML value with its place. Only the fields of its kind are set.
type value struct {
	kind    kind
	at      int // offset of its first byte
	end     int // offset behind its last byte; strings only
	text    string
	integer int64
	float   float64 // also of integers
	boolean bool
	items   []*value
	table   *table
	// appended marks a list that [[headers]] build.
	appended bool
}

// origin tells how a table came about, which decides who may extend it.
type origin byte

const (
	implied origin = iota // by a longer header
	header
	dotted // by a dotted key
	inline
)

// table keeps its entries in the order of the file.
type table struct {
	at      int
	origin  origin
	entries []*entry
	byKey   map[string]*entry
}

type entry struct {
	key   string
	at    int // offset of the key
	value *value
}

func newTable(at int, o origin) *table { return &table{at: at, origin: o, byKey: map[string]*entry{}} }

func (t *table) add(key string, at int, v *value) {
	e := &entry{key: key, at: at, value: v}
	t.entries = append(t.entries, e)
	t.byKey[key] = e
}

// part is one part of a dotted key.
type part struct {
	name string
	at   int
}

func path(parts []part) string {
	var s []string
	for _, p := range parts {
		s = append(s, p.name)
	}
	return strings.Join(s, ".")
}

// builder assembles the tree from headers and pairs; it notes faults and goes on.
type builder struct {
	*source
	root    *table
	current *table // that pairs go into
}

// maxParts bounds the parts of a dotted key: no section nests deeper, and each costs a table.
const maxParts = 8

func (b *builder) shallow(parts []part) bool {
	if len(parts) <= maxParts {
		return true
	}
	b.fault(parts[0].at, "", "key of %d parts; expected at most %d", len(parts), maxParts)
	return false
}

// open follows [a.b.c] or, with another set, [[a.b.c]], and makes the table that pairs go into.
func (b *builder) open(at int, parts []part, another bool) {
	b.current = newTable(at, header) // takes the pairs in if the header is at fault
	if !b.shallow(parts) {
		return
	}
	t := b.root
	for _, p := range parts[:len(parts)-1] {
		e := t.byKey[p.name]
		switch {
		case e == nil:
			next := newTable(at, implied)
			t.add(p.name, p.at, &value{kind: group, at: at, table: next})
			t = next
		case e.value.kind == group && e.value.table.origin != inline:
			t = e.value.table
		case e.value.appended:
			t = e.value.items[len(e.value.items)-1].table
		default:
			b.fault(p.at, "", "%q is a value already, no table that could be extended", p.name)
			return
		}
	}
	last := parts[len(parts)-1]
	e := t.byKey[last.name]
	if another {
		b.openAnother(at, parts, t, e)
		return
	}
	switch {
	case e == nil:
		t.add(last.name, last.at, &value{kind: group, at: at, table: b.current})
	case e.value.kind == group && e.value.table.origin == implied:
		b.current = e.value.table
		b.current.at, b.current.origin, e.value.at = at, header, at
	case e.value.appended:
		b.fault(at, "write [["+path(parts)+"]]", "[%s] with single brackets after [[%s]] with double ones", path(parts), path(parts))
	default:
		b.fault(at, "keep one of them", "[%s] for the second time", path(parts))
	}
}

func (b *builder) openAnother(at int, parts []part, t *table, e *entry) {
	last := parts[len(parts)-1]
	item := &value{kind: group, at: at, table: b.current}
	switch {
	case e == nil:
		t.add(last.name, last.at, &value{kind: list, at: at, items: []*value{item}, appended: true})
	case e.value.appended:
		e.value.items = append(e.value.items, item)
	default:
		b.fault(at, "keep one form", "[[%s]] after another definition of %q", path(parts), path(parts))
	}
}

// pair puts a value under a dotted key of t.
func (b *builder) pair(t *table, parts []part, v *value) {
	if !b.shallow(parts) {
		return
	}
	for _, p := range parts[:len(parts)-1] {
		e := t.byKey[p.name]
		switch {
		case e == nil:
			next := newTable(p.at, dotted)
			t.add(p.name, p.at, &value{kind: group, at: p.at, table: next})
			t = next
		case e.value.kind == group && e.value.table.origin == dotted:
			t = e.value.table
		default:
			b.fault(p.at, "keep one of them", "%q is defined already", p.name)
			return
		}
	}
	last := parts[len(parts)-1]
	if first := t.byKey[last.name]; first != nil {
		b.fault(last.at, "keep one of them", "key %q for the second time, first in line %d", last.name, b.place(first.at, "", "").Line)
		return
	}
	t.add(last.name, last.at, v)
}
