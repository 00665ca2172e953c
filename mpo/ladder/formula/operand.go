package formula

// operand reads what can stand where an expression begins.
func (p *parser) operand() (Node, error) {
	t := p.next()
	switch t.kind {
	case number:
		p.take()
		return &Number{At: t.at, Value: t.value}, nil
	case name:
		return p.named()
	case conjugate:
		return nil, p.loneConjugate(t)
	case sign:
		switch t.text {
		case "(":
			return p.parenthesis()
		case "-", "+":
			return p.signed()
		}
	}
	return nil, p.missing(t)
}

// missing says that an operand was expected before t.
func (p *parser) missing(t token) error {
	if p.at == 0 {
		if t.kind == end {
			return p.fail(t.at, "", "empty formula")
		}
		return p.fail(t.at, "", "a formula cannot begin with %s", t.describe())
	}
	before := p.toks[p.at-1]
	switch {
	case before.is("(") && t.is(")"):
		return p.fail(before.at, "", "nothing between the parentheses")
	case before.is("[") && t.is("]"):
		return p.fail(before.at, "write [leg,rung]", "nothing between the brackets")
	}
	return p.fail(t.at, "", "expected a number, a name or \"(\" after %s, found %s", before.describe(), t.describe())
}

func (p *parser) signed() (Node, error) {
	t := p.take()
	if err := p.enter(t.at); err != nil {
		return nil, err
	}
	defer func() { p.depth-- }()
	x, err := p.expression(bindSign)
	if err != nil {
		return nil, err
	}
	if err := p.wantNumber(x); err != nil {
		return nil, err
	}
	if t.text == "+" {
		return x, nil
	}
	return &Unary{At: t.at, X: x}, nil
}

func (p *parser) parenthesis() (Node, error) {
	open := p.take()
	if err := p.enter(open.at); err != nil {
		return nil, err
	}
	defer func() { p.depth-- }()
	x, err := p.expression(bindOr)
	if err != nil {
		return nil, err
	}
	return x, p.close(open, ")")
}

// close takes the mark that ends what open began.
func (p *parser) close(open token, mark string) error {
	t := p.next()
	if t.is(mark) {
		p.take()
		return nil
	}
	if t.kind == end {
		what := "parenthesis"
		if mark == "]" {
			what = "bracket"
		}
		return p.fail(open.at, "", "%s opened here is not closed", what)
	}
	return p.unexpected(t, " or \""+mark+"\"")
}

// unexpected says that t cannot follow a whole expression.
func (p *parser) unexpected(t token, or string) error {
	switch {
	case t.is(")") && p.depth == 0:
		return p.fail(t.at, "", "parenthesis closed here was not opened")
	case t.is("]") && p.depth == 0:
		return p.fail(t.at, "", "bracket closed here was not opened")
	case t.is("["):
		return p.fail(t.at, "indices follow a name, as in n[leg,rung]", "bracket without a name before it")
	case t.is("."):
		return p.fail(t.at, "write S[leg,rung].S[leg,rung]", "a point joins two vectors of operators")
	case t.is("=") && p.condition:
		return p.fail(t.at, "equality is written ==", "single = in a condition")
	case t.is("="):
		return p.fail(t.at, "write only what stands to the right of it", "= in a formula")
	case t.is("!="), t.is(".."):
		return p.fail(t.at, "", "%q has no meaning here", t.text)
	}
	return p.fail(t.at, "", "expected an operator sign%s, found %s", or, t.describe())
}

// named reads what begins with a name.
func (p *parser) named() (Node, error) {
	t := p.take()
	switch t.text {
	case "and", "or":
		return nil, p.fail(t.at, "", "%q without a condition before it", t.text)
	case "not":
		return p.not(t)
	case "sum", "prod":
		return p.fold(t)
	}
	if p.next().is("[") {
		return p.indexed(t)
	}
	arity, ok := Functions[t.text]
	if !ok {
		return &Name{At: t.at, Ident: t.text}, nil
	}
	return p.call(t, arity)
}

func (p *parser) not(t token) (Node, error) {
	if !p.condition || p.plain > 0 {
		return nil, p.fail(t.at, "conditions belong into where", "\"not\" in a formula")
	}
	if err := p.enter(t.at); err != nil {
		return nil, err
	}
	defer func() { p.depth-- }()
	x, err := p.expression(bindNot)
	if err != nil {
		return nil, err
	}
	if err := p.wantTruth(x); err != nil {
		return nil, err
	}
	return &Not{At: t.at, X: x}, nil
}

