package dense

import (
	"fmt"
	"math/cmplx"
)

// Op says how a factor enters a product.
type Op byte

// The four ways: as it is, transposed, transposed and conjugated, conjugated.
const (
	NoTrans Op = iota
	Trans
	ConjTrans
	ConjNoTrans
)

func (op Op) transposes() bool { return op == Trans || op == ConjTrans }
func (op Op) conjugates() bool { return op == ConjTrans || op == ConjNoTrans }

func (op Op) String() string {
	switch op {
	case NoTrans:
		return "n"
	case Trans:
		return "t"
	case ConjTrans:
		return "c"
	case ConjNoTrans:
		return "j"
	}
	return fmt.Sprintf("Op(%d)", byte(op))
}

// tinyProduct is the m·n·k below which the plain loop beats the set-up of a tiled call (BenchmarkGemm, sizes 4 to 8).
const tinyProduct = 200

// Gemm computes C = alpha op(A) op(B) + beta C with op(A) m×k, op(B) k×n and C m×n, all row-major:
//
//	for i := range m {
//		for j := range n {
//			var sum T
//			for l := range k {
//				sum += opA(i, l) * opB(l, j)
//			}
//			c[i*ldc+j] = alpha*sum + beta*c[i*ldc+j] // beta == 0: c is not read
//		}
//	}
//
// A product of an exact zero and a value that is not finite may count as zero. C must not overlap A or B. It starts no goroutine.
func Gemm[T Scalar](opA, opB Op, m, n, k int, alpha T, a []T, lda int, b []T, ldb int, beta T, c []T, ldc int) {
	if opA > ConjNoTrans || opB > ConjNoTrans {
		panic(fmt.Sprintf("dense: product with operations %v, %v", opA, opB))
	}
	matrix("C", m, n, ldc, len(c))
	if m == 0 || n == 0 {
		return
	}
	if opA.transposes() {
		matrix("A (transposed)", k, m, lda, len(a))
	} else {
		matrix("A", m, k, lda, len(a))
	}
	if opB.transposes() {
		matrix("B (transposed)", n, k, ldb, len(b))
	} else {
		matrix("B", k, n, ldb, len(b))
	}
	if k == 0 || alpha == 0 {
		scaleRows(m, n, beta, c, ldc)
		return
	}
	switch c := any(c).(type) {
	case []float64:
		a, b := any(a).([]float64), any(b).([]float64)
		alpha, beta := any(alpha).(float64), any(beta).(float64)
		if m*n*k < tinyProduct {
			plainReal(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
			return
		}
		gemmReal(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
	case []complex128:
		a, b := any(a).([]complex128), any(b).([]complex128)
		alpha, beta := any(alpha).(complex128), any(beta).(complex128)
		if m*n*k < tinyProduct {
			plainComplex(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
			return
		}
		gemmComplex(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
	}
}

// scaleRows multiplies the m×n matrix c by beta; zero clears it unread.
func scaleRows[T Scalar](m, n int, beta T, c []T, ldc int) {
	if beta == 1 {
		return
	}
	for i := range m {
		Scale(beta, c[i*ldc:i*ldc+n])
	}
}

// strides returns the distances between rows and columns of op(x).
func (op Op) strides(ld int) (row, col int) {
	if op.transposes() {
		return 1, ld
	}
	return ld, 1
}

// plainReal is the contract of Gemm, written out; it serves tiny products and tests.
func plainReal(opA, opB Op, m, n, k int, alpha float64, a []float64, lda int, b []float64, ldb int, beta float64, c []float64, ldc int) {
	rowA, colA := opA.strides(lda)
	rowB, colB := opB.strides(ldb)
	for i := range m {
		for j := range n {
			sum := 0.0
			for l := range k {
				sum += a[i*rowA+l*colA] * b[l*rowB+j*colB]
			}
			if beta == 0 {
				c[i*ldc+j] = alpha * sum
			} else {
				c[i*ldc+j] = alpha*sum + beta*c[i*ldc+j]
			}
		}
	}
}

// plainComplex is plainReal for complex128.
func plainComplex(opA, opB Op, m, n, k int, alpha complex128, a []complex128, lda int, b []complex128, ldb int, beta complex128, c []complex128, ldc int) {
	rowA, colA := opA.strides(lda)
	rowB, colB := opB.strides(ldb)
	conjA, conjB := opA.conjugates(), opB.conjugates()
	for i := range m {
		for j := range n {
			var sum complex128
			for l := range k {
				x, y := a[i*rowA+l*colA], b[l*rowB+j*colB]
				if conjA {
					x = cmplx.Conj(x)
				}
				if conjB {
					y = cmplx.Conj(y)
				}
				sum += x * y
			}
			if beta == 0 {
				c[i*ldc+j] = alpha * sum
			} else {
				c[i*ldc+j] = alpha*sum + beta*c[i*ldc+j]
			}
		}
	}
}
