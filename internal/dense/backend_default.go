//go:build !netlib

package dense

// Without the tag netlib there is one set of kernels.

const haveNetlib = false

func netlibGemm[T Scalar](opA, opB Op, m, n, k int, alpha T, a []T, lda int, b []T, ldb int, beta T, c []T, ldc int) {
	panic("dense: built without netlib")
}

func netlibSVD[T Scalar](m, n int, a []T, s []float64, u, vh []T) bool {
	panic("dense: built without netlib")
}
