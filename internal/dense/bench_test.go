package dense

import (
	"fmt"
	"math/rand/v2"
	"testing"
)

// flopFactor is what a complex multiplication and addition cost in real ones.
func flopFactor[T Scalar]() float64 {
	if IsComplex[T]() {
		return 4
	}
	return 1
}

func reportFlops(b *testing.B, flops float64) {
	b.ReportMetric(flops*float64(b.N)/b.Elapsed().Seconds()/1e9, "Gflop/s")
}

func random[T Scalar](n int) []T {
	x := make([]T, n)
	Random(rand.New(rand.NewPCG(uint64(n), 1)), x)
	return x
}

func BenchmarkGemm(b *testing.B) {
	b.Run("type=real", benchmarkGemm[float64])
	b.Run("type=complex", benchmarkGemm[complex128])
}

func benchmarkGemm[T Scalar](b *testing.B) {
	run := func(opA, opB Op, m, n, k int) {
		b.Run(fmt.Sprintf("ops=%v%v/m=%d/n=%d/k=%d", opA, opB, m, n, k), func(b *testing.B) {
			benchmarkProduct[T](b, opA, opB, m, n, k)
		})
	}
	for _, n := range []int{1, 2, 4, 6, 8, 16, 32, 64, 128, 256, 512, 1024} {
		run(NoTrans, NoTrans, n, n, n)
	}
	for _, ops := range [][2]Op{{NoTrans, ConjTrans}, {ConjTrans, NoTrans}, {ConjTrans, ConjTrans}, {NoTrans, ConjNoTrans}} {
		run(ops[0], ops[1], 16, 16, 16)
		run(ops[0], ops[1], 256, 256, 256)
	}
	for _, s := range [][3]int{{512, 1, 512}, {512, 4, 512}, {1, 512, 512}, {512, 512, 4}, {512, 16, 512}, {16, 512, 512}} {
		run(NoTrans, NoTrans, s[0], s[1], s[2])
	}
}

func benchmarkProduct[T Scalar](b *testing.B, opA, opB Op, m, n, k int) {
	x, y, c := random[T](m*k), random[T](k*n), make([]T, m*n)
	lda, ldb := k, n
	if opA.transposes() {
		lda = m
	}
	if opB.transposes() {
		ldb = k
	}
	for b.Loop() {
		Gemm(opA, opB, m, n, k, 1, x, lda, y, ldb, 0, c, n)
	}
	reportFlops(b, flopFactor[T]()*2*float64(m)*float64(n)*float64(k))
}

func BenchmarkVector(b *testing.B) {
	b.Run("type=real", benchmarkVector[float64])
	b.Run("type=complex", benchmarkVector[complex128])
}

func benchmarkVector[T Scalar](b *testing.B) {
	alpha := FromFloat[T](0.999)
	if IsComplex[T]() {
		alpha = FromComplex[T](complex(0.6, 0.8))
	}
	for _, n := range []int{1, 8, 64, 512, 4096} {
		x, y := random[T](n), make([]T, n)
		for _, row := range []struct {
			name string
			call func()
		}{
			{"dot", func() { Dot(x, y) }},
			{"axpy", func() { Axpy(alpha, x, y) }},
			{"scale", func() { Scale(alpha, y) }},
			{"norm", func() { Norm(x) }},
			{"largest", func() { largest(1, n, x, n) }},
		} {
			b.Run(fmt.Sprintf("n=%d/%s", n, row.name), func(b *testing.B) {
				for b.Loop() {
					row.call()
				}
			})
		}
	}
}

func BenchmarkSVD(b *testing.B) {
	b.Run("type=real", benchmarkSVD[float64])
	b.Run("type=complex", benchmarkSVD[complex128])
}

