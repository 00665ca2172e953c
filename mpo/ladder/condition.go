package ladder

import (
	"math"

	"rundle/mpo/ladder/formula"
)

// condition is a compiled where.
type condition interface {
	test(f *frame) (bool, error)
}

type comparison struct {
	op   string
	x, y expr
	at   origin
}

func (c *comparison) test(f *frame) (bool, error) {
	x, err := c.x.eval(f)
	if err != nil {
		return false, err
	}
	y, err := c.y.eval(f)
	if err != nil {
		return false, err
	}
	if x.ops != nil || y.ops != nil {
		return false, c.at.fail("", "an operator in a condition")
	}
	near := math.Hypot(real(x.z)-real(y.z), imag(x.z)-imag(y.z)) <= 1e-12*math.Hypot(real(x.z), imag(x.z))
	switch c.op {
	case "==":
		return near, nil
	case "!=":
		return !near, nil
	}
	if imag(x.z) != 0 || imag(y.z) != 0 {
		return false, c.at.fail("", "%s needs real numbers", c.op)
	}
	p, q := real(x.z), real(y.z)
	switch c.op {
	case "<":
		return p < q && !near, nil
	case "<=":
		return p < q || near, nil
	case ">":
		return p > q && !near, nil
	}
	return p > q || near, nil
}

type both struct {
	x, y   condition
	either bool
}

func (b *both) test(f *frame) (bool, error) {
	v, err := b.x.test(f)
	if err != nil || v == b.either {
		return v, err
	}
	return b.y.test(f)
}

type denial struct{ x condition }

func (d denial) test(f *frame) (bool, error) {
	v, err := d.x.test(f)
	return !v, err
}

// conditionOf compiles a where.
func (c *compiler) conditionOf(n formula.Node) (condition, error) {
	switch n := n.(type) {
	case *formula.Compare:
		x, err := c.compile(n.X)
		if err != nil {
			return nil, err
		}
		y, err := c.compile(n.Y)
		if err != nil {
			return nil, err
		}
		return &comparison{n.Op, x, y, c.at(n)}, nil
	case *formula.Logic:
		x, err := c.conditionOf(n.X)
		if err != nil {
			return nil, err
		}
		y, err := c.conditionOf(n.Y)
		if err != nil {
			return nil, err
		}
		return &both{x, y, n.Or}, nil
	case *formula.Not:
		x, err := c.conditionOf(n.X)
		if err != nil {
			return nil, err
		}
		return denial{x}, nil
	}
	return nil, c.at(n).fail("compare with ==, !=, <, <=, > or >=", "expected a condition")
}
