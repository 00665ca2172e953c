package dense

import (
	"fmt"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// zooSizes are sizes on both sides of every block width; zooShapes make tall and wide matrices of leading columns or rows.
var (
	zooSizes      = []int{1, 2, 3, 5, 8, 17, 40, 65}
	zooLargeSizes = []int{131, 200}
)

func TestZooIsLarge(t *testing.T) {
	assert.GreaterOrEqual(t, len(zoo), 40)
	names := map[string]bool{}
	for _, k := range zoo {
		assert.False(t, names[k.name], k.name)
		names[k.name] = true
	}
}

func TestZoo(t *testing.T) {
	eachKernels(t, func(t *testing.T) {
		for _, n := range zooSizes {
			t.Run(fmt.Sprintf("n=%d", n), func(t *testing.T) { both(t, zooAt[float64](n), zooAt[complex128](n)) })
		}
	})
}

func TestZooLarge(t *testing.T) {
	for i, n := range zooLargeSizes {
		t.Run(fmt.Sprintf("n=%d", n), func(t *testing.T) {
			if i%2 == 0 {
				zooAt[complex128](n)(t)
			} else {
				zooAt[float64](n)(t)
			}
		})
	}
}

// zooAt checks all factorizations of all kinds of size n.
func zooAt[T Scalar](n int) func(t *testing.T) {
	return func(t *testing.T) {
		var f SVD[T]
		var h Hermitian[T]
		var w Workspace[T]
		for _, k := range zoo {
			a := zooMatrix[T](k, n, false)
			zooSVD(t, &f, k.name, n, n, a)
			zooQR(t, k.name, n, n, a, &w)
			if n > 1 { // its first columns and rows
				half := n / 2
				zooSVD(t, &f, k.name, half, n, a[:half*n])
				tall := make([]T, n*half)
				copyMatrix(n, half, 1, a, n, tall, half)
				zooSVD(t, &f, k.name, n, half, tall)
				zooQR(t, k.name, n, half, tall, &w)
			}
			zooHermitian(t, &h, k.name, n, zooMatrix[T](k, n, true))
		}
	}
}

func zooSVD[T Scalar](t *testing.T, f *SVD[T], name string, m, n int, a []T) {
	t.Helper()
	k := min(m, n)
	name = fmt.Sprintf("%s %d×%d", name, m, n)
	require.NoError(t, f.Factor(m, n, a, n), name)
	s := f.Values()
	u, vh := make([]T, m*k), make([]T, k*n)
	f.Vectors(k, u, k, vh, n)
	for j, v := range s {
		if !(v >= 0) || (j > 0 && v > s[j-1]) {
			t.Errorf("%s: values %v are not decreasing and positive", name, s)
			break
		}
	}
	small(t, orthogonality(m, k, u), svdBound, "%s: U", name)
	small(t, orthogonality(n, k, transposed(k, n, vh)), svdBound, "%s: V", name)
	c, exact := rescaled(a, s)
	for j := range u {
		u[j] *= FromFloat[T](exact[j%k])
	}
	small(t, reconstruction(m, n, k, c, u, vh), svdBound*coarseness(a), "%s: A - USV", name)
	if haveNetlib {
		compareNetlib(t, name, m, n, c, exact, valueBound*coarseness(a))
	}
}

// rescaled brings matrices of extreme magnitude, and their values, to where norms of differences are meaningful.
func rescaled[T Scalar](a []T, values []float64) ([]T, []float64) {
	return scaledLike(a, a), scaledLike(a, values)
}

// scaledLike returns x divided by a power of two near the largest entry of a.
func scaledLike[T, U Scalar](a []T, x []U) []U {
	out := append([]U(nil), x...)
	if top := largest(1, len(a), a, len(a)); top != 0 {
		_, exp := math.Frexp(top)
		Scale(FromFloat[U](math.Ldexp(1, max(-1022, min(1022, -exp)))), out)
	}
	return out
}

// coarseness is how much further apart numbers of the size of a's largest are than eps times that size: more than 1 for subnormal ones.
func coarseness[T Scalar](a []T) float64 {
	top := largest(1, len(a), a, len(a))
	if top == 0 {
		return 1
	}
	return max(1, 0x1p-1074/(eps*top))
}

// compareNetlib holds singular values against LAPACK's.
func compareNetlib[T Scalar](t *testing.T, name string, m, n int, a []T, values []float64, bound float64) {
	t.Helper()
	k := min(m, n)
	want := make([]float64, k)
	require.True(t, netlibSVD(m, n, append([]T(nil), a...), want, make([]T, m*k), make([]T, k*n)), name)
	for j := range want {
		if d := math.Abs(values[j] - want[j]); !(d <= bound*eps*float64(max(m, n))*want[0]) {
			t.Errorf("%s: value %d is %g, LAPACK's is %g", name, j, values[j], want[j])
			return
		}
	}
}

func zooQR[T Scalar](t *testing.T, name string, m, n int, a []T, w *Workspace[T]) {
	t.Helper()
	k := min(m, n)
	name = fmt.Sprintf("%s %d×%d", name, m, n)
	q, r := make([]T, m*k), make([]T, k*n)
	QR(m, n, a, n, q, k, r, n, w)
	c, _ := rescaled(a, nil)
	small(t, orthogonality(m, k, q), qrBound, "QR of %s: Q", name)
	checkTrapezoid(t, input(k, n, 0, 0, r), name)
	small(t, reconstruction(m, n, k, c, q, scaledLike(a, r)), qrBound*coarseness(a), "QR of %s: A - QR", name)
}

func zooHermitian[T Scalar](t *testing.T, h *Hermitian[T], name string, n int, a []T) {
	t.Helper()
	name = fmt.Sprintf("Hermitian %s n=%d", name, n)
	require.NoError(t, h.Factor(n, a, n), name)
	values := h.Values()
	for j := 1; j < n; j++ {
		if !(values[j] >= values[j-1]) {
			t.Errorf("%s: values %v are not ascending", name, values)
			break
		}
	}
	v := make([]T, n*n)
	h.Largest(n, v, n)
	small(t, orthogonality(n, n, v), svdBound, "%s: V", name)
	c, exact := rescaled(a, values)
	dv := append([]T(nil), v...)
	for i := range dv {
		dv[i] *= FromFloat[T](exact[n-1-i%n])
	}
	small(t, reconstruction(n, n, n, c, dv, transposed(n, n, v)), svdBound*coarseness(a), "%s: A - VDV", name)
}
