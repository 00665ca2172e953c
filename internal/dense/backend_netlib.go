//go:build netlib

package dense

import (
	"sync"

	"gonum.org/v1/gonum/blas"
	blaslib "gonum.org/v1/netlib/blas/netlib"
	"gonum.org/v1/netlib/lapack/lapacke"

	"rundle/internal/dense/openblas"
)

const haveNetlib = true

var cblas blaslib.Implementation

// oneThread is called before the library is.
var oneThread = sync.OnceFunc(openblas.OneThread)

func (op Op) blas() blas.Transpose {
	switch op {
	case Trans:
		return blas.Trans
	case ConjTrans:
		return blas.ConjTrans
	}
	return blas.NoTrans
}

// netlibGemm is Gemm; no size is zero.
func netlibGemm[T Scalar](opA, opB Op, m, n, k int, alpha T, a []T, lda int, b []T, ldb int, beta T, c []T, ldc int) {
	switch a := any(a).(type) {
	case []float64:
		netlibReal(opA, opB, m, n, k, any(alpha).(float64), a, lda, any(b).([]float64), ldb, any(beta).(float64), any(c).([]float64), ldc)
	case []complex128:
		netlibComplex(opA, opB, m, n, k, any(alpha).(complex128), a, lda, any(b).([]complex128), ldb, any(beta).(complex128), any(c).([]complex128), ldc)
	}
}

func netlibReal(opA, opB Op, m, n, k int, alpha float64, a []float64, lda int, b []float64, ldb int, beta float64, c []float64, ldc int) {
	oneThread()
	cblas.Dgemm(opA.blas(), opB.blas(), m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
}

// netlibComplex copies a factor that is only conjugated: BLAS has no such operation. Inlined, its numbers would be allocated by every
// caller.
//
//go:noinline
func netlibComplex(opA, opB Op, m, n, k int, alpha complex128, a []complex128, lda int, b []complex128, ldb int, beta complex128, c []complex128, ldc int) {
	oneThread()
	if opA == ConjNoTrans {
		a, lda = conjugated(m, k, a, lda), k
	}
	if opB == ConjNoTrans {
		b, ldb = conjugated(k, n, b, ldb), n
	}
	cblas.Zgemm(opA.blas(), opB.blas(), m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
}

func conjugated(m, n int, a []complex128, lda int) []complex128 {
	out := make([]complex128, m*n)
	for i := range m {
		Conjugate(out[i*n:(i+1)*n], a[i*lda:i*lda+n])
	}
	return out
}

// netlibSVD decomposes the m×n matrix a, which it destroys, by divide and conquer (gesdd): s decreasing, u m×min(m,n), vh min(m,n)×n.
func netlibSVD[T Scalar](m, n int, a []T, s []float64, u, vh []T) bool {
	oneThread()
	k := min(m, n)
	iwork := make([]int32, 8*k)
	switch a := any(a).(type) {
	case []float64:
		u, vh := any(u).([]float64), any(vh).([]float64)
		query := make([]float64, 1)
		if !lapacke.Dgesdd('S', m, n, a, n, s, u, k, vh, n, query, -1, iwork) {
			return false
		}
		work := make([]float64, int(query[0]))
		return lapacke.Dgesdd('S', m, n, a, n, s, u, k, vh, n, work, len(work), iwork)
	case []complex128:
		u, vh := any(u).([]complex128), any(vh).([]complex128)
		query := make([]complex128, 1)
		rwork := make([]float64, k*max(5*k+7, 2*max(m, n)+2*k+1))
		if !lapacke.Zgesdd('S', m, n, a, n, s, u, k, vh, n, query, -1, rwork, iwork) {
			return false
		}
		work := make([]complex128, int(real(query[0])))
		return lapacke.Zgesdd('S', m, n, a, n, s, u, k, vh, n, work, len(work), rwork, iwork)
	}
	return false
}
