//go:build !race

package mpo

import (
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/mps/block"
)

// The race detector allocates on its own.
func TestApplyDoesNotAllocate(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 5))
	for _, name := range []string{"fermions", "bosons"} {
		o := randomSum(t, name, 5)
		psi := randomState[complex128](t, rng, o.Group, o.Phys, middle(o.Group, o.Phys))
		psi.Canonicalize(1, nil)
		var ws Workspace[complex128]
		left, right := around(o, psi, 1, 2, &ws)
		theta := block.Contract(psi.Sites[1], psi.Sites[2], []int{2}, []int{0})
		h := NewPlanner(o).Project(1, 2, left, right, theta.Structure)
		require.NotEmpty(t, h.plan.chains)
		require.NotEmpty(t, h.plan.bands)
		out := block.New[complex128](theta.Structure)
		apply := func() { h.Apply(out.Data, theta.Data, &ws, nil) }
		apply()
		require.Zero(t, testing.AllocsPerRun(10, apply), name)

		a := psi.Sites[2]
		g := NewPlanner(o).RightIsometry(2, right, a.Structure)
		grown := block.New[complex128](g.Out)
		step := func() { g.Run(grown, right, a, a, &ws, nil) }
		step()
		require.Zero(t, testing.AllocsPerRun(10, step), name)
	}
}
