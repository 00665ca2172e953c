package formula

// Functions holds the functions of a formula and how many arguments each takes. sum and prod are syntax of their own (Fold);
// uniform and normal, random numbers, have a meaning in profiles only, which the evaluator checks.
var Functions = map[string]int{"exp": 1, "sin": 1, "cos": 1, "sqrt": 1, "abs": 1, "bessel": 2, "uniform": 2, "normal": 2}

// Reserved says whether a name is part of the syntax and can name nothing else.
func Reserved(name string) bool {
	switch name {
	case "sum", "prod", "and", "or", "not":
		return true
	}
	_, ok := Functions[name]
	return ok
}

const (
	MaxLength = 1 << 16 // bytes of one formula
	MaxDepth  = 200     // parentheses, brackets, signs and powers inside each other
)

// Parse reads a formula. The error is an *Error.
func Parse(src string) (Node, error) {
	p, err := newParser(src, false)
	if err != nil {
		return nil, err
	}
	n, err := p.number()
	if err = p.finish(err); err != nil {
		return nil, err
	}
	return n, nil
}

// ParseCondition reads a condition such as "j % 2 == 0 and l != a". The error is an *Error.
func ParseCondition(src string) (Node, error) {
	p, err := newParser(src, true)
	if err != nil {
		return nil, err
	}
	n, err := p.expression(bindOr)
	if err = p.finish(err); err == nil {
		err = p.wantTruth(n)
	}
	if err != nil {
		return nil, err
	}
	return n, nil
}

// ParseRange reads a range such as "1..rungs-1", both ends included. The error is an *Error.
func ParseRange(src string) (from, to Node, err error) {
	p, err := newParser(src, false)
	if err != nil {
		return nil, nil, err
	}
	from, to, err = p.bounds("a range is written first..last, as in 1..rungs-1")
	if err = p.finish(err); err != nil {
		return nil, nil, err
	}
	return from, to, nil
}

// finish checks that nothing is left.
func (p *parser) finish(err error) error {
	if err != nil {
		return err
	}
	if t := p.next(); t.kind != end {
		return p.unexpected(t, "")
	}
	return nil
}
