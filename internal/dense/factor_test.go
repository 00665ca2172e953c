package dense

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// Bounds of the scaled residuals, in units of eps max(m,n); the largest values met are half of them.
const (
	qrBound    = 8.0
	svdBound   = 24.0
	valueBound = 12.0
)

func TestQR(t *testing.T) { both(t, testQR[float64], testQR[complex128]) }

func testQR[T Scalar](t *testing.T) {
	var w Workspace[T]
	for _, shape := range shapes() {
		m, n := shape[0], shape[1]
		k := min(m, n)
		for i, s := range samples[T](m, n) {
			name := fmt.Sprintf("%s %d×%d", s.name, m, n)
			a := input(m, n, i%3, 1, s.a)
			q, r := newPadded[T](m, k, (i+1)%3, 3, -9), newPadded[T](k, n, (i+2)%3, 1, -9)
			QR(m, n, a.a, a.ld, q.a, q.ld, r.a, r.ld, &w)
			small(t, reconstruction(m, n, k, s.a, q.compact(), r.compact()), qrBound, "QR of %s: A - QR", name)
			small(t, orthogonality(m, k, q.compact()), qrBound, "QR of %s: Q", name)
			checkTrapezoid(t, r, name)
			q.checkGuards(t, name)
			r.checkGuards(t, name)

			l, q := newPadded[T](m, k, (i+2)%3, 3, -9), newPadded[T](k, n, i%3, 1, -9)
			LQ(m, n, a.a, a.ld, l.a, l.ld, q.a, q.ld, &w)
			small(t, reconstruction(m, n, k, s.a, l.compact(), q.compact()), qrBound, "LQ of %s: A - LQ", name)
			small(t, orthogonality(n, k, transposed(k, n, q.compact())), qrBound, "LQ of %s: Q", name)
			checkTrapezoid(t, input(k, m, 0, 0, transposed(m, k, l.compact())), name)
			q.checkGuards(t, name)
			l.checkGuards(t, name)

			a.checkGuards(t, name)
			assert.Equal(t, s.a, a.compact(), "%s: A was modified", name)
		}
	}
}

// checkTrapezoid asserts zeros below a real diagonal that is not negative.
func checkTrapezoid[T Scalar](t *testing.T, r *padded[T], name string) {
	t.Helper()
	for i := range r.rows {
		for j := range min(i, r.cols) {
			if r.at(i, j) != 0 {
				t.Errorf("%s: R[%d,%d] = %v below the diagonal", name, i, j, r.at(i, j))
			}
		}
		if i < r.cols {
			if z := ToComplex(r.at(i, i)); imag(z) != 0 || !(real(z) >= 0) {
				t.Errorf("%s: R[%d,%d] = %v on the diagonal", name, i, i, z)
			}
		}
	}
}

// TestQRHandsOnNaN: no error is returned, so the factors must show it.
func TestQRHandsOnNaN(t *testing.T) {
	for _, bad := range []float64{math.NaN(), math.Inf(1)} {
		a := random[float64](20)
		a[7] = bad
		q, r := make([]float64, 20), make([]float64, 16)
		QR(5, 4, a, 4, q, 4, r, 4, nil)
		assert.True(t, math.IsNaN(Norm(q)) || math.IsNaN(Norm(r)))
	}
}

func TestSVD(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, testSVD[float64], testSVD[complex128]) })
}

func testSVD[T Scalar](t *testing.T) {
	var f SVD[T]
	usual, _ := chooseKernels("")
	for at, shape := range shapes() {
		if kernels != usual && at%3 != 0 {
			continue // a third is enough for kernels that have tests of their own
		}
		m, n := shape[0], shape[1]
		k := min(m, n)
		for i, s := range samples[T](m, n) {
			name := fmt.Sprintf("%s %d×%d", s.name, m, n)
			a := input(m, n, i%3, 1, s.a)
			require.NoError(t, f.Factor(m, n, a.a, a.ld), name)
			values := append([]float64(nil), f.Values()...)
			u, vh := newPadded[T](m, k, (i+1)%3, 3, -9), newPadded[T](k, n, (i+2)%3, 1, -9)
			f.Vectors(k, u.a, u.ld, vh.a, vh.ld)

			require.Len(t, values, k)
			for j, v := range values {
				if !(v >= 0) || (j > 0 && v > values[j-1]) {
					t.Errorf("%s: values %v are not decreasing and positive", name, values)
					break
				}
			}
			us := u.compact()
			for j := range us {
				us[j] *= FromFloat[T](values[j%k])
			}
			small(t, reconstruction(m, n, k, s.a, us, vh.compact()), svdBound, "%s: A - USV", name)
			small(t, orthogonality(m, k, u.compact()), svdBound, "%s: U", name)
			small(t, orthogonality(n, k, transposed(k, n, vh.compact())), svdBound, "%s: V", name)
			u.checkGuards(t, name)
			vh.checkGuards(t, name)
			a.checkGuards(t, name)
			assert.Equal(t, s.a, a.compact(), "%s: A was modified", name)
			if at%4 == 0 && k <= 40 {
				checkAgainstJacobi(t, name, s, values)
			}
		}
	}
}

