package dense

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
)

// vectorSizes are all small ones and those around what a kernel takes at a time.
func vectorSizes() []int {
	sizes := make([]int, 0, 140)
	for n := range 131 {
		sizes = append(sizes, n)
	}
	return append(sizes, 1000, 1<<14-1, 1<<14+1, 1<<15, 1<<15+3, 1<<16+5)
}

// TestVectorKernels compares with plain loops, between guard words, at odd offsets.
func TestVectorKernels(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, testVectorKernels[float64], testVectorKernels[complex128]) })
}

func testVectorKernels[T Scalar](t *testing.T) {
	alphas := []T{1, FromFloat[T](-0.75)}
	if IsComplex[T]() {
		alphas = append(alphas, FromComplex[T](complex(0.5, -1.25)))
	}
	rng := rand.New(rand.NewPCG(3, 4))
	for _, n := range vectorSizes() {
		fresh := func() *padded[T] {
			entries := make([]T, n)
			Random(rng, entries)
			return input(1, n, 0, rng.IntN(8), entries)
		}
		x, y := fresh(), fresh()
		var dot T
		for i := range n {
			dot += Conj(x.a[i]) * y.a[i]
		}
		bound := eps * float64(n+1) * (Norm(x.a)*Norm(y.a) + 1)
		assert.LessOrEqual(t, Abs(Dot(x.a, y.a)-dot), bound, "dot, n=%d", n)

		for _, alpha := range alphas {
			sum, scaled := fresh(), fresh()
			copy(sum.a, y.a)
			copy(scaled.a, x.a)
			Axpy(alpha, x.a, sum.a)
			Scale(alpha, scaled.a)
			for i := range n {
				if d := Abs(sum.a[i] - (y.a[i] + alpha*x.a[i])); !(d <= 4*eps*(Abs(y.a[i])+Abs(alpha*x.a[i]))) {
					t.Fatalf("axpy, n=%d alpha=%v: element %d is off by %g", n, alpha, i, d)
				}
				if d := Abs(scaled.a[i] - alpha*x.a[i]); !(d <= 4*eps*Abs(alpha*x.a[i])) {
					t.Fatalf("scale, n=%d alpha=%v: element %d is off by %g", n, alpha, i, d)
				}
			}
			sum.checkGuards(t, "axpy")
			scaled.checkGuards(t, "scale")
		}
		mirrored := fresh()
		Conjugate(mirrored.a, x.a)
		for i := range n {
			if mirrored.a[i] != Conj(x.a[i]) {
				t.Fatalf("conjugate, n=%d: element %d is %v, not that of %v", n, i, mirrored.a[i], x.a[i])
			}
		}
		mirrored.checkGuards(t, "conjugate")
		Conjugate(mirrored.a, mirrored.a)
		assert.Equal(t, x.a, mirrored.a, "conjugate in place, n=%d", n)
		x.checkGuards(t, "first vector")
		y.checkGuards(t, "second vector")
	}
}

// TestLargestEverywhere puts the largest number, or a NaN, at every place.
func TestLargestEverywhere(t *testing.T) {
	eachKernels(t, func(t *testing.T) {
		for n := 1; n < 80; n++ {
			x := input(1, n, 0, n%5, random[float64](n))
			for i := range n {
				for _, top := range []float64{1e9, -1e9, math.Inf(-1), math.NaN(), -math.NaN()} {
					saved := x.a[i]
					x.a[i] = top
					got := largest(1, n, x.a, n)
					assert.True(t, got == math.Abs(top) || math.IsNaN(got) && math.IsNaN(top), "n=%d: %v at %d gives %v", n, top, i, got)
					x.a[i] = saved
				}
			}
		}
		x := make([]float64, 1<<15+9)
		for _, i := range []int{0, 1<<15 - 1, 1 << 15, len(x) - 1} {
			x[i] = math.NaN()
			assert.True(t, math.IsNaN(largest(1, len(x), x, len(x))), "NaN at %d", i)
			x[i] = -3
			assert.Equal(t, 3.0, largest(1, len(x), x, len(x)), "-3 at %d", i)
			x[i] = 0
		}
	})
}
