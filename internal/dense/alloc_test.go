//go:build !race

package dense

import (
	"testing"

	"github.com/stretchr/testify/assert"

	"rundle/internal/task"
)

// The race detector allocates on its own account.
func TestFactorsAllocateNothing(t *testing.T) {
	eachKernels(t, func(t *testing.T) {
		if kernels == netlibKernels {
			t.Skip("LAPACK's scratch memory is allocated by call")
		}
		both(t, factorsAllocateNothing[float64], factorsAllocateNothing[complex128])
	})
}

func factorsAllocateNothing[T Scalar](t *testing.T) {
	for _, n := range []int{1, 24, 150} {
		a, x, y := random[T](n*n), make([]T, n*n), make([]T, n*n)
		values, k := make([]float64, n), (n+3)/4
		w := Workspace[T]{Stop: never}
		f, h := SVD[T]{Work: &w}, Hermitian[T]{}
		pivot := make([]int, n)
		assert.Zero(t, testing.AllocsPerRun(5, func() {
			_ = QR(n, n, a, n, x, n, y, n, &w)
			_ = LQ(n, n, a, n, x, n, y, n, &w)
			_ = f.Factor(n, n, a, n)
			_ = f.Vectors(n, x, n, y, n)
			_ = f.Factor(n, k, a, n)
			_ = f.Vectors(k, x, k, y, k)
			_ = f.Factor(k, n, a, n)
			_ = f.Vectors(k, x, k, y, n)
			_ = Eigen(n, a, n, values, x, n, &w)
			_ = h.Factor(n, a, n)
			_ = h.Largest(k, x, n)
			_, _ = PivotedQR(n, n, a, n, x, n, y, n, pivot, 0, &w)
		}), "n=%d", n)
	}
}

func never() bool { return false }

// TestProductsAllocateNothing goes every way that a product can take, in every kernel that is ours, and runs batches. The library of the
// tag netlib is left out: calls into C allocate.
func TestProductsAllocateNothing(t *testing.T) {
	eachKernels(t, func(t *testing.T) {
		if useNetlib() {
			return
		}
		both(t, productsAllocateNothing[float64], productsAllocateNothing[complex128])
	})
}

func productsAllocateNothing[T Scalar](t *testing.T) {
	a, b, c := random[T](700*700), random[T](700*700), make([]T, 700*700)
	alphas, betas := []T{1, FromFloat[T](-0.5)}, []T{0, 1, FromFloat[T](2)}
	if IsComplex[T]() {
		alphas = append(alphas, FromComplex[T](complex(1, 2)))
	}
	count := 0
	for _, s := range [][3]int{
		{1, 1, 1}, {3, 2, 2}, {8, 8, 8}, {33, 47, 20}, // whole, in place
		{50, 1, 100}, {50, 3, 100}, {40, 4, 700}, {1, 90, 90}, {2, 90, 300}, // narrow
		{40, 140, 300}, {150, 150, 270}, {10, 600, 10}, {10, 10, 600}, // in blocks, copied
	} {
		if !useTiles() && s[0]*s[1]*s[2] > 1e5 {
			continue // plain Go has one way
		}
		for _, opA := range allOps {
			for _, opB := range allOps {
				count++
				alpha, beta := alphas[count%len(alphas)], betas[count%len(betas)]
				run := func() { Gemm(opA, opB, s[0], s[1], s[2], alpha, a, 700, b, 700, beta, c, 700) }
				run()
				assert.Zero(t, testing.AllocsPerRun(2, run), "%v%v %v", opA, opB, s)
			}
		}
	}
	var plan Batch
	for i, n := range []int{1, 2, 5, 17, 60, 200} {
		p := Product{C: i * 40000, M: n, N: n, K: n, LDA: n, LDB: n, LDC: n, OpB: allOps[i%4]}
		plan.AddStrided(p, 3, 5, 7, 0)
	}
	plan.Seal()
	var runner BatchRunner[T]
	for _, threads := range []int{1, 2} {
		pool := task.New(threads)
		run := func() { runner.Run(&plan, c, a, b, pool) }
		run()
		assert.Zero(t, testing.AllocsPerRun(20, run), "batch, threads=%d", threads)
	}
}
