package ladder

import (
	"errors"
	"fmt"
	"maps"
	"slices"
	"strings"

	"rundle/mpo/ladder/formula"
)

// source is a formula as errors quote it.
type source struct{ term, part, text string }

// origin is a place in a formula.
type origin struct {
	*source
	offset int
}

func (o origin) fail(hint, format string, args ...any) *Error {
	return &Error{Term: o.term, Part: o.part, Source: o.text, Offset: o.offset, Msg: fmt.Sprintf(format, args...), Hint: hint}
}

// wrap gives an error that knows no place the place o.
func (o origin) wrap(err error) error {
	var known *Error
	if err == nil || err == errAbsent || errors.As(err, &known) {
		return err
	}
	return o.fail("", "%s", err.Error())
}

func (s *source) parsed(n formula.Node, err error) (formula.Node, error) {
	return n, s.located(err)
}

// located takes over an error of the parser.
func (s *source) located(err error) error {
	if err == nil {
		return nil
	}
	e := fromFormula(s.text, err)
	e.Term, e.Part = s.term, s.part
	return e
}

// index is what is known of an index while compiling.
type index struct {
	slot  int
	leg   bool
	moves bool // differs from place to place
	bound bool // its range depends on an index that moves
	used  *bool
}

// compiler turns the syntax trees of one term into expressions.
type compiler struct {
	*source
	scope     *Scope
	indices   map[string]index
	slots     int
	condition bool // legs compare by position
	inProfile bool // the name leg is known
}

func (c *compiler) at(n formula.Node) origin { return origin{c.source, n.Pos()} }

// compile returns the expression of n, numbers already evaluated.
func (c *compiler) compile(n formula.Node) (expr, error) {
	switch n := n.(type) {
	case *formula.Number:
		return constant(complex(n.Value, 0)), nil
	case *formula.Name:
		return c.name(n)
	case *formula.Indexed:
		return c.indexed(n)
	case *formula.Dot:
		return c.dot(n)
	case *formula.Unary:
		x, err := c.compile(n.X)
		if err != nil {
			return nil, err
		}
		return c.reduce(negation{x}, x)
	case *formula.Binary:
		return c.binary(n)
	case *formula.Call:
		return c.call(n)
	case *formula.Fold:
		return c.fold(n)
	case *formula.Conj:
		x, err := c.compile(n.X)
		if err != nil {
			return nil, err
		}
		return c.reduce(&conjugation{x, n.Minus, c.at(n)}, x)
	}
	return nil, c.at(n).fail("", "a condition where a number or operator is expected")
}

// reduce evaluates e if all its parts are numbers.
func (c *compiler) reduce(e expr, parts ...expr) (expr, error) {
	for _, p := range parts {
		if _, ok := p.(constant); !ok {
			return e, nil
		}
	}
	v, err := e.eval(newFrame(c.scope.ladder, 0))
	if err != nil {
		return nil, err
	}
	return constant(v.z), nil
}

func (c *compiler) binary(n *formula.Binary) (expr, error) {
	x, err := c.compile(n.X)
	if err != nil {
		return nil, err
	}
	y, err := c.compile(n.Y)
	if err != nil {
		return nil, err
	}
	return c.reduce(&binary{n.Op, x, y, c.at(n)}, x, y)
}

func (c *compiler) call(n *formula.Call) (expr, error) {
	args := make([]expr, len(n.Args))
	for i, a := range n.Args {
		var err error
		if args[i], err = c.compile(a); err != nil {
			return nil, err
		}
	}
	return c.reduce(&call{n.Name, args, c.at(n)}, args...)
}

func (c *compiler) fold(n *formula.Fold) (expr, error) {
	from, err := c.whole(n.From)
	if err != nil {
		return nil, err
	}
	to, err := c.whole(n.To)
	if err != nil {
		return nil, err
	}
	if err := c.newIndex(n.Var, origin{c.source, n.VarAt}); err != nil {
		return nil, err
	}
	slot := c.slots
	c.slots++
	moves := c.depends(n.From, true) || c.depends(n.To, true)
	c.indices[n.Var] = index{slot: slot, moves: moves, bound: moves, used: new(bool)}
	defer delete(c.indices, n.Var)
	body, err := c.compile(n.Body)
	if err != nil {
		return nil, err
	}
	return &fold{slot, from, to, body, n.Product, c.at(n)}, nil
}

// whole compiles a bound.
func (c *compiler) whole(n formula.Node) (whole, error) {
	x, err := c.compile(n)
	return whole{x, c.at(n)}, err
}

// depends reports whether an index occurs below n, with moving one that differs from place to place.
func (c *compiler) depends(n formula.Node, moving bool) bool {
	found := false
	formula.Walk(n, func(m formula.Node) bool {
		if name, ok := m.(*formula.Name); ok {
			if x, ok := c.indices[name.Ident]; ok && (x.moves || !moving) {
				found = true
			}
		}
		return !found
	})
	return found
}

