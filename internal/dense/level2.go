package dense

import "gonum.org/v1/gonum/blas"

// matVec computes y = op(A) x for the m×n matrix A; op is NoTrans or Trans.
func matVec[T Scalar](op Op, m, n int, a []T, lda int, x, y []T) {
	if m == 0 || n == 0 {
		clear(y)
		return
	}
	tr := blas.NoTrans
	if op == Trans {
		tr = blas.Trans
	}
	switch a := any(a).(type) {
	case []float64:
		ref.Dgemv(tr, m, n, 1, a, lda, any(x).([]float64), 1, 0, any(y).([]float64), 1)
	case []complex128:
		ref.Zgemv(tr, m, n, 1, a, lda, any(x).([]complex128), 1, 0, any(y).([]complex128), 1)
	}
}
