package dense

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/lapack/gonum"
)

// bands are diagonals and off-diagonals of small matrices.
var bands = []struct {
	name string
	f    func(rng *rand.Rand, i int) (d, e float64)
}{
	{"normal", func(rng *rand.Rand, i int) (d, e float64) { return rng.NormFloat64(), rng.NormFloat64() }},
	{"zero", func(rng *rand.Rand, i int) (d, e float64) { return 0, 0 }},
	{"identity", func(rng *rand.Rand, i int) (d, e float64) { return 1, 0 }},
	{"only off-diagonal", func(rng *rand.Rand, i int) (d, e float64) { return 0, 1 }},
	{"ones", func(rng *rand.Rand, i int) (d, e float64) { return 1, 1 }},
	{"weakly coupled", func(rng *rand.Rand, i int) (d, e float64) { return 1, 1e-9 * rng.NormFloat64() }},
	{"at the threshold", func(rng *rand.Rand, i int) (d, e float64) { return 1, deflation * (1 + rng.NormFloat64()/4) }},
	{"with zeros", func(rng *rand.Rand, i int) (d, e float64) {
		return float64(rng.IntN(3) - 1), float64(rng.IntN(3) - 1)
	}},
	{"falling", func(rng *rand.Rand, i int) (d, e float64) {
		return math.Pow(10, -float64(i)), math.Pow(10, -float64(i))
	}},
	{"rising", func(rng *rand.Rand, i int) (d, e float64) { return math.Pow(10, float64(i)), -math.Pow(10, float64(i)) }},
	{"subnormal beside one", func(rng *rand.Rand, i int) (d, e float64) {
		if i%5 == 0 {
			return 1, 1e-322
		}
		return 3e-323 * float64(rng.IntN(4)), 2e-323 * float64(rng.IntN(4))
	}},
	{"subnormal", func(rng *rand.Rand, i int) (d, e float64) { return 1e-320 * float64(i), 1e-320 }},
	{"at the limit", func(rng *rand.Rand, i int) (d, e float64) {
		return 1e307 * rng.NormFloat64(), 1e307 * rng.NormFloat64()
	}},
	{"any magnitude", func(rng *rand.Rand, i int) (d, e float64) {
		return math.Pow(10, 300*(rng.Float64()-1)), math.Pow(10, 300*(rng.Float64()-1))
	}},
	{"clusters", func(rng *rand.Rand, i int) (d, e float64) {
		return float64(1+i/7) + 1e-15*rng.NormFloat64(), 1e-7 * float64(i%7)
	}},
}

func band(name string, n int, f func(rng *rand.Rand, i int) (d, e float64)) (d, e []float64) {
	rng := rand.New(rand.NewPCG(uint64(n), uint64(len(name))))
	d, e = make([]float64, n), make([]float64, n)
	for i := range n {
		d[i], e[i] = f(rng, i)
	}
	return d, e
}

// scaledBand returns d and e near 1, as normalize does, but with nothing set to zero.
func scaledBand(d, e []float64) (sd, se []float64, scale float64) {
	all := append(append([]float64(nil), d...), e[:len(d)-1]...)
	scaled := scaledLike(all, all)
	return scaled[:len(d)], scaled[len(d):], scaledLike(all, []float64{1})[0]
}

// TestBidiagonalSVD checks divide and conquer alone, against the QR iteration of gonum.
func TestBidiagonalSVD(t *testing.T) {
	var b bidiagonalSVD
	for _, row := range bands {
		for _, n := range []int{1, 2, 3, 4, 5, 7, 8, 15, 16, 17, 33, 64, 90} {
			name := fmt.Sprintf("%s n=%d", row.name, n)
			d, e := band(row.name, n, row.f)
			require.True(t, b.factor(d, e, nil), name)
			values, left, right := make([]float64, n), make([]float64, n*n), make([]float64, n*n)
			b.sorted(values)
			b.vectors(n, true, left)
			b.vectors(n, false, right)
			small(t, orthogonality(n, n, left), svdBound, "%s: left", name)
			small(t, orthogonality(n, n, right), svdBound, "%s: right", name)

			sd, se, scale := scaledBand(d, e)
			full, sr := make([]float64, n*n), append([]float64(nil), right...)
			for i := range n {
				full[i*n+i] = sd[i]
				if i+1 < n {
					full[i*n+i+1] = se[i]
				}
				Scale(values[i]*scale, sr[i*n:(i+1)*n])
			}
			small(t, reconstruction(n, n, n, full, transposed(n, n, left), sr), svdBound*coarseness(d), "%s: B - L^T S R", name)
			var reference gonum.Implementation
			want := append([]float64(nil), sd...)
			require.True(t, reference.Dbdsqr(blas.Upper, n, 0, 0, 0, want, append([]float64(nil), se...), nil, 1, nil, 1, nil, 1, make([]float64, 4*n)), name)
			for i := range want {
				assert.InDelta(t, want[i], values[i]*scale, valueBound*eps*float64(n)*max(want[0], 1e-300)*coarseness(d), "%s: value %d", name, i)
			}
		}
	}
}