// newIndex checks that a name may become an index.
func (c *compiler) newIndex(name string, at origin) error {
	if _, ok := c.indices[name]; ok {
		return at.fail("choose another name", "%q is already an index", name)
	}
	if what := c.scope.taken(name); what != "" {
		return at.fail("choose another name", "an index named %q: that is %s", name, what)
	}
	return nil
}

func (c *compiler) name(n *formula.Name) (expr, error) {
	if x, ok := c.indices[n.Ident]; ok {
		*x.used = true
		return variable(x.slot), nil
	}
	switch n.Ident {
	case "i":
		return constant(1i), nil
	case "pi":
		return constant(pi), nil
	case "rungs":
		return constant(complex(float64(c.scope.ladder.rungs), 0)), nil
	}
	if v, ok := c.scope.constants[n.Ident]; ok {
		return constant(complex(v, 0)), nil
	}
	leg := c.scope.ladder.legIndex(n.Ident)
	if leg >= 0 && c.condition {
		return constant(complex(float64(leg), 0)), nil
	}
	return nil, c.unknownName(n, leg >= 0)
}

func (c *compiler) unknownName(n *formula.Name, leg bool) error {
	at := c.at(n)
	switch {
	case n.Ident == "j":
		return at.fail("j runs over the rungs in the formulas of terms and profiles", "no index \"j\" here")
	case c.scope.profile(n.Ident) != nil:
		return at.fail(fmt.Sprintf("write %s[j] or %s[leg,j]", n.Ident, n.Ident), "profile %q without its place", n.Ident)
	case c.scope.isOperator(n.Ident, ""):
		return at.fail(fmt.Sprintf("write %s[leg,rung]", n.Ident), "operator %q without its place", n.Ident)
	case leg:
		return at.fail("legs stand in brackets, as in n["+n.Ident+",j]", "%q is a leg, not a number", n.Ident)
	}
	return at.fail(c.known(), "unknown symbol %q", n.Ident)
}

// known lists the names that would have been understood.
func (c *compiler) known() string {
	var parts []string
	add := func(what string, names []string) {
		if len(names) > 12 {
			names = append(slices.Clip(names[:12]), "...")
		}
		if len(names) > 0 {
			parts = append(parts, what+": "+strings.Join(names, ", "))
		}
	}
	add("constants", slices.Sorted(maps.Keys(c.scope.constants)))
	add("indices", slices.Sorted(maps.Keys(c.indices)))
	add("always", []string{"pi", "i", "rungs"})
	return strings.Join(parts, "; ")
}

// indexed is an operator or a profile at a place.
func (c *compiler) indexed(n *formula.Indexed) (expr, error) {
	at := c.at(n)
	if p := c.scope.profile(n.Name); p != nil && n.Super == "" {
		return c.profileAt(n, p)
	}
	if _, ok := c.scope.constants[n.Name]; ok {
		return nil, at.fail("constants stand without brackets; numbers that depend on the place are profiles", "constant %q with a place", n.Name)
	}
	if _, ok := c.indices[n.Name]; ok {
		return nil, at.fail("indices stand without brackets", "index %q with a place", n.Name)
	}
	if c.inProfile {
		return nil, at.fail("profiles are formulas of j, leg and numbers", "%q with a place in a profile", n.Symbol())
	}
	if len(n.Indices) != 2 {
		return nil, at.fail(fmt.Sprintf("write %s[leg,rung]", n.Symbol()), "%q with %s", n.Symbol(), plural(len(n.Indices), "index"))
	}
	place, err := c.site(n.Indices[0], n.Indices[1])
	if err != nil {
		return nil, err
	}
	return c.operator(n, n.Super, place)
}

// operator finds name^super on every leg that the place can be on.
func (c *compiler) operator(n *formula.Indexed, super string, place siteIndex) (expr, error) {
	l := c.scope.ladder
	o := &operator{symbol: n.Symbol(), at: place, origin: c.at(n), byLeg: make([][]Weighted, len(l.legs))}
	some := false
	for k, g := range l.legs {
		if w, ok := g.site.Symbol(n.Name, super); ok {
			o.byLeg[k], some = w, true
		}
	}
	if place.leg.slot < 0 && place.leg.shift == nil && o.byLeg[place.leg.leg] == nil {
		return nil, unknownOperator(o.origin, l, place.leg.leg, o.symbol)
	}
	if !some {
		return nil, unknownOperator(o.origin, l, 0, o.symbol)
	}
	return o, nil
}

