package dense

import (
	"errors"
	"fmt"
	"slices"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// stoppable is a factorization with everything it is asked for; it returns its results in one slice.
type stoppable[T Scalar] struct {
	name string
	run  func(stop func() bool) ([]T, error)
}

// stoppables share their memory from run to run.
func stoppables[T Scalar](m, n int) []stoppable[T] {
	a, square := random[T](m*n), random[T](m*m)
	k := min(m, n)
	var w Workspace[T]
	svd, h := SVD[T]{Work: &w}, Hermitian[T]{Work: &w}
	two := func(x, y []T, err error) ([]T, error) {
		if w.elems.used != 0 || w.reals.used != 0 {
			return nil, errors.New("scratch memory was not given back")
		}
		return append(x, y...), err
	}
	return []stoppable[T]{
		{"SVD", func(stop func() bool) ([]T, error) {
			w.Stop = stop
			if err := svd.Factor(m, n, a, n); err != nil {
				return nil, err
			}
			u, vh := make([]T, m*k), make([]T, k*n)
			return two(u, vh, svd.Vectors(k, u, k, vh, n))
		}},
		{"Hermitian", func(stop func() bool) ([]T, error) {
			w.Stop = stop
			if err := h.Factor(m, square, m); err != nil {
				return nil, err
			}
			v := make([]T, m*k)
			return two(v, nil, h.Largest(k, v, k))
		}},
		{"Eigen", func(stop func() bool) ([]T, error) {
			w.Stop = stop
			values, v := make([]float64, m), make([]T, m*m)
			return two(v, nil, Eigen(m, square, m, values, v, m, &w))
		}},
		{"QR", func(stop func() bool) ([]T, error) {
			w.Stop = stop
			q, r := make([]T, m*k), make([]T, k*n)
			return two(q, r, QR(m, n, a, n, q, k, r, n, &w))
		}},
		{"LQ", func(stop func() bool) ([]T, error) {
			w.Stop = stop
			l, q := make([]T, m*k), make([]T, k*n)
			return two(l, q, LQ(m, n, a, n, l, k, q, n, &w))
		}},
		{"pivoted QR", func(stop func() bool) ([]T, error) {
			w.Stop = stop
			q, r, pivot := make([]T, m*k), make([]T, k*n), make([]int, n)
			_, err := PivotedQR(m, n, a, n, q, k, r, n, pivot, 0, &w)
			return two(q, r, err)
		}},
	}
}

// TestStop stops at every question in turn: the error says so, and the same memory then gives the results of an undisturbed run.
func TestStop(t *testing.T) {
	if kernels == netlibKernels {
		use(t, goKernels) // LAPACK cannot be stopped
	}
	both(t, testStop[float64], testStop[complex128])
}

func testStop[T Scalar](t *testing.T) {
	for _, shape := range [][2]int{{150, 150}, {150, 60}, {60, 150}} {
		for _, f := range stoppables[T](shape[0], shape[1]) {
			name := fmt.Sprintf("%s %d×%d", f.name, shape[0], shape[1])
			want, err := f.run(nil)
			require.NoError(t, err, name)
			questions := 0
			_, err = f.run(func() bool { questions++; return false })
			require.NoError(t, err, name)
			require.Greater(t, questions, 4, "%s asks too seldom", name)
			for at := range questions {
				asked := 0
				_, err := f.run(func() bool { asked++; return asked > at })
				require.ErrorIs(t, err, ErrStopped, "%s at question %d", name, at)
				require.Equal(t, at+1, asked, "%s goes on after question %d", name, at)
			}
			again, err := f.run(nil)
			require.NoError(t, err, name)
			assert.True(t, slices.Equal(want, again), "%s: another result after it was stopped", name)
		}
	}
}

// BenchmarkStop reports the longest time between two questions whether to stop.
func BenchmarkStop(b *testing.B) {
	b.Run("type=real", benchmarkStop[float64])
	b.Run("type=complex", benchmarkStop[complex128])
}

func benchmarkStop[T Scalar](b *testing.B) {
	const n = 2000
	for _, f := range stoppables[T](n, n) {
		b.Run(fmt.Sprintf("n=%d/%s", n, f.name), func(b *testing.B) {
			longest := time.Duration(0)
			for b.Loop() {
				last := time.Now()
				lap := func() bool {
					now := time.Now()
					longest, last = max(longest, now.Sub(last)), now
					return false
				}
				if _, err := f.run(lap); err != nil {
					b.Fatal(err)
				}
				lap()
			}
			b.ReportMetric(longest.Seconds()*1e3, "ms-longest")
		})
	}
}
