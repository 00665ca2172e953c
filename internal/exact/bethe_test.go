package exact

import (
	"fmt"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

func TestHeisenbergChain(t *testing.T) {
	for _, row := range []struct{ sites, down int }{
		{2, 1}, {3, 1}, {8, 4}, {9, 4}, {10, 5}, {12, 6}, {10, 2}, {10, 1}, {10, 0},
	} {
		t.Run(fmt.Sprintf("sites=%d/down=%d", row.sites, row.down), func(t *testing.T) {
			sites := repeat(Spin(1), row.sites)
			b := basis(t, sites, []Number{TwiceSz(sites)}, row.sites-2*row.down)
			level, _ := ground(t, b, chain(row.sites, false, heisenberg)...)
			e, err := HeisenbergChain(row.sites, row.down)
			require.NoError(t, err)
			assert.InDelta(t, level.Energy, e, 1e-12)
		})
	}
	_, err := HeisenbergChain(4, 3)
	assert.ErrorContains(t, err, "at most half")
}

func TestHeisenbergRing(t *testing.T) {
	for _, n := range []int{4, 8, 10, 12} {
		t.Run(fmt.Sprintf("sites=%d", n), func(t *testing.T) {
			sites := repeat(Spin(1), n)
			b := basis(t, sites, []Number{TwiceSz(sites)}, 0)
			level, _ := ground(t, b, chain(n, true, heisenberg)...)
			e, err := HeisenbergRing(n)
			require.NoError(t, err)
			assert.InDelta(t, level.Energy, e, 1e-12)
		})
	}
	_, err := HeisenbergRing(5)
	assert.ErrorContains(t, err, "even")
}

// TestHeisenbergLimit: rings and chains go to Hulthen's density, the ring with
// pi^2/(12 n^2) (velocity pi/2, central charge 1).
func TestHeisenbergLimit(t *testing.T) {
	const n = 512
	ring, err := HeisenbergRing(n)
	require.NoError(t, err)
	assert.InDelta(t, 1, (HeisenbergDensity-ring/n)*12*n*n/(9.8696044), 0.01)
	a, err := HeisenbergChain(n/2, n/4)
	require.NoError(t, err)
	b, err := HeisenbergChain(n, n/2)
	require.NoError(t, err)
	assert.InDelta(t, HeisenbergDensity, (b-a)/(n/2), 1e-5)
}

func hubbard(sites int, t, u float64) []Term {
	var out []Term
	for j := range sites {
		out = append(out, T(complex(u, 0), "n_up", j, "n_down", j))
		if j+1 < sites {
			hop := complex(-t, 0)
			out = append(out, WithAdjoints(T(hop, "c_up^+", j+1, "c_up", j), T(hop, "c_down^+", j+1, "c_down", j))...)
		}
	}
	return out
}

func TestHubbardChain(t *testing.T) {
	for _, row := range []struct {
		sites, up, down int
		t, u            float64
	}{
		{2, 1, 1, 1, 4}, {4, 2, 2, 1, 4}, {4, 2, 2, 0.7, 0.5}, {5, 3, 2, 1, 8}, {6, 3, 3, 1, 4},
		{6, 2, 2, 1, 4}, {6, 3, 2, 1, 2}, {6, 3, 1, 1, 20}, {6, 4, 0, 1, 4}, {6, 1, 1, 1, 100},
	} {
		t.Run(fmt.Sprintf("sites=%d/up=%d/down=%d/t=%g/u=%g", row.sites, row.up, row.down, row.t, row.u), func(t *testing.T) {
			sites := repeat(Electron(true), row.sites)
			b := basis(t, sites, []Number{UpParticles(sites), DownParticles(sites)}, row.up, row.down)
			level, _ := ground(t, b, hubbard(row.sites, row.t, row.u)...)
			e, err := HubbardChain(row.sites, row.up, row.down, row.t, row.u)
			require.NoError(t, err)
			assert.InDelta(t, level.Energy, e, 1e-11)
		})
	}
	for _, bad := range [][2]int{{3, 4}, {4, 3}} {
		_, err := HubbardChain(6, bad[0], bad[1], 1, 4)
		assert.ErrorContains(t, err, "at most one electron a site")
	}
}

// TestHubbardLarge solves the sizes that the acceptance tests use: the energy
// must lie between those of free and of impenetrable electrons and change
// smoothly with U.
func TestHubbardLarge(t *testing.T) {
	for _, n := range []int{16, 14} {
		var last float64
		for i, u := range []float64{0.25, 1, 4, 16} {
			e, err := HubbardChain(32, n, n, 1, u)
			require.NoError(t, err)
			if i > 0 {
				assert.Greater(t, e, last)
			} else {
				q := NewQuadratic(32)
				for j := range 31 {
					q.Hop(j, j+1, -1)
				}
				g, err := q.Filled(n)
				require.NoError(t, err)
				first := 2*g.Energy + u*sumSquares(g, 32) // first-order perturbation bounds from above
				assert.Less(t, e, first)
				assert.Greater(t, e, first-0.02*u*32)
			}
			last = e
		}
	}
}

func sumSquares(g *Gaussian, n int) (s float64) {
	for j := range n {
		s += g.Density(j) * g.Density(j)
	}
	return s
}
