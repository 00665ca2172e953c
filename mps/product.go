package mps

import (
	"errors"
	"fmt"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// Product returns the product state of one basis state a site: states[i] counts the states of axes[i] in its order. The norm
// is one. An index that the site does not have is an error.
func Product[T dense.Scalar](g block.Group, axes []block.Axis, states []int) (*Chain[T], error) {
	if len(axes) == 0 {
		return nil, errors.New("mps: a product state of no sites; expected at least one")
	}
	if len(states) != len(axes) {
		return nil, fmt.Errorf("mps: %d states given for %d sites", len(states), len(axes))
	}
	c := &Chain[T]{Group: g, Sites: make([]*block.Tensor[T], len(axes))}
	var charge block.Charge
	for i, a := range axes {
		pos, inside, ok := locate(a, states[i])
		if !ok {
			return nil, fmt.Errorf("mps: site %d has states 0..%d, got %d", i, a.Dim()-1, states[i])
		}
		next := g.Add(charge, a.Sectors[pos].Charge)
		s := block.NewStructure(g, []block.Axis{single(block.In, charge), a, single(block.Out, next)}, block.Charge{})
		t := block.New[T](s)
		t.Block(0)[inside] = dense.FromFloat[T](1) // the sector a.Sectors[pos] is the one that fits the charges
		c.Sites[i], charge = t, next
	}
	return c, nil
}

// ProductOfCharges returns the product state in which site i has the charge charges[i]; of several states of a charge the site takes the
// first in its axis. A charge that the site does not have is an error.
func ProductOfCharges[T dense.Scalar](g block.Group, axes []block.Axis, charges []block.Charge) (*Chain[T], error) {
	if len(charges) != len(axes) {
		return nil, fmt.Errorf("mps: %d charges given for %d sites", len(charges), len(axes))
	}
	states := make([]int, len(axes))
	for i, a := range axes {
		pos, ok := a.Find(g.Normalize(charges[i]))
		if !ok {
			return nil, fmt.Errorf("mps: site %d has no state of charge %v; it has %v", i, charges[i], a)
		}
		states[i] = a.Offset(pos)
	}
	return Product[T](g, axes, states)
}

// single is an axis of one state.
func single(flow block.Flow, q block.Charge) block.Axis {
	return block.NewAxis(flow, block.Sector{Charge: q, Dim: 1})
}

// locate returns the sector of a state of an axis and its place there.
func locate(a block.Axis, state int) (pos, inside int, ok bool) {
	for pos, s := range a.Sectors {
		if state >= 0 && state < s.Dim {
			return pos, state, true
		}
		state -= s.Dim
	}
	return 0, 0, false
}
