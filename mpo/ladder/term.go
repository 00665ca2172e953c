package ladder

import (
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"

	"rundle/mpo/ladder/formula"
)

// Each gives the values of a term's further indices: "legs", "rungs", a range such as "1..rungs-1" (both ends included; it may depend on j
// and on other indices), a leg, a number, or a list of legs or of numbers ([]any, []string, []int, []float64).
type Each map[string]any

// Term is a formula with the places where it is put. The index j, where it occurs, runs over the rungs.
type Term struct {
	Name    string `json:"name,omitempty"` // for errors; empty: the formula serves
	Formula string `json:"formula"`
	Each    Each   `json:"each,omitempty"`
	Where   string `json:"where,omitempty"` // condition on the indices; empty: none
}

func (t Term) title() string {
	if t.Name != "" {
		return t.Name
	}
	return t.Formula
}

// domain is an index with the values it takes: a list, or a range that other indices may bound.
type domain struct {
	name     string
	slot     int
	leg      bool
	values   []float64
	from, to whole // used where ranged
	ranged   bool
	bound    bool // the range depends on other indices
}

// compiled is a term ready to be evaluated.
type compiled struct {
	term    Term
	at      origin
	body    expr
	parts   []expr // the summands of body, where there are several
	where   condition
	domains []domain
	slots   int
}

// compile reads a term's formulas.
func (s *Scope) compile(t Term) (*compiled, error) {
	src := &source{term: t.title(), part: "formula", text: t.Formula}
	body, err := src.parsed(formula.Parse(t.Formula))
	if err != nil {
		return nil, err
	}
	var where formula.Node
	whereSource := &source{term: t.title(), part: "where", text: t.Where}
	if strings.TrimSpace(t.Where) != "" {
		if where, err = whereSource.parsed(formula.ParseCondition(t.Where)); err != nil {
			return nil, err
		}
	}
	out := &compiled{term: t, at: origin{src, 0}}
	c := &compiler{source: src, scope: s, indices: map[string]index{}}
	if err := c.domains(out, t, mentions(body, "j") || mentions(where, "j")); err != nil {
		return nil, err
	}
	c.source = src
	if out.body, err = c.compile(body); err != nil {
		return nil, err
	}
	if list := summands(body); len(list) > 1 {
		for _, n := range list {
			part, err := c.compile(n)
			if err != nil {
				return nil, err
			}
			out.parts = append(out.parts, part)
		}
	}
	if where != nil {
		c.source, c.condition = whereSource, true
		if out.where, err = c.conditionOf(where); err != nil {
			return nil, err
		}
	}
	for _, d := range out.domains {
		if !*c.indices[d.name].used {
			return nil, out.eachError(d.name, "use it in the formula or in where, or leave it out", "index %q is not used", d.name)
		}
	}
	out.slots = c.slots
	return out, nil
}

// summands lists what a formula adds up, its Hermitian conjugate left out.
func summands(n formula.Node) []formula.Node {
	switch x := n.(type) {
	case *formula.Conj:
		return summands(x.X)
	case *formula.Unary:
		return summands(x.X)
	case *formula.Binary:
		if x.Op == '+' || x.Op == '-' {
			return append(summands(x.X), summands(x.Y)...)
		}
	}
	return []formula.Node{n}
}

func mentions(n formula.Node, name string) bool {
	if n == nil {
		return false
	}
	found := false
	formula.Walk(n, func(m formula.Node) bool {
		if x, ok := m.(*formula.Name); ok && x.Ident == name {
			found = true
		}
		return !found
	})
	return found
}

func (t *compiled) eachError(name, hint, format string, args ...any) error {
	return &Error{Term: t.term.title(), Part: fmt.Sprintf("each %q", name), Msg: fmt.Sprintf(format, args...), Hint: hint}
}

