package dense

import (
	"unsafe"

	"gonum.org/v1/gonum/blas"
)

// matVec computes y = alpha op(A) x + beta y for the m×n matrix A; op is NoTrans or Trans. beta == 0: y is not read. Where products have
// kernels in assembly they serve, with one row or one column.
func matVec[T Scalar](op Op, m, n int, alpha T, a []T, lda int, x []T, beta T, y []T) {
	switch {
	case m == 0 || n == 0:
		Scale(beta, y)
		return
	case kernels == avx2Kernels || kernels == avx512Kernels:
		if op == Trans {
			Gemm(NoTrans, NoTrans, 1, n, m, alpha, x, m, a, lda, beta, y, n)
		} else {
			Gemm(NoTrans, Trans, m, 1, n, alpha, a, lda, x, n, beta, y, 1)
		}
		return
	}
	tr := blas.NoTrans
	if op == Trans {
		tr = blas.Trans
	}
	switch a := any(a).(type) {
	case []float64:
		ref.Dgemv(tr, m, n, any(alpha).(float64), a, lda, any(x).([]float64), 1, any(beta).(float64), any(y).([]float64), 1)
	case []complex128:
		ref.Zgemv(tr, m, n, any(alpha).(complex128), a, lda, any(x).([]complex128), 1, any(beta).(complex128), any(y).([]complex128), 1)
	}
}

// twoProducts reads the m×n matrix A once where it can: it adds A v to dots (m) and the sum of x[i] times row i, A^T x, to y (n). Nothing
// is conjugated.
func twoProducts[T Scalar](m, n int, a []T, lda int, v, x, dots, y []T) {
	if m == 0 || n == 0 {
		return
	}
	if useTiles() {
		var one T
		_, _, _, _ = a[(m-1)*lda+n-1], v[n-1], x[m-1], dots[m-1]
		twoProductsTiles(int(unsafe.Sizeof(one)), m, n, lda, unsafe.Pointer(&a[0]), unsafe.Pointer(&v[0]), unsafe.Pointer(&x[0]),
			unsafe.Pointer(&dots[0]), unsafe.Pointer(&y[:n][0]))
		return
	}
	matVec(NoTrans, m, n, 1, a, lda, v, 1, dots)
	matVec(Trans, m, n, 1, a, lda, x, 1, y)
}