// TestTridiagonalDivide does so for symmetric matrices, against rotations: the QL iteration of gonum is wrong by magnitudes where
// subnormal numbers stand beside large ones.
func TestTridiagonalDivide(t *testing.T) {
	var b tridiagonalEigen
	for _, row := range bands {
		for _, n := range []int{1, 2, 3, 4, 5, 7, 8, 15, 16, 17, 33, 64, 90} {
			name := fmt.Sprintf("%s n=%d", row.name, n)
			d, e := band(row.name, n, row.f)
			require.True(t, b.factor(d, e, nil), name)
			values, rows := make([]float64, n), make([]float64, n*n)
			b.sorted(values)
			b.vectors(0, 1, n, rows)
			small(t, orthogonality(n, n, rows), svdBound, "%s: vectors", name)

			sd, se, scale := scaledBand(d, e)
			full, scaled := make([]float64, n*n), append([]float64(nil), rows...)
			for i := range n {
				full[i*n+i] = sd[i]
				if i+1 < n {
					full[i*n+i+1], full[(i+1)*n+i] = se[i], se[i]
				}
				Scale(values[i]*scale, scaled[i*n:(i+1)*n])
			}
			small(t, reconstruction(n, n, n, full, transposed(n, n, rows), scaled), svdBound*coarseness(d), "%s: T - Z^T X Z", name)
			if n > 33 {
				continue
			}
			want := make([]float64, n)
			require.NoError(t, JacobiEigen(n, full, n, want, make([]float64, n*n), n), name)
			top := max(math.Abs(want[0]), math.Abs(want[n-1]), 1e-300)
			for i := range want {
				assert.InDelta(t, want[i], values[i]*scale, valueBound*eps*float64(n)*top*coarseness(d), "%s: value %d", name, i)
			}
		}
	}
}

// TestSecular solves equations whose poles and weights span many magnitudes: the roots interlace with the poles, and f changes sign
// across each within a few units in the last place of its distance from the pole.
func TestSecular(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 8))
	for _, squared := range []bool{false, true} {
		for k := 1; k < 60; k++ {
			s := secular{d: make([]float64, k), z: make([]float64, k), origin: make([]int, k), offset: make([]float64, k), squared: squared}
			for i := range k {
				if i > 0 {
					s.d[i] = s.d[i-1] + math.Pow(10, -14*rng.Float64())
				}
				s.z[i] = math.Pow(10, -14*rng.Float64())
			}
			require.True(t, s.solve())
			for i := range k {
				pole, x := s.d[s.origin[i]], s.offset[i]
				assert.Positive(t, -s.gap(i, pole, x), "root %d of %d lies above its pole", i, k)
				if i+1 < k {
					assert.Positive(t, s.gap(i+1, pole, x), "root %d of %d lies below the next pole", i, k)
				}
				f := func(x float64) float64 {
					sum, _ := s.sums(s.d, s.z, pole, x)
					return 1 + sum
				}
				sum, _ := s.sums(s.d[:i+1], s.z[:i+1], pole, x)
				rest, _ := s.sums(s.d[i+1:], s.z[i+1:], pole, x)
				tolerance := 20 * eps * (1 + math.Abs(sum) + math.Abs(rest))
				low, high := x-8*eps*math.Abs(x), x+8*eps*math.Abs(x)
				assert.True(t, math.Abs(f(x)) <= tolerance || f(low)*f(high) <= 0, "root %d of %d: f = %g", i, k, f(x))
			}
		}
	}
}
