package formula

// The binding powers of design: a loop in expression takes an infix sign as long as its power is at least the caller's.
const (
	bindOr = 10 * (iota + 1)
	bindAnd
	bindNot
	bindCompare
	bindSum
	bindProduct
	bindSign
	bindPower
)

type parser struct {
	src   string
	toks  []token
	at    int // index of the next token
	depth int
	// plain is positive inside brackets and bounds, where only numbers and names may stand.
	plain     int
	condition bool
}

func newParser(src string, condition bool) (*parser, error) {
	toks, err := scan(src)
	if err != nil {
		return nil, err
	}
	return &parser{src: src, toks: toks, condition: condition}, nil
}

func (p *parser) next() token { return p.toks[p.at] }

func (p *parser) take() token {
	t := p.toks[p.at]
	if t.kind != end {
		p.at++
	}
	return t
}

func (p *parser) fail(at int, hint, format string, args ...any) error {
	return Errorf(p.src, at, hint, format, args...)
}

// enter counts one more level of nesting; the caller ends it with p.depth--.
func (p *parser) enter(at int) error {
	if p.depth++; p.depth > MaxDepth {
		return p.fail(at, "split the formula into several terms", "nested more than %d deep", MaxDepth)
	}
	return nil
}

// number reads an expression and refuses a condition.
func (p *parser) number() (Node, error) {
	n, err := p.expression(bindOr)
	if err != nil {
		return nil, err
	}
	return n, p.wantNumber(n)
}

// expression reads an operand and all infix signs after it that bind at least as tightly as bind.
func (p *parser) expression(bind int) (Node, error) {
	left, err := p.operand()
	for err == nil {
		t := p.next()
		power := p.infix(t)
		if power == 0 || power < bind {
			break
		}
		left, err = p.extend(left, t, power)
	}
	return left, err
}

// infix is the binding power of a token after an operand, 0 where none can stand.
func (p *parser) infix(t token) int {
	switch t.kind {
	case end:
		return 0
	case number, conjugate:
		return bindProduct
	case name:
		switch t.text {
		case "or":
			return bindOr
		case "and":
			return bindAnd
		case "not":
			return 0
		}
		return bindProduct
	}
	switch t.text {
	case "==", "!=", "<", "<=", ">", ">=":
		return bindCompare
	case "+", "-":
		return bindSum
	case "*", "/", "%", "(":
		return bindProduct
	case "^":
		return bindPower
	}
	return 0
}

// extend reads what follows left, beginning with the infix token t.
func (p *parser) extend(left Node, t token, power int) (Node, error) {
	switch power {
	case bindOr, bindAnd:
		return p.logic(left, t, power)
	case bindCompare:
		return p.compare(left, t)
	case bindSum:
		p.take()
		if p.next().kind == conjugate {
			return p.conjugate(left, t)
		}
		return p.binary(left, t, power+1, false)
	case bindPower:
		return p.power(left, t)
	}
	if t.kind == conjugate {
		return nil, p.loneConjugate(t)
	}
	if t.kind == sign && t.text != "(" {
		p.take()
		return p.binary(left, t, power+1, false)
	}
	if t.kind == number && p.toks[p.at-1].kind == number {
		return nil, p.fail(t.at, "put a sign between them", "two numbers side by side")
	}
	return p.binary(left, t, power+1, true)
}

func (p *parser) binary(left Node, t token, bind int, implicit bool) (Node, error) {
	right, err := p.expression(bind)
	if err != nil {
		return nil, err
	}
	op := byte('*')
	if !implicit {
		op = t.text[0]
	}
	if err := p.wantNumber(left, right); err != nil {
		return nil, err
	}
	return &Binary{At: t.at, Op: op, Implicit: implicit, X: left, Y: right}, nil
}

func (p *parser) power(left Node, t token) (Node, error) {
	p.take()
	if err := p.enter(t.at); err != nil {
		return nil, err
	}
	defer func() { p.depth-- }()
	if after := p.next(); after.is("+") {
		if n, ok := left.(*Name); ok {
			return nil, p.fail(n.At, "write "+n.Ident+"^+[leg,rung]", "operator \"%s^+\" without [leg,rung]", n.Ident)
		}
		return nil, p.fail(after.at, "the superscript stands between the name and its bracket, as in b^+[leg,rung]", "superscript + in the wrong place")
	}
	return p.binary(left, t, bindPower, false)
}

func (p *parser) conjugate(left Node, t token) (Node, error) {
	c := p.take()
	switch {
	case p.condition:
		return nil, p.fail(c.at, "", "h.c. in a condition")
	case p.plain > 0:
		return nil, p.fail(c.at, "", "h.c. among numbers")
	}
	if after := p.infix(p.next()); after >= bindProduct {
		return nil, p.loneConjugate(c)
	}
	if err := p.wantNumber(left); err != nil {
		return nil, err
	}
	return &Conj{At: t.at, Minus: t.text == "-", X: left}, nil
}

func (p *parser) loneConjugate(t token) error {
	return p.fail(t.at, "write \"+ h.c.\" or \"- h.c.\" at the end of the formula or before a closing parenthesis", "h.c. is no factor: it stands alone after a + or -")
}

func (p *parser) compare(left Node, t token) (Node, error) {
	p.take()
	if !p.condition || p.plain > 0 {
		return nil, p.fail(t.at, "conditions belong into where", "comparison %q in a formula", t.text)
	}
	right, err := p.expression(bindCompare + 1)
	if err != nil {
		return nil, err
	}
	if err := p.wantNumber(left, right); err != nil {
		return nil, err
	}
	if more := p.next(); p.infix(more) == bindCompare {
		return nil, p.fail(more.at, "join two comparisons by and", "chain of comparisons")
	}
	return &Compare{At: t.at, Op: t.text, X: left, Y: right}, nil
}

func (p *parser) logic(left Node, t token, power int) (Node, error) {
	p.take()
	if !p.condition || p.plain > 0 {
		return nil, p.fail(t.at, "conditions belong into where", "%q in a formula", t.text)
	}
	right, err := p.expression(power + 1)
	if err != nil {
		return nil, err
	}
	if err := p.wantTruth(left, right); err != nil {
		return nil, err
	}
	return &Logic{At: t.at, Or: power == bindOr, X: left, Y: right}, nil
}

func truth(n Node) bool {
	switch n.(type) {
	case *Compare, *Logic, *Not:
		return true
	}
	return false
}

func (p *parser) wantNumber(nodes ...Node) error {
	for _, n := range nodes {
		if truth(n) {
			return p.fail(n.Pos(), "", "condition where a number is expected")
		}
	}
	return nil
}

func (p *parser) wantTruth(nodes ...Node) error {
	for _, n := range nodes {
		if !truth(n) {
			return p.fail(n.Pos(), "compare it with something, as in j % 2 == 0", "number where a condition is expected")
		}
	}
	return nil
}
