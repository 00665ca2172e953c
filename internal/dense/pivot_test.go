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

func TestPivotedQR(t *testing.T) { both(t, testPivotedQR[float64], testPivotedQR[complex128]) }

func testPivotedQR[T Scalar](t *testing.T) {
	var w Workspace[T]
	for _, shape := range shapes() {
		m, n := shape[0], shape[1]
		for i, s := range samples[T](m, n) {
			checkPivotedQR(t, fmt.Sprintf("%s %d×%d", s.name, m, n), m, n, i%3, s.a, &w)
		}
	}
	for _, k := range zoo {
		checkPivotedQR(t, k.name, 65, 65, 0, zooMatrix[T](k, 65, false), &w)
		checkPivotedQR(t, k.name+" tall", 65, 30, 2, leading(65, 30, zooMatrix[T](k, 65, false), 65), &w)
	}
}

func checkPivotedQR[T Scalar](t *testing.T, name string, m, n, pad int, entries []T, w *Workspace[T]) {
	t.Helper()
	k := min(m, n)
	a := input(m, n, pad, 1, entries)
	q, r := newPadded[T](m, k, 1, 3, -9), newPadded[T](k, n, 2, 1, -9)
	pivot := make([]int, n)
	rank, err := PivotedQR(m, n, a.a, a.ld, q.a, q.ld, r.a, r.ld, pivot, 0, w)
	require.NoError(t, err, name)
	q.checkGuards(t, name)
	r.checkGuards(t, name)
	checkTrapezoid(t, r, name)
	for i := 1; i < k; i++ {
		if x, y := Real(r.at(i-1, i-1)), Real(r.at(i, i)); !(y <= x*(1+1e-12)) && y > 1e-200*Real(r.at(0, 0)) {
			t.Errorf("%s: R[%d,%d] = %g after %g", name, i, i, y, x)
			break
		}
	}
	ap := make([]T, m*n)
	seen := make([]bool, n)
	for j, from := range pivot {
		assert.False(t, seen[from], "%s: column %d twice", name, from)
		seen[from] = true
		for i := range m {
			ap[i*n+j] = a.at(i, from)
		}
	}
	small(t, orthogonality(m, rank, leading(m, rank, q.compact(), k)), qrBound, "%s: Q", name)
	c, _ := rescaled(ap, nil)
	scaled := scaledLike(ap, r.compact())
	small(t, reconstruction(m, n, k, c, q.compact(), scaled), qrBound*coarseness(ap), "%s: A P - QR", name)
}

// leading returns the first n columns of a matrix of stride ld.
func leading[T Scalar](m, n int, a []T, ld int) []T {
	out := make([]T, m*n)
	copyMatrix(m, n, 1, a, ld, out, n)
	return out
}

// TestPivotedQRRank: the rank of a matrix of known rank is seen, and what is cut off is as small as promised.
func TestPivotedQRRank(t *testing.T) {
	both(t, testPivotedQRRank[float64], testPivotedQRRank[complex128])
}

func testPivotedQRRank[T Scalar](t *testing.T) {
	for _, shape := range [][3]int{{30, 20, 7}, {20, 30, 7}, {64, 64, 33}, {100, 80, 1}, {50, 50, 50}} {
		m, n, rank := shape[0], shape[1], shape[2]
		k := min(m, n)
		x, y, a := random[T](m*rank), random[T](rank*n+1), make([]T, m*n)
		Gemm(NoTrans, NoTrans, m, n, rank, 1, x, rank, y, n, 0, a, n)
		q, r, pivot := make([]T, m*k), make([]T, k*n), make([]int, n)
		got, err := PivotedQR(m, n, a, n, q, k, r, n, pivot, 1e-12, nil)
		require.NoError(t, err)
		assert.Equal(t, rank, got)
		assert.Zero(t, Norm(r[rank*n:]))
	}
}

func TestPivotedQRTolerance(t *testing.T) {
	const n = 40
	a := withSpectrum[float64](rand.New(rand.NewPCG(5, 0)), n, n, func(i int) float64 { return math.Pow(0.3, float64(i)) })
	q, r, pivot := make([]float64, n*n), make([]float64, n*n), make([]int, n)
	previous := 0
	for _, tolerance := range []float64{0.9, 1e-2, 1e-5, 1e-10} {
		rank, err := PivotedQR(n, n, a, n, q, n, r, n, pivot, tolerance, nil)
		require.NoError(t, err)
		assert.Greater(t, rank, previous)
		previous = rank
		longest, left := 0.0, 0.0
		for j, from := range pivot {
			whole, rest := 0.0, 0.0
			for i := range n {
				x := a[i*n+from]
				whole += x * x
				for l := range n {
					x -= q[i*n+l] * r[l*n+j]
				}
				rest += x * x
			}
			longest, left = max(longest, math.Sqrt(whole)), max(left, math.Sqrt(rest))
		}
		assert.LessOrEqual(t, left, tolerance*longest*(1+1e-6)+1e-15)
	}
}

func TestPivotedQRFailures(t *testing.T) {
	a := random[float64](12)
	q, r := make([]float64, 9), make([]float64, 12)
	assert.PanicsWithValue(t, "dense: room for 3 pivots of a 3×4 matrix", func() {
		_, _ = PivotedQR(3, 4, a, 4, q, 3, r, 4, make([]int, 3), 0, nil)
	})
	a[5] = math.NaN()
	_, err := PivotedQR(3, 4, a, 4, q, 3, r, 4, make([]int, 4), 0, nil)
	var num *NumericalError
	require.True(t, errors.As(err, &num))
	assert.ErrorContains(t, err, "pivoted QR of a 3×4 matrix: it holds NaN")
}
