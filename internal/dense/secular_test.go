package dense

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
)

// TestSecularLoops compares the sums over poles with the sums written out. Poles are between 0 and 1, x is above all or below all: no
// cancellation within a sum.
func TestSecularLoops(t *testing.T) {
	eachKernels(t, func(t *testing.T) {
		rng := rand.New(rand.NewPCG(5, 6))
		for n := 1; n < 70; n++ {
			for _, pole := range []float64{3, -2} {
				d, z := make([]float64, n), make([]float64, n)
				for i := range d {
					d[i], z[i] = rng.Float64(), rng.NormFloat64()
				}
				checkSecularLoops(t, d, z, pole, 0.25*rng.Float64(), pole+1.5)
			}
		}
	})
}

func checkSecularLoops(t *testing.T, d, z []float64, pole, off, other float64) {
	n := len(d)
	for _, squared := range []bool{false, true} {
		s := secular{squared: squared}
		sum, slope := 0.0, 0.0
		gap := func(x, pole, off float64) float64 {
			if squared {
				return ((x - pole) - off) * ((x + pole) + off)
			}
			return (x - pole) - off
		}
		product := input(1, n, 0, n%4, z)
		want := make([]float64, n)
		for i, x := range d {
			q := z[i] / gap(x, pole, off)
			sum, slope = sum+z[i]*q, slope+q*q
			want[i] = z[i] * (gap(x, pole, off) / gap(x, other, 0))
		}
		gotSum, gotSlope := s.sums(d, z, pole, off)
		assert.InEpsilon(t, slope, gotSlope, 20*eps*float64(n+1), "derivative, n=%d", n)
		assert.InDelta(t, sum, gotSum, 20*eps*float64(n+1)*(math.Abs(sum)+math.Sqrt(slope)*Norm(z)), "sum, n=%d", n)
		s.quotients(product.a, d, pole, off, other)
		for i, x := range want {
			assert.InEpsilon(t, x, product.a[i], 20*eps, "quotient %d of %d", i, n)
		}
		product.checkGuards(t, "quotients")
		kinds := []rowKind{plainRow}
		if squared {
			kinds = []rowKind{squaredRow, leftRow}
		}
		for _, kind := range kinds {
			row := newPadded[float64](1, n, 0, n%3, math.NaN())
			got, squares := coefficientRow(kind, d, z, row.a, pole, off), 0.0
			for i, x := range d {
				q := z[i] / gap(x, pole, off)
				if kind == leftRow {
					q *= x
				}
				squares += q * q
				assert.InEpsilon(t, q, row.a[i], 20*eps, "kind %d: coefficient %d of %d", kind, i, n)
			}
			assert.InEpsilon(t, squares, got, 20*eps*float64(n+1), "kind %d: sum of squares, n=%d", kind, n)
			row.checkGuards(t, "coefficients")
		}
	}
}
