package dense

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// eigenproblem checks Eigen on the Hermitian matrix whose upper triangle is a's; what is below is NaN.
func eigenproblem[T Scalar](t *testing.T, name string, n, pad int, a []T, w *Workspace[T]) (values []float64, full []T) {
	t.Helper()
	full = make([]T, n*n)
	in := input(n, n, pad, 1, make([]T, n*n))
	for i := range n {
		for j := range n {
			switch {
			case i == j:
				full[i*n+i] = FromFloat[T](Real(a[i*n+i]))
				in.a[i*in.ld+i] = a[i*n+i] // the imaginary part must not count
			case i < j:
				full[i*n+j] = a[i*n+j]
				full[j*n+i] = Conj(a[i*n+j])
				in.a[i*in.ld+j] = a[i*n+j]
			default:
				in.a[i*in.ld+j] = FromFloat[T](math.NaN())
			}
		}
	}
	values = make([]float64, n)
	v := newPadded[T](n, n, (pad+1)%3, 3, -9)
	require.NoError(t, Eigen(n, in.a, in.ld, values, v.a, v.ld, w), name)
	in.checkGuards(t, name)
	v.checkGuards(t, name)
	for i := 1; i < n; i++ {
		if !(values[i] >= values[i-1]) {
			t.Errorf("%s: values %v are not ascending", name, values)
			break
		}
	}
	dv := v.compact()
	for i := range dv {
		dv[i] *= FromFloat[T](values[i%n])
	}
	small(t, reconstruction(n, n, n, full, dv, transposed(n, n, v.compact())), svdBound, "%s: A - VDV", name)
	small(t, orthogonality(n, n, v.compact()), svdBound, "%s: V", name)
	return values, full
}

func TestEigen(t *testing.T) { both(t, testEigen[float64], testEigen[complex128]) }

func testEigen[T Scalar](t *testing.T) {
	var w Workspace[T]
	sizes := []int{50, 65, 100, 128}
	for n := range 41 {
		sizes = append(sizes, n)
	}
	for _, n := range sizes {
		for i, s := range samples[T](n, n) {
			name := fmt.Sprintf("%s n=%d", s.name, n)
			values, full := eigenproblem(t, name, n, i%3, s.a, &w)
			if n > 40 || n%3 != 0 {
				continue
			}
			want := make([]float64, n)
			v := make([]T, n*n)
			require.NoError(t, JacobiEigen(n, full, n, want, v, n), name)
			scale := 0.0
			for _, x := range want {
				scale = max(scale, math.Abs(x))
			}
			for j := range want {
				if d := math.Abs(values[j] - want[j]); !(d <= valueBound*eps*float64(n)*scale) {
					t.Errorf("%s: value %d is %g, by rotations %g", name, j, values[j], want[j])
					break
				}
			}
		}
	}
}

// TestEigenGivenSpectrum: Q D Q^H has the eigenvalues it was made of, positive and negative, degenerate and clustered.
func TestEigenGivenSpectrum(t *testing.T) {
	both(t, testEigenGivenSpectrum[float64], testEigenGivenSpectrum[complex128])
}

func testEigenGivenSpectrum[T Scalar](t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for _, row := range []struct {
		name string
		d    func(i int) float64 // ascending
	}{
		{"both signs", func(i int) float64 { return float64(i) - 10.5 }},
		{"degenerate", func(i int) float64 { return float64(i / 5) }},
		{"all equal", func(i int) float64 { return -3 }},
		{"clustered", func(i int) float64 { return 1 + 1e-13*float64(i) }},
		{"positive graded", func(i int) float64 { return math.Pow(10, float64(i)-20) }},
		{"projector", func(i int) float64 { return float64(i / 15) }},
	} {
		const n = 24
		x, q, r := make([]T, n*n), make([]T, n*n), make([]T, n*n)
		Random(rng, x)
		QR(n, n, x, n, q, n, r, n, nil)
		copy(r, q)
		for i := range r {
			r[i] *= FromFloat[T](row.d(i % n))
		}
		Gemm(NoTrans, ConjTrans, n, n, n, 1, r, n, q, n, 0, x, n)
		values, _ := eigenproblem[T](t, row.name, n, 0, x, nil)
		for i, v := range values {
			assert.InDelta(t, row.d(i), v, 10*eps*n*max(math.Abs(row.d(0)), math.Abs(row.d(n-1))), "%s %d", row.name, i)
		}
	}
}

