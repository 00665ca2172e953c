package mpo

import (
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// addNear appends terms on one site or on two neighbours that add no charge. Odd ones, which carry signs along the chain, are left out.
func (s *sum) addNear(rng *rand.Rand, terms int, draw func() complex128) {
	for terms > 0 {
		i := rng.IntN(len(s.Axes))
		var q block.Charge
		var factors []int32
		odd := false
		for k := i; k <= min(i+rng.IntN(2), len(s.Axes)-1); k++ {
			op := 1 + rng.IntN(len(s.Tables[k].Matrices)-1)
			q = s.Group.Add(q, s.Tables[k].Charges[op])
			factors = append(factors, int32(k), int32(op))
			odd = odd != s.Tables[k].Odd[op]
		}
		if q == s.Charge && !odd {
			s.add(draw(), factors...)
			terms--
		}
	}
}

// Where no term is longer than two neighbours the two-site variance is the variance; where some are it is less.
func testTwoSiteVariance[T dense.Scalar](t *testing.T, name string, near bool) (short int) {
	for seed := range uint64(4) {
		rng := rand.New(rand.NewPCG(seed, 31))
		g, kinds := families()[name]()
		s := newSum(g, kinds...)
		if near {
			s.addNear(rng, 25, coupling(rng, dense.IsComplex[T]()))
		} else {
			s.addRandom(rng, 15, 3, coupling(rng, dense.IsComplex[T]()))
		}
		if !s.Real && !dense.IsComplex[T]() {
			continue
		}
		o, err := Build[T](s.Strings, Options{})
		require.NoError(t, err)
		charges := stateCharges(g, s.Axes)
		psi := randomState[T](t, rng, g, s.Axes, charges[rng.IntN(len(charges))])
		_, err = psi.Truncate(block.Cut{Bond: 2}, nil)
		require.NoError(t, err)
		psi.Scale(dense.FromFloat[T](1.7))
		before := psi.Clone()
		full, rounding := Variance(psi, o, nil)
		got, flops := TwoSiteVariance(psi, o, task.New(2))
		require.Equal(t, before, psi, "states are left alone")
		require.Positive(t, flops)
		if near {
			require.InDelta(t, full, got, 1e-12*full+rounding, "seed %d", seed)
			continue
		}
		require.LessOrEqual(t, got, full*(1+1e-12)+rounding)
		if got < 0.99*full {
			short++
		}
	}
	return short
}

func TestTwoSiteVariance(t *testing.T) {
	for name := range families() {
		t.Run(name+"/real", func(t *testing.T) {
			if name != "clocks" {
				testTwoSiteVariance[float64](t, name, true)
			}
		})
		t.Run(name+"/complex", func(t *testing.T) { testTwoSiteVariance[complex128](t, name, true) })
	}
}

// Terms of any reach lead out of what two neighbours span.
func TestTwoSiteVarianceMisses(t *testing.T) {
	short := 0
	for name := range families() {
		short += testTwoSiteVariance[complex128](t, name, false)
	}
	require.Positive(t, short)
}