// domains makes the indices known, those first on which the ranges of others depend: j, then by name.
func (c *compiler) domains(out *compiled, t Term, withJ bool) error {
	names := slices.Sorted(maps.Keys(t.Each))
	spans := map[string][2]formula.Node{}
	sources := map[string]*source{}
	for _, name := range names {
		if !identifier(name) {
			return out.eachError(name, "a letter, then letters, digits and _", "index name %q", name)
		}
		if what := c.scope.taken(name); what != "" {
			return out.eachError(name, "choose another name", "an index named %q: that is %s", name, what)
		}
		if span, ok := t.Each[name].(string); ok && strings.Contains(span, "..") {
			src := &source{term: t.title(), part: fmt.Sprintf("each %q", name), text: span}
			from, to, err := formula.ParseRange(span)
			if err != nil {
				return src.located(err)
			}
			spans[name], sources[name] = [2]formula.Node{from, to}, src
			withJ = withJ || mentions(from, "j") || mentions(to, "j")
		}
	}
	if withJ {
		c.addDomain(out, domain{name: "j", values: counting(c.scope.ladder.rungs)})
	}
	for len(names) > 0 {
		ready := slices.IndexFunc(names, func(name string) bool {
			s := spans[name]
			return !slices.ContainsFunc(names, func(other string) bool { return mentions(s[0], other) || mentions(s[1], other) })
		})
		if ready < 0 {
			return out.eachError(names[0], "each range may use j and indices that do not use it", "the ranges of %s depend on one another", strings.Join(names, ", "))
		}
		name := names[ready]
		names = slices.Delete(names, ready, ready+1)
		if src := sources[name]; src != nil {
			if err := c.addRange(out, name, src, spans[name]); err != nil {
				return err
			}
		} else if err := c.addList(out, name, t.Each[name]); err != nil {
			return err
		}
	}
	return nil
}

func (c *compiler) addDomain(out *compiled, d domain) {
	d.slot = c.slots
	c.slots++
	c.indices[d.name] = index{slot: d.slot, leg: d.leg, moves: true, bound: d.bound, used: new(bool)}
	out.domains = append(out.domains, d)
}

func counting(n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = float64(i)
	}
	return v
}

func (c *compiler) addRange(out *compiled, name string, src *source, span [2]formula.Node) error {
	c.source = src
	d := domain{name: name, ranged: true}
	var err error
	if d.from, err = c.whole(span[0]); err != nil {
		return err
	}
	if d.to, err = c.whole(span[1]); err != nil {
		return err
	}
	d.bound = c.depends(span[0], true) || c.depends(span[1], true)
	c.addDomain(out, d)
	return nil
}

// addList takes the values of an index that are not a range.
func (c *compiler) addList(out *compiled, name string, v any) error {
	d := domain{name: name}
	l := c.scope.ladder
	var items []any
	switch v := v.(type) {
	case string:
		switch v {
		case "legs":
			d.leg, d.values = true, counting(len(l.legs))
		case "rungs":
			d.values = counting(l.rungs)
		default:
			items = []any{v}
		}
	case []any:
		items = v
	case []string:
		items = anySlice(v)
	case []int:
		items = anySlice(v)
	case []int64:
		items = anySlice(v)
	case []float64:
		items = anySlice(v)
	default:
		items = []any{v}
	}
	if d.values == nil && len(items) == 0 {
		return out.eachError(name, `"legs", "rungs", a range such as "1..rungs-1", or a list`, "index %q has no values", name)
	}
	for i, item := range items {
		x, leg, err := c.item(out, name, item)
		if err != nil {
			return err
		}
		if i > 0 && leg != d.leg {
			return out.eachError(name, "give only legs or only numbers", "a list of legs and numbers")
		}
		if slices.Contains(d.values, x) {
			return out.eachError(name, "list each value once", "%v is listed twice", item)
		}
		d.leg, d.values = leg, append(d.values, x)
	}
	c.addDomain(out, d)
	return nil
}

func anySlice[T any](v []T) []any {
	out := make([]any, len(v))
	for i, x := range v {
		out[i] = x
	}
	return out
}

// item is one listed value: a leg's position or a number.
func (c *compiler) item(out *compiled, name string, v any) (x float64, leg bool, err error) {
	switch v := v.(type) {
	case string:
		if k := c.scope.ladder.legIndex(v); k >= 0 {
			return float64(k), true, nil
		}
		src := &source{term: out.term.title(), part: fmt.Sprintf("each %q", name), text: v}
		x, err := c.scope.number(src)
		if err != nil && identifier(v) {
			return 0, false, out.eachError(name, "legs: "+c.scope.ladder.legNames()+`; or "legs", "rungs", a range such as "1..rungs-1"`, "unknown leg %q", v)
		}
		return x, false, err
	case int:
		return float64(v), false, nil
	case int64:
		return float64(v), false, nil
	case float64:
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return 0, false, out.eachError(name, "", "the value %v is not a finite number", v)
		}
		return v, false, nil
	}
	return 0, false, out.eachError(name, `"legs", "rungs", a range such as "1..rungs-1", or a list of legs or numbers`, "cannot read the value %v", v)
}