func checkAgainstJacobi[T Scalar](t *testing.T, name string, s sample[T], values []float64) {
	t.Helper()
	k := min(s.m, s.n)
	want := make([]float64, k)
	require.NoError(t, JacobiSVD(s.m, s.n, s.a, s.n, want, make([]T, s.m*k), k, make([]T, k*s.n), s.n), name)
	for j := range want {
		if d := math.Abs(values[j] - want[j]); !(d <= valueBound*eps*float64(max(s.m, s.n))*want[0]) {
			t.Errorf("%s: value %d is %g, by rotations %g", name, j, values[j], want[j])
			return
		}
	}
}

func TestSVDFewVectors(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, testSVDFewVectors[float64], testSVDFewVectors[complex128]) })
}

func testSVDFewVectors[T Scalar](t *testing.T) {
	var f SVD[T]
	for _, shape := range [][2]int{{7, 7}, {20, 5}, {5, 20}, {12, 9}, {9, 12}} {
		m, n := shape[0], shape[1]
		k := min(m, n)
		a := random[T](m * n)
		require.NoError(t, f.Factor(m, n, a, n))
		u, vh := make([]T, m*k), make([]T, k*n)
		f.Vectors(k, u, k, vh, n)
		for keep := range k + 1 {
			few, fewH := newPadded[T](m, keep, 1, 1, -9), newPadded[T](keep, n, 2, 1, -9)
			f.Vectors(keep, few.a, few.ld, fewH.a, fewH.ld) // again, of the same factorization
			for i := range m {
				for j := range keep {
					assert.InDelta(t, 0, Abs(few.at(i, j)-u[i*k+j]), 4*eps, "%d×%d keep %d", m, n, keep)
				}
			}
			for i := range keep {
				for j := range n {
					assert.InDelta(t, 0, Abs(fewH.at(i, j)-vh[i*n+j]), 4*eps, "%d×%d keep %d", m, n, keep)
				}
			}
			few.checkGuards(t, "U")
			fewH.checkGuards(t, "V")
		}
		assert.Panics(t, func() { f.Vectors(k+1, make([]T, m*(k+1)), k+1, make([]T, (k+1)*n), n) })
		assert.Panics(t, func() { f.Vectors(k, u[:m*k-1], k, vh, n) })
	}
}

// TestSVDClosedForm: the lower triangle of ones has singular values 1/(2 sin((2j-1) pi/(4n+2))): its inverse is the first difference,
// whose square is a Laplacian with one fixed and one free end.
func TestSVDClosedForm(t *testing.T) {
	const n = 60
	a := make([]float64, n*n)
	for i := range n {
		for j := range i + 1 {
			a[i*n+j] = 1
		}
	}
	var f SVD[float64]
	require.NoError(t, f.Factor(n, n, a, n))
	for j, got := range f.Values() {
		want := 1 / (2 * math.Sin(float64(2*j+1)*math.Pi/(4*n+2)))
		assert.InDelta(t, want, got, 20*eps*f.Values()[0])
	}
}

// TestSVDReuse: an object that has seen other matrices gives the bits of a fresh one.
func TestSVDReuse(t *testing.T) { both(t, testSVDReuse[float64], testSVDReuse[complex128]) }

func testSVDReuse[T Scalar](t *testing.T) {
	var old SVD[T]
	var oldW Workspace[T]
	for _, shape := range [][2]int{{30, 10}, {3, 3}, {10, 40}, {25, 25}, {1, 9}, {30, 10}} {
		m, n := shape[0], shape[1]
		k := min(m, n)
		a := random[T](m * n)
		var results [2][]T
		for i, f := range []*SVD[T]{&old, new(SVD[T])} {
			w := &oldW
			if i == 1 {
				w = nil
			}
			u, vh := make([]T, m*k), make([]T, k*n)
			require.NoError(t, f.Factor(m, n, a, n))
			f.Vectors(k, u, k, vh, n)
			q, r := make([]T, m*k), make([]T, k*n)
			QR(m, n, a, n, q, k, r, n, w)
			results[i] = append(append(append(u, vh...), q...), r...)
			for _, v := range f.Values() {
				results[i] = append(results[i], FromFloat[T](v))
			}
		}
		assert.Equal(t, results[1], results[0])
	}
}

func TestNotFinite(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, testNotFinite[float64], testNotFinite[complex128]) })
}

