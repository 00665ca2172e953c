package mpo

import (
	"fmt"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// randomOperator draws a sum and returns it with its matrix.
func randomOperator[T dense.Scalar](t *testing.T, rng *rand.Rand, g block.Group, kinds []kindTable, charge block.Charge, terms int) (*Operator[T], []complex128) {
	t.Helper()
	s := newSum(g, kinds...)
	s.Charge = charge
	s.addRandom(rng, terms, 3, coupling(rng, dense.IsComplex[T]()))
	o, err := Build[T](s.Strings, Options{})
	require.NoError(t, err)
	return o, s.dense()
}

func multiplied(a, b []complex128) []complex128 {
	n := 1
	for n*n < len(a) {
		n++
	}
	c := make([]complex128, n*n)
	for i := range n {
		for k := range n {
			for j := range n {
				c[i*n+j] += a[i*n+k] * b[k*n+j]
			}
		}
	}
	return c
}

func adjoint(a []complex128) []complex128 {
	n := 1
	for n*n < len(a) {
		n++
	}
	c := make([]complex128, n*n)
	for i := range n {
		for j := range n {
			c[i*n+j] = complex(real(a[j*n+i]), -imag(a[j*n+i]))
		}
	}
	return c
}

func testAlgebra[T dense.Scalar](t *testing.T, name string) {
	for seed := range uint64(seeds) {
		rng := rand.New(rand.NewPCG(seed, 5))
		g, kinds := families()[name]()
		if name == "clocks" && !dense.IsComplex[T]() {
			return
		}
		var raised block.Charge
		if seed == 1 {
			raised = kinds[0].Charges[2] // an operator that changes the charge
		}
		a, ha := randomOperator[T](t, rng, g, kinds, block.Charge{}, 6)
		b, hb := randomOperator[T](t, rng, g, kinds, raised, 5)

		requireOperator(t, adjoint(hb), Adjoint(b))
		requireOperator(t, multiplied(ha, hb), Product(a, b))
		requireOperator(t, multiplied(adjoint(hb), ha), Product(Adjoint(b), a))

		c := dense.FromFloat[T](-0.37)
		scaled, shifted := make([]complex128, len(ha)), append([]complex128(nil), ha...)
		n := 1
		for n*n < len(ha) {
			n++
		}
		for i, x := range hb {
			scaled[i] = -0.37 * x
		}
		for i := range n {
			shifted[i*n+i] -= 0.37
		}
		requireOperator(t, scaled, Scale(c, b))
		requireOperator(t, shifted, ShiftIdentity(a, c))
		requireOperator(t, ha, ShiftIdentity(ShiftIdentity(a, c), -c))

		b, hb = randomOperator[T](t, rng, g, kinds, block.Charge{}, 5)
		sum := append([]complex128(nil), ha...)
		for i, x := range hb {
			sum[i] += x
		}
		requireOperator(t, sum, Add(a, b))
		requireOperator(t, make([]complex128, len(ha)), Add(a, Scale(dense.FromFloat[T](-1), a)))
		requireOperator(t, ha, Add(a, Scale(dense.FromFloat[T](0), a)))
	}
}

func TestAlgebra(t *testing.T) {
	for name := range families() {
		t.Run(name+"/real", func(t *testing.T) { testAlgebra[float64](t, name) })
		t.Run(name+"/complex", func(t *testing.T) { testAlgebra[complex128](t, name) })
	}
}

// A square keeps the digits of small elements beside large ones: energies up to 1e3 n(n-1)/2 at n = 12 beside a link of one.
func TestProductKeepsDigits(t *testing.T) {
	g := testGroup(0)
	s := newSum(g, bosonKind(g, 12), bosonKind(g, 12))
	for i := range int32(2) {
		s.add(500, i, 4)
	}
	s.add(-1, 0, 2, 1, 1)
	s.add(-1, 0, 1, 1, 2)
	o, err := Build[float64](s.Strings, Options{})
	require.NoError(t, err)
	h := o.Dense()
	square := Product(o, o).Dense()
	at := func(n, m int) int { return 13*n + m }
	// From |1 1>: one hop each way, amplitude sqrt 2; then (H^2)(11,11) = 2 + 2, exactly but for a few roundings.
	require.InDelta(t, -1.4142135623730951, h[at(2, 0)*169+at(1, 1)], 1e-15)
	require.InDelta(t, 4, square[at(1, 1)*169+at(1, 1)], 1e-14)
	require.InDelta(t, 1, square[at(0, 1)*169+at(0, 1)], 1e-14)
}

func TestMisuse(t *testing.T) {
	g := testGroup(0)
	one, _ := randomOperator[float64](t, rand.New(rand.NewPCG(1, 1)), g, []kindTable{spinKind(g, 1), spinKind(g, 1)}, block.Charge{}, 2)
	two, _ := randomOperator[float64](t, rand.New(rand.NewPCG(1, 1)), g, []kindTable{spinKind(g, 2), spinKind(g, 1)}, block.Charge{}, 2)
	up, _ := randomOperator[float64](t, rand.New(rand.NewPCG(1, 1)), g, []kindTable{spinKind(g, 1), spinKind(g, 1)}, block.Charge{2}, 1)
	require.PanicsWithValue(t, fmt.Sprintf("mpo: sum of operators on different spaces: %v, local dimensions [2 2], and %v, local dimensions [3 2]", g, g), func() { Add(one, two) })
	require.Panics(t, func() { Product(one, two) })
	require.PanicsWithValue(t, "mpo: sum of operators of charges [0 0 0 0] and [2 0 0 0]", func() { Add(one, up) })
	require.PanicsWithValue(t, "mpo: multiple of the identity added to an operator of charge [2 0 0 0]", func() { ShiftIdentity(up, 1) })
}