// indexed reads the bracket after the name t and, where a point follows, the second vector of a scalar product.
func (p *parser) indexed(t token) (Node, error) {
	a, err := p.bracket(t)
	if err != nil || !p.next().is(".") {
		return a, err
	}
	point := p.take()
	second := p.next()
	if second.kind != name || !p.toks[p.at+1].is("[") {
		return nil, p.fail(point.at, "write S[leg,rung].S[leg,rung]", "a point joins two vectors of operators")
	}
	p.take()
	b, err := p.bracket(second)
	if err != nil {
		return nil, err
	}
	for _, v := range []*Indexed{a, b} {
		if v.Super != "" {
			return nil, p.fail(v.At, "write "+v.Name+" without it", "vector of operators with a superscript in a scalar product")
		}
	}
	return &Dot{At: t.at, A: a, B: b}, nil
}

func (p *parser) bracket(t token) (*Indexed, error) {
	if _, ok := Functions[t.text]; ok || p.plain > 0 {
		if ok {
			return nil, p.fail(t.at, "write "+t.text+"(...)", "function %q with a bracket", t.text)
		}
		return nil, p.fail(t.at, "", "%q with brackets among numbers", t.text)
	}
	open := p.take()
	if err := p.enter(open.at); err != nil {
		return nil, err
	}
	p.plain++
	defer func() { p.depth--; p.plain-- }()
	n := &Indexed{At: t.at, Name: t.text, Super: t.super}
	for {
		x, err := p.number()
		if err != nil {
			return nil, err
		}
		n.Indices = append(n.Indices, x)
		if !p.next().is(",") {
			return n, p.close(open, "]")
		}
		p.take()
	}
}

// open takes the parenthesis that follows the name of a function.
func (p *parser) open(t token) (token, error) {
	if !p.next().is("(") {
		return token{}, p.fail(t.at, "write "+t.text+"(...)", "function %q without its parentheses", t.text)
	}
	open := p.take()
	return open, p.enter(open.at)
}

func (p *parser) call(t token, arity int) (Node, error) {
	open, err := p.open(t)
	if err != nil {
		return nil, err
	}
	defer func() { p.depth-- }()
	n := &Call{At: t.at, Name: t.text}
	for {
		x, err := p.number()
		if err != nil {
			return nil, err
		}
		n.Args = append(n.Args, x)
		if !p.next().is(",") {
			break
		}
		p.take()
	}
	if err := p.close(open, ")"); err != nil {
		return nil, err
	}
	if len(n.Args) != arity {
		return nil, p.fail(t.at, "", "function %q takes %d argument(s), not %d", t.text, arity, len(n.Args))
	}
	return n, nil
}

// fold reads sum(k=a..b, body) or prod(k=a..b, body).
func (p *parser) fold(t token) (Node, error) {
	form := "write " + t.text + "(k=first..last, ...)"
	if p.plain > 0 {
		return nil, p.fail(t.at, "", "%q among numbers", t.text)
	}
	open, err := p.open(t)
	if err != nil {
		return nil, err
	}
	defer func() { p.depth-- }()
	index := p.take()
	if index.kind != name || !p.next().is("=") {
		return nil, p.fail(index.at, form, "%s without its index", t.text)
	}
	if Reserved(index.text) {
		return nil, p.fail(index.at, "choose another name", "%q cannot be an index", index.text)
	}
	p.take()
	from, to, err := p.bounds(form)
	if err != nil {
		return nil, err
	}
	if comma := p.next(); !comma.is(",") {
		return nil, p.fail(comma.at, form, "expected a comma after the range, found %s", comma.describe())
	}
	p.take()
	body, err := p.number()
	if err != nil {
		return nil, err
	}
	n := &Fold{At: t.at, Product: t.text == "prod", Var: index.text, VarAt: index.at, From: from, To: to, Body: body}
	return n, p.close(open, ")")
}

// bounds reads "first..last".
func (p *parser) bounds(form string) (from, to Node, err error) {
	p.plain++
	defer func() { p.plain-- }()
	if from, err = p.number(); err != nil {
		return nil, nil, err
	}
	if t := p.next(); !t.is("..") {
		return nil, nil, p.fail(t.at, form, "expected \"..\" after the first value, found %s", t.describe())
	}
	p.take()
	to, err = p.number()
	return from, to, err
}
