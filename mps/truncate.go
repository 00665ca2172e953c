package mps

import (
	"fmt"

	"rundle/internal/task"
	"rundle/mps/block"
)

// Truncate drops small Schmidt values at every bond and returns the weight discarded in all, |before - after|^2 / |before|^2.
// cut.Bond, cut.Floor and cut.MinBond hold for each bond; cut.Weight bounds the weight discarded in all. The centre ends at site 0. The
// state is not normalized again: its norm shrinks by the square root of one minus the weight. A zero state gives block.ErrZero; on an error the
// chain is as it was.
//
// The sum is exact: each cut projects on the right half, later ones within the range of earlier ones, so the dropped parts are
// orthogonal to each other (Schollwoeck 2011, section 4.5).
func (c *Chain[T]) Truncate(cut block.Cut, pool *task.Pool) (discarded float64, err error) {
	last := c.Len() - 1
	v, exponent := c.canonicalView(last, pool)
	var ws block.Workspace[T]
	for i := last; i > 0; i-- {
		here := cut
		// What is left of the weight is shared evenly among the bonds that are left.
		here.Weight = max(0, cut.Weight-discarded) / float64(i)
		u, s, right, err := block.SVD(v.Sites[i], 1, here, &ws, pool)
		if err != nil {
			return 0, fmt.Errorf("mps: cut %d: %w", i-1, err)
		}
		block.ScaleBond(u, 1, s.Values)
		v.Sites[i-1], v.Sites[i] = multiply(v.Sites[i-1], u, []int{2}, []int{0}, nil, pool), right
		discarded += (1 - discarded) * s.Discarded
	}
	v.Center = 0
	v.rescale(0, exponent)
	*c = *v
	return discarded, nil
}