func TestTridiagonalEigen(t *testing.T) {
	for _, n := range []int{0, 1, 2, 3, 10, 63, 64, 65, 90} {
		// Chain hopping: 2 cos(k pi/(n+1)).
		d, e, values, v := make([]float64, n), make([]float64, max(0, n-1)), make([]float64, n), make([]float64, n*n)
		for i := range e {
			e[i] = -1
		}
		require.NoError(t, TridiagonalEigen(d, e, values, v))
		for k, got := range values {
			assert.InDelta(t, -2*math.Cos(float64(k+1)*math.Pi/float64(n+1)), got, float64(8+n/4)*eps, "n=%d k=%d", n, k)
			// Components sqrt(2/(n+1)) sin(...) up to a sign.
			for i := range n {
				want := math.Sqrt(2/float64(n+1)) * math.Sin(float64((i+1)*(k+1))*math.Pi/float64(n+1))
				assert.InDelta(t, math.Abs(want), math.Abs(v[i*n+k]), float64(10+n*n)*eps, "n=%d", n)
			}
		}
		for i := range d {
			assert.Zero(t, d[i], "d was modified")
		}
		for i := range e {
			assert.EqualValues(t, -1, e[i], "e was modified")
		}
	}
}

func TestTridiagonalEigenExtremes(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for _, row := range []struct {
		name string
		f    func(i int) float64
	}{
		{"random", func(int) float64 { return rng.NormFloat64() }},
		{"zero", func(int) float64 { return 0 }},
		{"huge", func(int) float64 { return 1e160 * rng.NormFloat64() }},
		{"tiny", func(int) float64 { return 1e-160 * rng.NormFloat64() }},
		{"growing", func(i int) float64 { return math.Pow(10, float64(i)) }},
		{"falling", func(i int) float64 { return math.Pow(10, -float64(i)) }},
		{"split", func(i int) float64 { return float64(i % 2) }},
	} {
		t.Run(row.name, func(t *testing.T) {
			const n = 20
			d, e, values, v := make([]float64, n), make([]float64, n-1), make([]float64, n), make([]float64, n*n)
			full := make([]float64, n*n)
			for i := range n {
				d[i] = row.f(i)
				full[i*n+i] = d[i]
			}
			for i := range e {
				e[i] = row.f(i + 1)
				full[i*n+i+1], full[(i+1)*n+i] = e[i], e[i]
			}
			require.NoError(t, TridiagonalEigen(d, e, values, v))
			dv := append([]float64(nil), v...)
			for i := range dv {
				dv[i] *= values[i%n]
			}
			small(t, reconstruction(n, n, n, full, dv, transposed(n, n, v)), svdBound, "A - VDV")
			small(t, orthogonality(n, n, v), svdBound, "V")
		})
	}
	var num *NumericalError
	for _, bad := range []float64{math.NaN(), math.Inf(-1)} {
		err := TridiagonalEigen([]float64{1, 2}, []float64{bad}, make([]float64, 2), make([]float64, 4))
		assert.True(t, errors.As(err, &num), "%v", err)
		err = TridiagonalEigen([]float64{1, bad}, []float64{1}, make([]float64, 2), make([]float64, 4))
		assert.True(t, errors.As(err, &num), "%v", err)
	}
}

// TestJacobi checks the oracle by what it claims alone.
func TestJacobi(t *testing.T) { both(t, testJacobi[float64], testJacobi[complex128]) }

func testJacobi[T Scalar](t *testing.T) {
	for _, shape := range [][2]int{{0, 0}, {0, 3}, {1, 1}, {2, 2}, {3, 2}, {2, 3}, {5, 5}, {9, 4}, {4, 9}, {20, 20}} {
		m, n := shape[0], shape[1]
		k := min(m, n)
		for _, s := range samples[T](m, n) {
			name := fmt.Sprintf("%s %d×%d", s.name, m, n)
			values, u, vh := make([]float64, k), make([]T, m*k), make([]T, k*n)
			require.NoError(t, JacobiSVD(m, n, s.a, n, values, u, k, vh, n), name)
			small(t, orthogonality(m, k, u), svdBound, "%s: U", name)
			small(t, orthogonality(n, k, transposed(k, n, vh)), svdBound, "%s: V", name)
			for i := range u {
				u[i] *= FromFloat[T](values[i%k])
			}
			small(t, reconstruction(m, n, k, s.a, u, vh), svdBound, "%s: A - USV", name)
			if m != n {
				continue
			}
			full := make([]T, n*n)
			for i := range n {
				full[i*n+i] = FromFloat[T](Real(s.a[i*n+i]))
				for j := range i {
					full[i*n+j], full[j*n+i] = s.a[i*n+j], Conj(s.a[i*n+j])
				}
			}
			v := make([]T, n*n)
			require.NoError(t, JacobiEigen(n, full, n, values, v, n), name)
			small(t, orthogonality(n, n, v), svdBound, "%s: eigenvectors", name)
			dv := append([]T(nil), v...)
			for i := range dv {
				dv[i] *= FromFloat[T](values[i%n])
			}
			small(t, reconstruction(n, n, n, full, dv, transposed(n, n, v)), svdBound, "%s: A - VDV", name)
		}
	}
}
