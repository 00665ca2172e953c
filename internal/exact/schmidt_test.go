package exact

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

func TestSinglet(t *testing.T) {
	sites := repeat(Spin(1), 4)
	b := basis(t, sites, []Number{TwiceSz(sites)}, 0)
	// singlets on (0,1) and (2,3)
	terms := append(heisenberg(0, 1), heisenberg(2, 3)...)
	level, gap := ground(t, b, terms...)
	assert.InDelta(t, -1.5, level.Energy, 1e-13)
	assert.InDelta(t, 1, gap, 1e-13)
	s, err := b.Entropies(level.Vector)
	require.NoError(t, err)
	assert.InDeltaSlice(t, []float64{math.Ln2, 0, math.Ln2}, s, 1e-13)
	r, err := b.Renyi2(level.Vector)
	require.NoError(t, err)
	assert.InDeltaSlice(t, []float64{math.Ln2, 0, math.Ln2}, r, 1e-13)
	values, err := b.Schmidt(level.Vector, 0)
	require.NoError(t, err)
	require.Len(t, values, 2)
	assert.Equal(t, []int{-1}, values[0].Left) // equal values: by charge
	assert.Equal(t, []int{1}, values[1].Left)
	assert.InDelta(t, math.Sqrt(0.5), values[0].Value, 1e-14)
	z := b.TwoPoint(level.Vector, "S^z", "S^z")
	assert.InDelta(t, -0.25, real(z[0][1]), 1e-13)
	assert.InDelta(t, 0, real(z[0][2]), 1e-13)
}

// TestSchmidtWithoutCharges: the values do not depend on the conserved numbers
// used, and both sides of the cut see the same ones.
func TestSchmidtWithoutCharges(t *testing.T) {
	sites := []Site{Fermion(), Electron(true), Boson(2), Electron(false), Fermion()}
	numbers := []Number{Particles(sites, 0, 1, 3, 4), Particles(sites, 2)}
	small, full := basis(t, sites, numbers, 3, 1), basis(t, sites, nil)
	rng := rand.New(rand.NewPCG(2, 2))
	psi, embedded := make([]complex128, small.Dim()), make([]complex128, full.Dim())
	var size float64
	for i := range psi {
		psi[i] = complex(rng.NormFloat64(), rng.NormFloat64())
		size += real(psi[i])*real(psi[i]) + imag(psi[i])*imag(psi[i])
	}
	scale(1/math.Sqrt(size), psi)
	for i := range psi {
		k, ok := full.Index(small.State(i))
		require.True(t, ok)
		embedded[k] = psi[i]
	}
	for cut := range len(sites) - 1 {
		a, err := small.Schmidt(psi, cut)
		require.NoError(t, err)
		b, err := full.Schmidt(embedded, cut)
		require.NoError(t, err)
		var sum float64
		for i, v := range b {
			sum += v.Value * v.Value
			if i < len(a) {
				assert.InDelta(t, a[i].Value, v.Value, 1e-14)
			} else {
				assert.InDelta(t, 0, v.Value, 1e-14)
			}
		}
		assert.InDelta(t, 1, sum, 1e-13)
	}
	assert.InDelta(t, 0, real(full.Expect(embedded, T(1, "n", 2))-small.Expect(psi, T(1, "n", 2))), 1e-13)
}

// TestMatrixElement takes a particle out: the bra lies in another sector.
func TestMatrixElement(t *testing.T) {
	sites := repeat(Fermion(), 3)
	number := []Number{Particles(sites)}
	two, one := basis(t, sites, number, 2), basis(t, sites, number, 1)
	x, y := make([]complex128, 3), make([]complex128, 3)
	i, _ := one.Index([]int{1, 0, 0})
	j, _ := two.Index([]int{1, 0, 1})
	x[i], y[j] = 1, 2i
	assert.Equal(t, -2i, Element(one, x, two, y, T(1, "c", 2)))
	assert.Equal(t, complex128(0), two.Expect(y, T(1, "c", 2)))
}