// dot is S.S = S^z S^z + (S^+ S^- + S^- S^+)/2.
func (c *compiler) dot(n *formula.Dot) (expr, error) {
	var parts [2]map[string]expr
	for k, x := range []*formula.Indexed{n.A, n.B} {
		if x.Name != "S" {
			return nil, c.at(x).fail("only S[leg,rung].S[leg,rung] is a scalar product", "%q in a scalar product", x.Name)
		}
		if len(x.Indices) != 2 {
			return nil, c.at(x).fail("write S[leg,rung].S[leg,rung]", "%q with %s", x.Name, plural(len(x.Indices), "index"))
		}
		place, err := c.site(x.Indices[0], x.Indices[1])
		if err != nil {
			return nil, err
		}
		parts[k] = make(map[string]expr)
		for _, super := range []string{"z", "+", "-"} {
			if parts[k][super], err = c.operator(x, super, place); err != nil {
				return nil, err
			}
		}
	}
	at := c.at(n)
	product := func(a, b string) expr { return &binary{'*', parts[0][a], parts[1][b], at} }
	flips := &binary{'+', product("+", "-"), product("-", "+"), at}
	return &binary{'+', product("z", "z"), &binary{'*', constant(0.5), flips, at}, at}, nil
}

func (c *compiler) site(leg, rung formula.Node) (siteIndex, error) {
	l, err := c.leg(leg)
	if err != nil {
		return siteIndex{}, err
	}
	r, err := c.rung(rung)
	return siteIndex{l, r}, err
}

// leg compiles the first index of an operator: a leg, an index over legs, or one of them plus or minus a whole number.
func (c *compiler) leg(n formula.Node) (legIndex, error) {
	at := c.at(n)
	switch n := n.(type) {
	case *formula.Name:
		if x, ok := c.indices[n.Ident]; ok {
			*x.used = true
			if !x.leg {
				return legIndex{}, at.fail("write [leg,rung]; legs: "+c.scope.ladder.legNames(), "index %q is a number where a leg is expected", n.Ident)
			}
			return legIndex{slot: x.slot, at: at}, nil
		}
		if k := c.scope.ladder.legIndex(n.Ident); k >= 0 {
			return legIndex{slot: -1, leg: k, at: at}, nil
		}
		return legIndex{}, at.fail("legs: "+c.scope.ladder.legNames(), "unknown leg %q", n.Ident)
	case *formula.Binary:
		if n.Op != '+' && n.Op != '-' {
			break
		}
		x, err := c.leg(n.X)
		if err != nil {
			return legIndex{}, err
		}
		y, err := c.compile(n.Y)
		if err != nil {
			return legIndex{}, err
		}
		if n.Op == '-' {
			if y, err = c.reduce(negation{y}, y); err != nil {
				return legIndex{}, err
			}
		}
		if x.shift != nil {
			if y, err = c.reduce(&binary{'+', x.shift.x, y, at}, x.shift.x, y); err != nil {
				return legIndex{}, err
			}
		}
		x.shift, x.at = &whole{y, at}, at
		return x, nil
	}
	return legIndex{}, at.fail("legs: "+c.scope.ladder.legNames(), "expected a leg")
}

func (c *compiler) rung(n formula.Node) (rungIndex, error) {
	at := c.at(n)
	if name, ok := n.(*formula.Name); ok {
		if x, ok := c.indices[name.Ident]; ok {
			*x.used = true
			if x.leg {
				return rungIndex{}, at.fail("write [leg,rung]", "index %q is a leg where a rung is expected", name.Ident)
			}
			return rungIndex{slot: x.slot, wraps: x.bound, skips: x.bound, moves: x.moves, at: at}, nil
		}
	}
	x, err := c.compile(n)
	if err != nil {
		if name, ok := n.(*formula.Name); ok && c.scope.ladder.legIndex(name.Ident) >= 0 {
			return rungIndex{}, at.fail("write [leg,rung]", "leg %q where a rung is expected", name.Ident)
		}
		return rungIndex{}, err
	}
	moves := c.depends(n, true)
	r := rungIndex{slot: -1, general: whole{x, at}, wraps: c.depends(n, false), skips: moves, moves: moves, at: at}
	if b, ok := x.(*binary); ok && (b.op == '+' || b.op == '-') {
		v, isVar := b.x.(variable)
		k, isNum := b.y.(constant)
		if shift := real(complex128(k)); isVar && isNum && imag(complex128(k)) == 0 && shift == float64(int(shift)) && shift < 1e9 {
			r.slot, r.offset = int(v), int(shift)
			if b.op == '-' {
				r.offset = -r.offset
			}
		}
	}
	return r, nil
}

// profileAt is a profile with its place: [rung] or [leg,rung].
func (c *compiler) profileAt(n *formula.Indexed, p *profile) (expr, error) {
	at := c.at(n)
	switch len(n.Indices) {
	case 1:
		if p.byRung == nil {
			return nil, at.fail(fmt.Sprintf("write %s[leg,rung]", n.Name), "profile %q depends on the leg", n.Name)
		}
		r, err := c.rung(n.Indices[0])
		return &localNumber{values: p.byRung, rung: r}, err
	case 2:
		place, err := c.site(n.Indices[0], n.Indices[1])
		if p.bySite == nil {
			return &localNumber{values: p.byRung, site: &place}, err
		}
		return &localNumber{values: p.bySite, site: &place, bySite: true}, err
	}
	return nil, at.fail(fmt.Sprintf("write %s[rung] or %s[leg,rung]", n.Name, n.Name), "profile %q with %s", n.Name, plural(len(n.Indices), "index"))
}
