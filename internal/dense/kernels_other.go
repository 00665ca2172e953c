//go:build !amd64 || purego

package dense

// There is no assembly for this machine or in this build.
const (
	haveAVX512 = false
	haveAVX2   = false
)

func tiledReal(set kernelSet, opA, opB Op, m, n, k int, alpha float64, a []float64, lda int, b []float64, ldb int, beta float64, c []float64, ldc int) {
	panic("dense: built without assembly")
}

func tiledComplex(set kernelSet, opA, opB Op, m, n, k int, alpha complex128, a []complex128, lda int, b []complex128, ldb int, beta complex128, c []complex128, ldc int) {
	panic("dense: built without assembly")
}
