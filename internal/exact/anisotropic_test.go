package exact

import (
	"fmt"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

func TestAnisotropicRing(t *testing.T) {
	for _, n := range []int{4, 8, 10} {
		for _, delta := range []float64{-0.7, -0.4, 0, 0.5, 0.8, 0.999} {
			t.Run(fmt.Sprintf("sites=%d/delta=%g", n, delta), func(t *testing.T) {
				var terms []Term
				for j := range n {
					k := (j + 1) % n
					terms = append(terms, T(complex(delta, 0), "S^z", j, "S^z", k))
					terms = append(terms, WithAdjoints(T(0.5, "S^+", j, "S^-", k))...)
				}
				sites := repeat(Spin(1), n)
				level, _ := ground(t, basis(t, sites, []Number{TwiceSz(sites)}, 0), terms...)
				e, err := AnisotropicRing(n, delta)
				require.NoError(t, err)
				assert.InDelta(t, level.Energy, e, 1e-11)
			})
		}
	}
	for _, delta := range []float64{1, -1, 2} {
		_, err := AnisotropicRing(8, delta)
		assert.ErrorContains(t, err, "-1 < delta < 1")
	}
	_, err := AnisotropicRing(5, 0)
	assert.ErrorContains(t, err, "even")
}
