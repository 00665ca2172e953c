package exact

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

func randomQuadratic(n int, rng *rand.Rand, complexValued, paired bool) *Quadratic {
	entry := func() complex128 {
		if complexValued {
			return complex(rng.NormFloat64(), rng.NormFloat64())
		}
		return complex(rng.NormFloat64(), 0)
	}
	q := NewQuadratic(n)
	for i := range n {
		q.Energy(i, rng.NormFloat64())
		for j := range i {
			q.Hop(i, j, entry())
			if paired {
				q.Pair(i, j, entry())
			}
		}
	}
	return q
}

// TestFreeFermions compares random quadratic Hamiltonians with exact
// diagonalization: energy, gap, two- and four-point functions, entropies.
func TestFreeFermions(t *testing.T) {
	const n = 7
	sites := repeat(Fermion(), n)
	for seed := range uint64(6) {
		for _, row := range []struct {
			complexValued, paired bool
			value                 int // particles, or their parity
		}{
			{false, false, 3}, {true, false, 2}, {true, false, 0}, {true, false, n},
			{false, true, 0}, {false, true, 1}, {true, true, 0}, {true, true, 1},
		} {
			t.Run(fmt.Sprintf("seed=%d/complex=%v/paired=%v/value=%d", seed, row.complexValued, row.paired, row.value), func(t *testing.T) {
				q := randomQuadratic(n, rand.New(rand.NewPCG(seed, 9)), row.complexValued, row.paired)
				number := Particles(sites)
				var g *Gaussian
				var err error
				if row.paired {
					number = number.Modulo(2)
					g, err = q.Lowest(row.value == 1)
				} else {
					g, err = q.Filled(row.value)
				}
				require.NoError(t, err)
				b := basis(t, sites, []Number{number}, row.value)
				level, gap := ground(t, b, q.Terms()...)
				assert.InDelta(t, level.Energy, g.Energy, 1e-12)
				assert.Equal(t, row.value%2 == 1, g.Odd)
				if b.Dim() == 1 {
					assert.True(t, math.IsInf(g.Gap, 1))
				} else {
					assert.InDelta(t, gap, g.Gap, 1e-11)
				}
				compareStates(t, b, level.Vector, g)
			})
		}
	}
}

func compareStates(t *testing.T, b *Basis, psi []complex128, g *Gaussian) {
	t.Helper()
	for _, names := range [][2]string{{"c^+", "c"}, {"c", "c^+"}, {"c", "c"}, {"c^+", "c^+"}, {"n", "n"}} {
		want := b.TwoPoint(psi, names[0], names[1])
		for i := range want {
			for j := range want {
				got := g.TwoPoint(names[0], i, names[1], j)
				assert.InDelta(t, 0, cmplx.Abs(got-want[i][j]), 1e-10, "<%s_%d %s_%d>", names[0], i, names[1], j)
			}
		}
	}
	for _, term := range []Term{
		T(1, "c^+", 0, "c^+", 4, "c", 2, "c", 1), T(2i, "c", 5, "n", 3, "c^+", 1), T(1, "n", 1, "c", 0, "n", 6, "c", 2),
		T(1, "n", 0, "n", 2, "n", 4), T(1, "c", 1), T(0.5),
	} {
		assert.InDelta(t, 0, cmplx.Abs(g.Expect(term)-b.Expect(psi, term)), 1e-10)
	}
	for i, v := range b.Local(psi, "n") {
		assert.InDelta(t, real(v), g.Density(i), 1e-11)
	}
	want, err := b.Entropies(psi)
	require.NoError(t, err)
	got, err := g.Entropies(1)
	require.NoError(t, err)
	assert.InDeltaSlice(t, want, got, 1e-10)
	renyi, err := b.Renyi2(psi)
	require.NoError(t, err)
	one, err := g.Renyi2([]int{0, 1, 2})
	require.NoError(t, err)
	assert.InDelta(t, renyi[2], one, 1e-10)
}

func TestFreeErrors(t *testing.T) {
	q := NewQuadratic(3)
	q.Hop(0, 1, 1)
	_, err := q.Filled(4)
	assert.ErrorContains(t, err, "4 particles in 3 modes")
	_, err = q.Lowest(false) // mode 2 has no energy
	assert.ErrorContains(t, err, "not unique")
	q.Pair(0, 1, 1)
	_, err = q.Filled(1)
	assert.ErrorContains(t, err, "not conserved")
	_, err = q.Levels()
	assert.ErrorContains(t, err, "not conserved")
}

func TestPfaffian(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 1))
	const n = 4
	a := make([]complex128, n*n)
	for i := range n {
		for j := range i {
			z := complex(rng.NormFloat64(), rng.NormFloat64())
			a[i*n+j], a[j*n+i] = z, -z
		}
	}
	at := func(i, j int) complex128 { return a[i*n+j] }
	want := at(0, 1)*at(2, 3) - at(0, 2)*at(1, 3) + at(0, 3)*at(1, 2)
	assert.InDelta(t, 0, cmplx.Abs(Pfaffian(n, append([]complex128(nil), a...))-want), 1e-14)
	assert.Equal(t, complex128(0), Pfaffian(3, make([]complex128, 9)))
	assert.Equal(t, complex128(0), Pfaffian(2, make([]complex128, 4)))
}

// TestSpinlessChainIsXX ties free fermions to the closed form of the XX chain.
func TestSpinlessChainIsXX(t *testing.T) {
	const n = 40
	q := NewQuadratic(n)
	for j := range n - 1 {
		q.Hop(j, j+1, -0.5)
	}
	levels, err := q.Levels()
	require.NoError(t, err)
	var e float64
	for _, l := range levels {
		e += min(l, 0)
	}
	assert.InDelta(t, XXChain(n), e, 1e-12)
	g, err := q.Filled(n / 2)
	require.NoError(t, err)
	assert.InDelta(t, e, g.Energy, 1e-12)
}

// TestIsingAsFermions ties the pairing solution to the critical Ising chain:
// -sum X X - sum Z is -sum (c^+ - c)(c'^+ + c') - sum (1 - 2 n).
func TestIsingAsFermions(t *testing.T) {
	const n = 30
	q := NewQuadratic(n)
	for j := range n {
		q.Energy(j, 2)
		if j+1 < n {
			q.Hop(j, j+1, -1)
			q.Pair(j, j+1, -1)
		}
	}
	g, err := q.Lowest(false)
	require.NoError(t, err)
	assert.InDelta(t, IsingChain(n), g.Energy-n, 1e-11)
}