func testNotFinite[T Scalar](t *testing.T) {
	const m, n = 5, 4
	bad := []T{FromFloat[T](math.NaN()), FromFloat[T](math.Inf(1)), FromFloat[T](math.Inf(-1))}
	if IsComplex[T]() {
		bad = append(bad, FromComplex[T](complex(0, math.NaN())), FromComplex[T](complex(1, math.Inf(-1))))
	}
	var f SVD[T]
	for _, x := range bad {
		for at := range m * n {
			a := random[T](m * n)
			a[at] = x
			reason := "infinite"
			if z := ToComplex(x); math.IsNaN(real(z)) || math.IsNaN(imag(z)) {
				reason = "NaN"
			}
			check := func(err error, shape string) {
				t.Helper()
				var num *NumericalError
				require.True(t, errors.As(err, &num), "%v", err)
				assert.Contains(t, err.Error(), reason)
				assert.Contains(t, err.Error(), shape)
			}
			check(f.Factor(m, n, a, n), "singular value decomposition of a 5×4 matrix: it holds")
			assert.Empty(t, f.Values())
			f.Vectors(0, nil, 0, nil, 0)
			assert.Panics(t, func() { f.Vectors(1, make([]T, m), 1, make([]T, n), n) })
			check(JacobiSVD(m, n, a, n, make([]float64, n), make([]T, m*n), n, make([]T, n*n), n), "5×4")
			if i, j := at/n, at%n; i < n && j >= i && (i != j || !math.IsNaN(imag(ToComplex(x))) && !math.IsInf(imag(ToComplex(x)), 0)) {
				check(Eigen(n, a, n, make([]float64, n), make([]T, n*n), n, nil), "4×4")
				check(JacobiEigen(n, a, n, make([]float64, n), make([]T, n*n), n), "4×4")
			}
		}
	}
	require.NoError(t, f.Factor(m, n, random[T](m*n), n), "after an error the object is as good as new")
	assert.Len(t, f.Values(), n)
}

// TestSVDProperties checks what holds for any matrix: sum of squares, invariance under adjoint, scaling and unitary factors.
func TestSVDProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m, n := rapid.IntRange(1, 12).Draw(t, "m"), rapid.IntRange(1, 12).Draw(t, "n")
		entry := rapid.Float64Range(-10, 10)
		a := make([]complex128, m*n)
		for i := range a {
			a[i] = complex(entry.Draw(t, "re"), entry.Draw(t, "im"))
		}
		values := func(m, n int, a []complex128) []float64 {
			var f SVD[complex128]
			require.NoError(t, f.Factor(m, n, a, n))
			return f.Values()
		}
		s := values(m, n, a)
		tol := 30 * eps * math.Max(s[0], 1e-300)
		assert.InDelta(t, Norm(a), Norm(s), tol)
		close := func(other []float64, scale float64) {
			for i := range s {
				assert.InDelta(t, s[i]*scale, other[i], tol*scale)
			}
		}
		close(values(n, m, transposed(m, n, a)), 1)
		b := append([]complex128(nil), a...)
		Scale(complex(0, 1e6), b)
		close(values(m, n, b), 1e6)
		// A permutation with phases on the left.
		rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 0))
		for i, p := range rng.Perm(m) {
			sin, cos := math.Sincos(rng.Float64() * 6)
			copy(b[i*n:(i+1)*n], a[p*n:(p+1)*n])
			Scale(complex(cos, sin), b[i*n:(i+1)*n])
		}
		close(values(m, n, b), 1)
	})
}

func TestFactorPanics(t *testing.T) {
	x := make([]float64, 100)
	for _, row := range []struct {
		name string
		call func()
		want string
	}{
		{"SVD of a short slice", func() { _ = new(SVD[float64]).Factor(4, 5, x[:19], 5) }, "A is 4×5"},
		{"QR into a short Q", func() { QR(4, 3, x, 3, x[:11], 3, x, 3, nil) }, "Q is 4×3"},
		{"QR into a narrow R", func() { QR(4, 3, x, 3, x, 3, x, 2, nil) }, "R is 3×3"},
		{"LQ into a short L", func() { LQ(3, 4, x, 4, x[:8], 3, x, 4, nil) }, "L is 3×3"},
		{"room for values", func() { _ = Eigen(4, x, 4, x[:3], x, 4, nil) }, "3 eigenvalues of a 4×4"},
		{"tridiagonal", func() { _ = TridiagonalEigen(x[:4], x[:4], x[:4], x[:16]) }, "size 4 with 4 off-diagonal"},
		{"dot", func() { Dot(x[:3], x[:4]) }, "lengths 3 and 4"},
		{"part of a complex number", func() { FromComplex[float64](1i) }, "not real"},
	} {
		t.Run(row.name, func(t *testing.T) {
			defer func() {
				msg, ok := recover().(string)
				assert.True(t, ok && strings.HasPrefix(msg, "dense: ") && strings.Contains(msg, row.want), msg)
			}()
			row.call()
			t.Error("no panic")
		})
	}
}
