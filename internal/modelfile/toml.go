package modelfile

import (
	"errors"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"

	"github.com/pelletier/go-toml/v2/unstable"
)

// This file alone knows the TOML module's syntax tree, whose interface its authors do not promise to keep.

// parse reads the whole file into a tree. Faults are noted in src; the tree is nil if the text is no TOML at all.
func parse(src *source) *table {
	if !src.readable() {
		return nil
	}
	data := src.data[:len(src.data):len(src.data)] // the capacity tells offsets
	b := &builder{source: src, root: newTable(0, header)}
	b.current = b.root
	r := treeReader{builder: b}
	r.parser.Reset(data)
	for r.parser.NextExpression() {
		n := r.parser.Expression()
		switch n.Kind {
		case unstable.KeyValue:
			b.pair(b.current, r.key(n.Key()), r.value(n))
		case unstable.Table, unstable.ArrayTable:
			parts := r.key(n.Key())
			b.open(r.bracket(parts[0].at), parts, n.Kind == unstable.ArrayTable)
		}
	}
	if err := r.parser.Error(); err != nil {
		var p *unstable.ParserError
		at := len(data)
		if errors.As(err, &p) {
			at = len(data) - cap(p.Highlight)
		}
		src.fault(at, "", "not valid TOML: %s", strings.TrimPrefix(err.Error(), "toml: "))
		return nil
	}
	return b.root
}

// readable refuses what is no text before the parser sees it.
func (s *source) readable() bool {
	for at := 0; at < len(s.data); {
		r, size := utf8.DecodeRune(s.data[at:])
		switch {
		case r == utf8.RuneError && size == 1:
			s.fault(at, "expected a model file in TOML, saved as UTF-8", "not a text file: byte 0x%02x is not valid UTF-8", s.data[at])
			return false
		case r < ' ' && r != '\t' && r != '\n' && r != '\r' || r == 0x7f:
			s.fault(at, "expected a model file in TOML", "not a text file: control character 0x%02x", r)
			return false
		}
		at += size
	}
	return true
}

type treeReader struct {
	*builder
	parser unstable.Parser
}

func (r *treeReader) key(it unstable.Iterator) []part {
	var parts []part
	for it.Next() {
		n := it.Node()
		parts = append(parts, part{name: string(n.Data), at: int(n.Raw.Offset)})
	}
	return parts
}

// bracket is where the header begins whose first key is at the given offset.
func (r *treeReader) bracket(at int) int {
	for k := at - 1; k >= 0 && strings.IndexByte(" \t[", r.data[k]) >= 0; k-- {
		if r.data[k] == '[' {
			at = k
		}
	}
	return at
}

// value converts the value of a pair.
func (r *treeReader) value(pair *unstable.Node) *value {
	return r.convert(pair.Value(), r.afterEquals(pair))
}

// afterEquals is where the value of a pair begins; lists carry no place of their own.
func (r *treeReader) afterEquals(pair *unstable.Node) int {
	var at int
	it := pair.Key()
	for it.Next() {
		at = int(it.Node().Raw.Offset + it.Node().Raw.Length)
	}
	for at < len(r.data) && strings.IndexByte(" \t=", r.data[at]) >= 0 {
		at++
	}
	return at
}

// convert reads a value; at stands in where the node has no place.
func (r *treeReader) convert(n *unstable.Node, at int) *value {
	if n.Raw.Length > 0 {
		at = int(n.Raw.Offset)
	}
	v := &value{at: at, text: string(n.Data)}
	switch n.Kind {
	case unstable.String:
		v.kind, v.end = text, at+int(n.Raw.Length)
	case unstable.Bool:
		v.kind, v.boolean = boolean, v.text == "true"
	case unstable.Integer:
		r.whole(v)
	case unstable.Float:
		v.kind = float
		f, err := strconv.ParseFloat(strings.ReplaceAll(v.text, "_", ""), 64)
		if strings.HasSuffix(v.text, "nan") {
			f, err = math.NaN(), nil // strconv takes no sign before it
		}
		if err != nil {
			r.fault(at, "the largest is about 1.8e308", "number %s out of range", v.text)
		}
		v.float = f
	case unstable.Array:
		v.kind = list
		for it := n.Children(); it.Next(); {
			item := r.convert(it.Node(), at)
			at = item.at
			v.items = append(v.items, item)
		}
	case unstable.InlineTable:
		v.kind, v.table = group, newTable(at, inline)
		for it := n.Children(); it.Next(); {
			r.pair(v.table, r.key(it.Node().Key()), r.value(it.Node()))
		}
		r.seal(v.table)
	default:
		v.kind = date
	}
	return v
}

// seal closes an inline table: nothing may extend it or what is in it.
func (r *treeReader) seal(t *table) {
	for _, e := range t.entries {
		if e.value.kind == group && e.value.table.origin == dotted {
			e.value.table.origin = inline
			r.seal(e.value.table)
		}
	}
}

func (r *treeReader) whole(v *value) {
	v.kind = integer
	k, err := strconv.ParseInt(strings.TrimPrefix(strings.ReplaceAll(v.text, "_", ""), "+"), 0, 64)
	if err != nil {
		r.fault(v.at, "", "whole number %s out of range", v.text)
	}
	v.integer, v.float = k, float64(k)
}
