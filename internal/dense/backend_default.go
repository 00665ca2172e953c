//go:build !netlib

package dense

// Without the tag netlib there is one set of kernels.

const haveNetlib = false

func netlibReal(opA, opB Op, m, n, k int, alpha float64, a []float64, lda int, b []float64, ldb int, beta float64, c []float64, ldc int) {
	panic("dense: built without netlib")
}

func netlibComplex(opA, opB Op, m, n, k int, alpha complex128, a []complex128, lda int, b []complex128, ldb int, beta complex128, c []complex128, ldc int) {
	panic("dense: built without netlib")
}

func netlibSVD[T Scalar](m, n int, a []T, s []float64, u, vh []T) bool {
	panic("dense: built without netlib")
}
