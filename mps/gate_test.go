package mps

import (
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/mpo/ladder"
	"rundle/mps/block"
)

func TestApplyPair(t *testing.T) {
	t.Run("real", func(t *testing.T) { testApplyPair[float64](t) })
	t.Run("complex", func(t *testing.T) { testApplyPair[complex128](t) })
}

func testApplyPair[T dense.Scalar](t *testing.T) {
	m := bosons(t, 3, "0.3")
	target, err := m.f.Target(ladder.Sector{"N": 4})
	require.NoError(t, err)
	rng := rand.New(rand.NewPCG(1, 2))
	axes := frameAxes(m.f)
	for i := range len(axes) - 1 {
		c, err := Random[T](m.f.Group, axes, target.Charge, 12, rng)
		require.NoError(t, err)
		before := vector(c)
		gate := block.Random[T](block.NewStructure(m.f.Group, []block.Axis{axes[i], axes[i+1], axes[i].Reversed(), axes[i+1].Reversed()}, block.Charge{}), rng)
		g, d := gate.Dense(), axes[i].Dim()
		inner := 1
		for _, a := range axes[i+2:] {
			inner *= a.Dim()
		}
		want := make([]complex128, len(before))
		for row := range want {
			outer, to, in := row/(inner*d*d), row/inner%(d*d), row%inner
			for from := range d * d {
				want[row] += dense.ToComplex(g[to*d*d+from]) * before[(outer*d*d+from)*inner+in]
			}
		}
		_, err = c.ApplyPair(i, gate, block.Cut{}, nil)
		require.NoError(t, err)
		require.Equal(t, i+1, c.Center)
		requireClose(t, want, vector(c), 1e-12*norm(want))
		require.InDelta(t, norm(want), c.Norm(), 1e-12*norm(want)) // in canonical form
	}
}
