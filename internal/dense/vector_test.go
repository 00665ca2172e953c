package dense

import (
	"fmt"
	"math"
	"math/cmplx"
	"testing"

	"github.com/stretchr/testify/assert"
)

func TestVectors(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, testVectors[float64], testVectors[complex128]) })
}

func testVectors[T Scalar](t *testing.T) {
	for n := range 70 {
		x, y := random[T](n + 1)[1:], random[T](2*n + 1)[1:n+1]
		var dot complex128
		square := 0.0
		for i := range x {
			dot += cmplx.Conj(ToComplex(x[i])) * ToComplex(y[i])
			square += Abs(x[i]) * Abs(x[i])
		}
		tol := eps * float64(n+1) * 10
		assert.InDelta(t, 0, cmplx.Abs(dot-ToComplex(Dot(x, y))), tol, "n=%d", n)
		assert.InDelta(t, math.Sqrt(square), Norm(x), tol, "n=%d", n)
		for _, scale := range []float64{0x1p500, 0x1p-500, 0x1p1000, 0x1p-1000} {
			z := append([]T(nil), x...)
			Scale(FromFloat[T](scale), z)
			assert.InDelta(t, math.Sqrt(square), Norm(z)/scale, tol, "n=%d scale=%g", n, scale)
		}

		alpha := FromFloat[T](-0.75)
		sum, scaled, conj := append([]T(nil), y...), append([]T(nil), x...), make([]T, n)
		Axpy(alpha, x, sum)
		Scale(alpha, scaled)
		Conjugate(conj, x)
		for i := range x {
			assert.InDelta(t, 0, Abs(sum[i]-(y[i]+alpha*x[i])), 10*eps)
			assert.Equal(t, alpha*x[i], scaled[i])
			assert.Equal(t, cmplx.Conj(ToComplex(x[i])), ToComplex(conj[i]))
		}
		Conjugate(conj, conj)
		assert.Equal(t, append(make([]T, 0, n), x...), append(make([]T, 0, n), conj...))
	}
}

func TestScaleByZeroClears(t *testing.T) {
	x := []float64{math.NaN(), math.Inf(1), 3}
	Scale(0, x)
	assert.Equal(t, []float64{0, 0, 0}, x)
}

func TestNormNotFinite(t *testing.T) {
	assert.True(t, math.IsNaN(Norm([]float64{1, math.NaN()})))
	assert.True(t, math.IsInf(Norm([]complex128{1, complex(0, math.Inf(-1))}), 1))
	assert.Zero(t, Norm([]float64{0, 0}))
	assert.Equal(t, 5e-324, Norm([]float64{5e-324}))
}

func TestLargest(t *testing.T) {
	nan := math.NaN()
	for _, row := range []struct {
		x    []float64
		want float64
	}{
		{nil, 0}, {[]float64{1, -3, 2, 0}, 3}, {[]float64{1, nan, 5, 0}, nan}, {[]float64{nan, 1, 5, 0}, nan},
		{[]float64{1, 2, 3, nan}, nan}, {[]float64{math.Inf(-1), 2, 3, nan}, nan}, {[]float64{math.Inf(-1), 2, 3, 4}, math.Inf(1)},
	} {
		name := fmt.Sprint(row.x)
		for _, n := range []int{1, 2, 4} {
			got := largest(len(row.x)/n, n, row.x, n)
			assert.True(t, got == row.want || math.IsNaN(got) && math.IsNaN(row.want), "%s: %v", name, got)
		}
		z := make([]complex128, len(row.x)/2)
		for i := range z {
			z[i] = complex(row.x[2*i], row.x[2*i+1])
		}
		got := largest(1, len(z), z, len(z))
		assert.True(t, got == row.want || math.IsNaN(got) && math.IsNaN(row.want), "complex %s: %v", name, got)
	}
}

func TestScalars(t *testing.T) {
	assert.False(t, IsComplex[float64]())
	assert.True(t, IsComplex[complex128]())
	assert.Equal(t, 2.5, FromFloat[float64](2.5))
	assert.Equal(t, complex(2.5, 0), FromFloat[complex128](2.5))
	assert.Equal(t, 2.5, FromComplex[float64](2.5))
	assert.Equal(t, 2.5-1i, FromComplex[complex128](2.5-1i))
	assert.Equal(t, complex(-2, 0), ToComplex(-2.0))
	assert.Equal(t, 3.0, Real(3+4i))
	assert.Equal(t, 5.0, Abs(3+4i))
	assert.Equal(t, 5.0, Abs(-5.0))
	assert.Equal(t, 3-4i, Conj(3+4i))
	assert.Equal(t, 3.0, Conj(3.0))
}

// TestRandom is about the scale of the numbers, and that equal seeds give equal numbers.
func TestRandom(t *testing.T) {
	x, z := random[float64](10000), random[complex128](10000)
	assert.InDelta(t, 1, Norm(x)/100, 0.05)
	assert.InDelta(t, math.Sqrt2, Norm(z)/100, 0.05)
	assert.Equal(t, x, random[float64](10000))
	z2 := make([]complex128, len(x))
	for i, v := range x {
		z2[i] = complex(v, 0)
	}
	mean := Dot(z2, z) / 10000
	assert.InDelta(t, 0, cmplx.Abs(mean), 0.05)
}

func TestWorkspaceKeepsPieces(t *testing.T) {
	var w Workspace[float64]
	outer := w.elems.take(5)
	for i := range outer {
		outer[i] = float64(i)
	}
	for size := 1; size < 5000; size *= 3 {
		m := w.mark()
		a, b := w.elems.take(size), w.elems.take(2*size)
		for i := range a {
			a[i] = -1
		}
		for i := range b {
			b[i] = -2
		}
		assert.EqualValues(t, -1, a[size-1])
		w.release(m)
	}
	assert.Equal(t, []float64{0, 1, 2, 3, 4}, outer)
}
