package mps

import (
	"fmt"

	"rundle/internal/task"
	"rundle/mps/block"
)

// ApplyPair applies an operator to sites i and i+1 and moves the centre to site i+1. Its axes are the two sites after it (In, In), which may
// have other states than those before, and the two before it (Out, Out); it conserves the charges. The cut acts on the bond between, relative
// to the norm; discarded is the weight lost.
func (c *Chain[T]) ApplyPair(i int, gate *block.Tensor[T], cut block.Cut, pool *task.Pool) (discarded float64, err error) {
	c.mustSite("ApplyPair", i)
	c.mustSite("ApplyPair", i+1)
	c.MoveCenter(i, pool)
	theta := multiply(c.Sites[i], c.Sites[i+1], []int{2}, []int{0}, nil, pool)
	theta = block.Permute(multiply(gate, theta, []int{2, 3}, []int{1, 2}, nil, pool), 2, 0, 1, 3)
	u, s, v, err := block.SVD(theta, 2, cut, nil, pool)
	if err != nil {
		return 0, fmt.Errorf("mps: cut %d: %w", i, err)
	}
	block.ScaleBond(v, 0, s.Values)
	c.Sites[i], c.Sites[i+1], c.Center = u, v, i+1
	return s.Discarded, nil
}
