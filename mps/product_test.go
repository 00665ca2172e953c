package mps

import (
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/internal/dense"
	"rundle/mps/block"
)

func TestProductStates(t *testing.T) { both(t, productStates[float64], productStates[complex128]) }

func productStates[T dense.Scalar](t *rapid.T) {
	g, axes := drawAxes(t)
	states := make([]int, len(axes))
	at := 0
	for i, a := range axes {
		states[i] = rapid.IntRange(0, a.Dim()-1).Draw(t, name(i))
		at = at*a.Dim() + states[i]
	}
	c, err := Product[T](g, axes, states)
	require.NoError(t, err)
	requireCanonical(t, c)
	require.Equal(t, 0, c.Center)
	require.Equal(t, axes, c.Axes())
	require.Equal(t, 1, c.MaxBond())
	want := make([]complex128, len(stateCharges(g, axes)))
	want[at] = 1
	require.Equal(t, want, vector(c))
	require.Equal(t, stateCharges(g, axes)[at], c.Charge())

	charges := make([]block.Charge, len(axes))
	for i, a := range axes {
		charges[i] = stateCharges(g, axes[i:i+1])[states[i]]
		pos, _ := a.Find(charges[i])
		states[i] = a.Offset(pos)
	}
	d, err := ProductOfCharges[T](g, axes, charges)
	require.NoError(t, err)
	c, err = Product[T](g, axes, states)
	require.NoError(t, err)
	require.Equal(t, vector(c), vector(d))
}

func TestProductRefuses(t *testing.T) {
	g, axes := groups[1], uniform(3, 0, 1)
	for _, row := range []struct {
		name string
		run  func() error
		want string
	}{
		{"no sites", func() error { _, err := Product[float64](g, nil, nil); return err }, "no sites"},
		{"too few states", func() error { _, err := Product[float64](g, axes, []int{0}); return err }, "1 states given for 3 sites"},
		{"state too large", func() error { _, err := Product[float64](g, axes, []int{0, 2, 0}); return err }, "site 1 has states 0..1, got 2"},
		{"negative state", func() error { _, err := Product[float64](g, axes, []int{0, 0, -1}); return err }, "site 2 has states 0..1, got -1"},
		{"too few charges", func() error { _, err := ProductOfCharges[float64](g, axes, nil); return err }, "0 charges given"},
		{"absent charge", func() error {
			_, err := ProductOfCharges[float64](g, axes, []block.Charge{{0}, {3}, {0}})
			return err
		}, "site 1 has no state of charge [3 0 0 0]"},
	} {
		t.Run(row.name, func(t *testing.T) { require.ErrorContains(t, row.run(), row.want) })
	}
}

func TestRandomStates(t *testing.T) { both(t, randomStates[float64], randomStates[complex128]) }

func randomStates[T dense.Scalar](t *rapid.T) {
	g, axes := drawAxes(t)
	total := drawTotal(t, g, axes)
	bond := rapid.IntRange(1, 8).Draw(t, "bond")
	seed := rapid.Uint64().Draw(t, "seed")
	c, err := Random[T](g, axes, total, bond, rand.New(rand.NewPCG(seed, 0)))
	require.NoError(t, err)
	requireCanonical(t, c)
	require.Equal(t, 0, c.Center)
	require.Equal(t, axes, c.Axes())
	require.Equal(t, total, c.Charge())
	require.LessOrEqual(t, c.MaxBond(), bond)
	require.InDelta(t, 1, c.Norm(), 1e-13)
	again, err := Random[T](g, axes, total, bond, rand.New(rand.NewPCG(seed, 0)))
	require.NoError(t, err)
	require.Equal(t, c, again)

	bonds, err := ExpectedBonds(g, axes, total, bond)
	require.NoError(t, err)
	require.Len(t, bonds, len(axes)+1)
	for i, a := range bonds {
		require.LessOrEqual(t, a.Dim(), bond)
		require.Equal(t, block.In, a.Flow)
		if i > 0 && i < len(axes) {
			require.GreaterOrEqual(t, a.Dim(), c.Bond(i-1).Dim(), "a random state may lose bond states, never gain any")
		}
	}

	// With room for everything the state fills its sector: no bond is narrower than the smaller side allows.
	full, err := Random[T](g, axes, total, 1000, rand.New(rand.NewPCG(seed, 0)))
	require.NoError(t, err)
	for b, d := range full.BondDims() {
		want := 0
		right := stateCharges(g, axes[b+1:])
		count := make(map[block.Charge]int)
		for _, q := range right {
			count[g.Sub(total, q)]++
		}
		left := make(map[block.Charge]int)
		for _, q := range stateCharges(g, axes[:b+1]) {
			left[q]++
		}
		for q, n := range left {
			want += min(n, count[q])
		}
		require.Equal(t, want, d, "bond %d", b)
	}
}