func benchmarkSVD[T Scalar](b *testing.B) {
	for _, s := range [][3]int{{8, 8, 8}, {16, 16, 16}, {32, 32, 32}, {64, 64, 64}, {64, 64, 32}, {128, 128, 128}, {128, 128, 64}, {256, 256, 256}, {256, 256, 128}, {512, 512, 256}, {256, 64, 64}, {64, 256, 64}} {
		b.Run(fmt.Sprintf("m=%d/n=%d/keep=%d", s[0], s[1], s[2]), func(b *testing.B) {
			a, u, vh := random[T](s[0]*s[1]), make([]T, s[0]*s[2]), make([]T, s[2]*s[1])
			var f SVD[T]
			for b.Loop() {
				if err := f.Factor(s[0], s[1], a, s[1]); err != nil {
					b.Fatal(err)
				}
				f.Vectors(s[2], u, s[2], vh, s[1])
			}
		})
	}
}

func BenchmarkQR(b *testing.B) {
	b.Run("type=real", benchmarkQR[float64])
	b.Run("type=complex", benchmarkQR[complex128])
}

func benchmarkQR[T Scalar](b *testing.B) {
	for _, s := range [][2]int{{16, 16}, {64, 64}, {256, 256}, {512, 128}} {
		m, n := s[0], s[1]
		b.Run(fmt.Sprintf("m=%d/n=%d", m, n), func(b *testing.B) {
			a, q, r := random[T](m*n), make([]T, m*n), make([]T, n*n)
			var w Workspace[T]
			for b.Loop() {
				QR(m, n, a, n, q, n, r, n, &w)
			}
			// R and Q each cost 2 n^2 (m - n/3).
			reportFlops(b, flopFactor[T]()*4*float64(n)*float64(n)*(float64(m)-float64(n)/3))
		})
	}
}

func BenchmarkEigen(b *testing.B) {
	b.Run("type=real", benchmarkEigen[float64])
	b.Run("type=complex", benchmarkEigen[complex128])
}

func benchmarkEigen[T Scalar](b *testing.B) {
	for _, n := range []int{8, 32, 64, 128, 256} {
		b.Run(fmt.Sprintf("n=%d", n), func(b *testing.B) {
			a, v, values := random[T](n*n), make([]T, n*n), make([]float64, n)
			var w Workspace[T]
			for b.Loop() {
				if err := Eigen(n, a, n, values, v, n, &w); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// BenchmarkHermitian asks for half of the vectors.
func BenchmarkHermitian(b *testing.B) {
	b.Run("type=real", benchmarkHermitian[float64])
	b.Run("type=complex", benchmarkHermitian[complex128])
}

func benchmarkHermitian[T Scalar](b *testing.B) {
	for _, n := range []int{16, 32, 64, 128, 256, 512} {
		b.Run(fmt.Sprintf("n=%d/keep=%d", n, n/2), func(b *testing.B) {
			a, v := random[T](n*n), make([]T, n*n/2)
			var f Hermitian[T]
			for b.Loop() {
				if err := f.Factor(n, a, n); err != nil {
					b.Fatal(err)
				}
				f.Largest(n/2, v, n/2)
			}
		})
	}
}

func BenchmarkPivotedQR(b *testing.B) {
	b.Run("type=real", benchmarkPivotedQR[float64])
	b.Run("type=complex", benchmarkPivotedQR[complex128])
}

func benchmarkPivotedQR[T Scalar](b *testing.B) {
	for _, n := range []int{16, 64, 256} {
		b.Run(fmt.Sprintf("n=%d", n), func(b *testing.B) {
			a, q, r, pivot := random[T](n*n), make([]T, n*n), make([]T, n*n), make([]int, n)
			var w Workspace[T]
			for b.Loop() {
				if _, err := PivotedQR(n, n, a, n, q, n, r, n, pivot, 0, &w); err != nil {
					b.Fatal(err)
				}
			}
			reportFlops(b, flopFactor[T]()*8/3*float64(n)*float64(n)*float64(n))
		})
	}
}
