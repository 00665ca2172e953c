package mps

import (
	"errors"
	"math"
	"math/rand/v2"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// Random returns a random state of the given total charge, of norm one, canonical with its centre at site 0. Each bond gets up to
// bond states, shared among the charges that configurations of this total pass through, in proportion to how many do. Elements are
// drawn in a fixed order, so that the state depends on the generator alone. A total that the sites cannot hold is an error.
func Random[T dense.Scalar](g block.Group, axes []block.Axis, total block.Charge, bond int, rng *rand.Rand) (*Chain[T], error) {
	if len(axes) == 0 {
		return nil, errors.New("mps: a random state of no sites; expected at least one")
	}
	bonds, err := ExpectedBonds(g, axes, total, bond)
	if err != nil {
		return nil, err
	}
	c := &Chain[T]{Group: g, Sites: make([]*block.Tensor[T], len(axes))}
	for i, a := range axes {
		s := block.NewStructure(g, []block.Axis{bonds[i], a, bonds[i+1].Reversed()}, block.Charge{})
		t := block.Random[T](s, rng)
		t.Scale(dense.FromFloat[T](1 / math.Sqrt(float64(s.Elements()))))
		c.Sites[i] = t
	}
	// Both ways, to drop bond states that one side could not fill.
	c.gather(c.Len()-1, nil)
	c.MoveCenter(0, nil)
	c.Normalize()
	return c, nil
}
