package formula

import (
	"strconv"
	"strings"
)

// Print writes n as a formula. For a tree that came from a parser the text reads back as the same tree.
func Print(n Node) string {
	var p printer
	p.write(n, 0)
	return p.String()
}

type printer struct {
	strings.Builder
	tight bool // no spaces around + and -, inside brackets and bounds
	guard bool // the next number or indexed name goes into parentheses
}

func (p *printer) put(parts ...string) {
	for _, s := range parts {
		p.WriteString(s)
	}
}

// bindingOf is how tightly the outermost sign of n binds; a part that no sign can tear apart binds tightest.
func bindingOf(n Node) int {
	switch n := n.(type) {
	case *Logic:
		if n.Or {
			return bindOr
		}
		return bindAnd
	case *Not:
		return bindNot
	case *Compare:
		return bindCompare
	case *Conj:
		return bindSum
	case *Unary:
		return bindSign
	case *Binary:
		switch n.Op {
		case '+', '-':
			return bindSum
		case '^':
			return bindPower
		}
		return bindProduct
	}
	return bindPower + 1
}

// write puts n into parentheses if it binds less tightly than bind.
func (p *printer) write(n Node, bind int) {
	if bindingOf(n) < bind || p.guard && whole(n) {
		p.wrap(n)
		return
	}
	switch n := n.(type) {
	case *Number:
		p.put(strconv.FormatFloat(n.Value, 'g', -1, 64))
	case *Name:
		p.put(n.Ident)
	case *Indexed:
		p.put(n.Symbol(), "[")
		p.list(n.Indices, ",", true)
		p.put("]")
	case *Dot:
		p.write(n.A, 0)
		p.put(".")
		p.write(n.B, 0)
	case *Unary:
		p.put("-")
		p.write(n.X, bindSign)
	case *Binary:
		p.binary(n)
	case *Call:
		p.put(n.Name, "(")
		p.list(n.Args, ", ", p.tight)
		p.put(")")
	case *Fold:
		p.fold(n)
	case *Conj:
		p.write(n.X, bindSum)
		p.put(p.spaced(map[bool]string{false: "+", true: "-"}[n.Minus]), "h.c.")
	case *Compare:
		p.write(n.X, bindCompare+1)
		p.put(" ", n.Op, " ")
		p.write(n.Y, bindCompare+1)
	case *Logic:
		word := map[bool]string{false: " and ", true: " or "}[n.Or]
		p.write(n.X, bindingOf(n))
		p.put(word)
		p.write(n.Y, bindingOf(n)+1)
	case *Not:
		p.put("not ")
		p.write(n.X, bindNot)
	}
}

// whole says that no sign can tear n apart.
func whole(n Node) bool { return bindingOf(n) > bindPower }

func (p *printer) wrap(n Node) {
	p.guard = false
	p.put("(")
	p.write(n, 0)
	p.put(")")
}

func (p *printer) list(nodes []Node, comma string, tight bool) {
	before := p.tight
	p.tight = tight
	for i, n := range nodes {
		if i > 0 {
			p.put(comma)
		}
		p.write(n, 0)
	}
	p.tight = before
}

func (p *printer) spaced(op string) string {
	if p.tight {
		return op
	}
	return " " + op + " "
}

func (p *printer) binary(n *Binary) {
	bind := bindingOf(n)
	if n.Op == '^' {
		p.power(n)
		return
	}
	p.write(n.X, bind)
	switch {
	case n.Implicit:
		p.put(" ")
	case n.Op == '*' || n.Op == '/':
		p.put(string(n.Op))
	default:
		p.put(p.spaced(string(n.Op)))
	}
	if _, signed := n.Y.(*Unary); signed && n.Implicit {
		p.wrap(n.Y) // or it would read as a difference
		return
	}
	// Two numerals side by side would not read back: the second goes into parentheses, alone, so that nothing nests deeper
	// than in the source.
	_, numeral := leftmost(n.Y).(*Number)
	p.guard = n.Implicit && numeral && p.endsInDigit()
	p.write(n.Y, bind+1)
}

// endsInDigit looks at the byte before the space of an implicit product.
func (p *printer) endsInDigit() bool {
	s := p.String()
	return s[len(s)-2] >= '0' && s[len(s)-2] <= '9'
}

// power writes X^Y. A sign may stand in the exponent; "x^y[j]" would read as a superscript.
func (p *printer) power(n *Binary) {
	p.write(n.X, bindPower+1)
	p.put("^")
	if _, signed := n.Y.(*Unary); signed {
		p.write(n.Y, bindSign)
		return
	}
	_, base := n.X.(*Name)
	first, indexed := leftmost(n.Y).(*Indexed)
	p.guard = base && indexed && first.Super == "" && (first.Name == "x" || first.Name == "y" || first.Name == "z")
	p.write(n.Y, bindPower)
}

// leftmost is the part of n that is written first, parentheses aside.
func leftmost(n Node) Node {
	switch m := n.(type) {
	case *Binary:
		return leftmost(m.X)
	case *Conj:
		return leftmost(m.X)
	case *Dot:
		return m.A
	}
	return n
}

func (p *printer) fold(n *Fold) {
	word := map[bool]string{false: "sum(", true: "prod("}[n.Product]
	p.put(word, n.Var, "=")
	before := p.tight
	p.tight = true
	p.write(n.From, 0)
	p.put("..")
	p.write(n.To, 0)
	p.tight = before
	p.put(", ")
	p.write(n.Body, 0)
	p.put(")")
}