func TestRandomRefuses(t *testing.T) {
	g, axes := groups[1], uniform(3, 0, 1)
	rng := rand.New(rand.NewPCG(1, 1))
	_, err := Random[float64](g, nil, block.Charge{}, 4, rng)
	require.ErrorContains(t, err, "no sites")
	_, err = Random[float64](g, axes, block.Charge{}, 0, rng)
	require.ErrorContains(t, err, "bond dimension 0")
	_, err = Random[float64](g, axes, block.Charge{4}, 4, rng)
	require.ErrorContains(t, err, "3 sites cannot hold the total charge [4 0 0 0]")
}

// Long chains, extreme fillings and several charges: the bond is used up and the search through the charges stays small.
func TestRandomOnLongChains(t *testing.T) {
	two := make([]block.Axis, 200)
	for i := range two {
		two[i] = block.NewAxis(block.In, block.Sector{Dim: 1}, block.Sector{Charge: block.Charge{1, 1}, Dim: 1},
			block.Sector{Charge: block.Charge{1, -1}, Dim: 1}, block.Sector{Charge: block.Charge{2, 0}, Dim: 1})
	}
	ragged := uniform(300, 0, 1)
	for i := range 100 {
		ragged[i] = uniform(1, 0)[0] // holds nothing
	}
	for _, row := range []struct {
		name  string
		group block.Group
		axes  []block.Axis
		total block.Charge
		bond  int // reached in the middle
	}{
		{"one particle", groups[1], uniform(1200, 0, 1), block.Charge{1}, 2},
		{"half filling", groups[1], uniform(500, 0, 1), block.Charge{250}, 20},
		{"nearly full", groups[1], uniform(800, 0, 1), block.Charge{797}, 8},
		{"two charges", groups[4], two, block.Charge{200, 6}, 20},
		{"no charges", groups[0], uniform(300, 0, 0), block.Charge{}, 20},
		{"empty sites", groups[1], ragged, block.Charge{37}, 20},
	} {
		t.Run(row.name, func(t *testing.T) {
			c, err := Random[float64](row.group, row.axes, row.total, 20, rand.New(rand.NewPCG(7, 7)))
			require.NoError(t, err)
			require.GreaterOrEqual(t, c.MaxBond(), row.bond)
			require.LessOrEqual(t, c.MaxBond(), 20)
			require.InDelta(t, 1, c.Norm(), 1e-12)
			require.InDelta(t, 1, Overlap(c, c, nil), 1e-12)
		})
	}
}

func TestDivide(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 8).Draw(t, "n")
		p, most := make([]float64, n), make([]int, n)
		room := 0
		for i := range p {
			p[i] = rapid.SampledFrom([]float64{0, 1e-300, 1e-5, 0.1, 0.1, 0.5, 1}).Draw(t, "p")
			most[i] = rapid.IntRange(1, 9).Draw(t, "most")
			room += most[i]
		}
		must, bond := rapid.IntRange(0, n-1).Draw(t, "must"), rapid.IntRange(1, 30).Draw(t, "bond")
		dims := divide(p, most, must, bond)
		sum := 0
		for i, d := range dims {
			require.LessOrEqual(t, d, most[i])
			require.GreaterOrEqual(t, d, 0)
			sum += d
		}
		require.Equal(t, min(bond, room), sum)
		require.Positive(t, dims[must])
		for i := range p {
			for j := range p {
				// Nobody with room gets less than one of smaller weight.
				if p[i] > p[j] && dims[i] < most[i] && j != must {
					require.GreaterOrEqual(t, dims[i], dims[j])
				}
			}
		}
	})
	require.Equal(t, []int{1, 6, 3}, divide([]float64{0.1, 0.6, 0.3}, []int{9, 9, 9}, 0, 10))
}
