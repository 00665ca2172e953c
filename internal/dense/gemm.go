package dense

import (
	"fmt"
	"unsafe"
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

// m·n·k below which the plain loops beat the set-up of a call: of assembly kernels, of the others (BenchmarkGemm, sizes 1 to 8).
const (
	tinyForTiles = 4
	tinyProduct  = 200
)

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
	rowsA, colsA, rowsB, colsB := m, k, k, n
	if opA.transposes() {
		rowsA, colsA = k, m
	}
	if opB.transposes() {
		rowsB, colsB = n, k
	}
	if opA|opB > ConjNoTrans || !fits(m, n, ldc, len(c)) || !fits(rowsA, colsA, lda, len(a)) || !fits(rowsB, colsB, ldb, len(b)) {
		mustFit(opA, opB, m, n, k, len(a), lda, len(b), ldb, len(c), ldc)
	}
	if m == 0 || n == 0 {
		return
	}
	if k == 0 || alpha == 0 {
		scaleRows(m, n, beta, c, ldc)
		return
	}
	if !useTiles() {
		otherGemm(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
		return
	}
	if m*n*k <= tinyForTiles {
		plain(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
		return
	}
	if opA.transposes() && n < m && n <= 3 {
		if n == 1 && ldc == 1 {
			// A column of C is also a row, and of the transposed product the large factor is read as it lies.
			opA, opB, m, n, a, lda, b, ldb, ldc = opB.transposed(), opA.transposed(), 1, m, b, ldb, a, lda, m
		} else if k >= 64 && n*int(unsafe.Sizeof(alpha)) <= 32 {
			turnedGemm(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
			return
		}
	}
	var p tileCall
	if beta != 0 {
		p.add = 1
		if beta != 1 {
			scaleRows(m, n, beta, c, ldc)
		}
	}
	// The layout of a number is that of its parts.
	p.a, p.b, p.c = (*float64)(unsafe.Pointer(&a[0])), (*float64)(unsafe.Pointer(&b[0])), (*float64)(unsafe.Pointer(&c[0]))
	if unsafe.Sizeof(alpha) == 8 {
		p.weight[0] = *(*float64)(unsafe.Pointer(&alpha))
	} else {
		p.signs(opA, opB, *(*complex128)(unsafe.Pointer(&alpha)))
	}
	runTiles(&p, int(unsafe.Sizeof(alpha)), opA.transposes(), opB.transposes(), m, n, k, lda, ldb, ldc)
}

// turnedGemm computes the transpose of the product, for few columns: vectors then run along the rows of A instead of the short ones of C.
func turnedGemm[T Scalar](opA, opB Op, m, n, k int, alpha T, a []T, lda int, b []T, ldb int, beta T, c []T, ldc int) {
	buffer := packPool.Get().(*packBuffer)
	turned := unsafe.Slice((*T)(buffer.room(m*n*int(unsafe.Sizeof(alpha))/8)), m*n)
	Gemm(opB.transposed(), opA.transposed(), n, m, k, alpha, b, ldb, a, lda, 0, turned, m)
	scaleRows(m, n, beta, c, ldc)
	for j := range n {
		for i, x := range turned[j*m : (j+1)*m] {
			if at := i*ldc + j; beta == 0 {
				c[at] = x
			} else {
				c[at] += x
			}
		}
	}
	packPool.Put(buffer)
}

// otherGemm is Gemm without assembly; no size is zero.
func otherGemm[T Scalar](opA, opB Op, m, n, k int, alpha T, a []T, lda int, b []T, ldb int, beta T, c []T, ldc int) {
	switch {
	case m*n*k < tinyProduct:
		plain(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
	case kernels == netlibKernels:
		netlibGemm(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
	default:
		blocked(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
	}
}

// transposed returns the operation that gives op(X)^T.
func (op Op) transposed() Op { return op ^ 1 }

// fits tells whether rows×cols elements with stride ld fit into a slice of length have.
func fits(rows, cols, ld, have int) bool {
	return rows >= 0 && cols >= 0 && ld >= cols && (rows == 0 || cols == 0 || (rows-1)*ld+cols <= have)
}

// mustFit panics if an argument of Gemm is not what it should be. A and B may be anything if C is empty.
func mustFit(opA, opB Op, m, n, k, lenA, lda, lenB, ldb, lenC, ldc int) {
	if opA > ConjNoTrans || opB > ConjNoTrans {
		panic(fmt.Sprintf("dense: product with operations %v, %v", opA, opB))
	}
	matrix("C", m, n, ldc, lenC)
	if m == 0 || n == 0 {
		return
	}
	if opA.transposes() {
		matrix("A (transposed)", k, m, lda, lenA)
	} else {
		matrix("A", m, k, lda, lenA)
	}
	if opB.transposes() {
		matrix("B (transposed)", n, k, ldb, lenB)
	} else {
		matrix("B", k, n, ldb, lenB)
	}
}

// signs fills in what complex kernels need: weight and cross, with a real alpha in them, and the rest for one that is not real.
func (p *tileCall) signs(opA, opB Op, alpha complex128) {
	// (Re a)(re, im) and (Im a)(im, re) of b.
	p.weight, p.cross = [2]float64{1, 1}, [2]float64{-1, 1}
	if opA.conjugates() {
		p.cross = [2]float64{1, -1}
	}
	if opB.conjugates() {
		p.weight[1] = -1
		p.cross[0] = -p.cross[0]
	}
	re, im := real(alpha), imag(alpha)
	if im != 0 {
		p.turn = 1
		p.alphaReal, p.alphaImag = [2]float64{re, re}, [2]float64{-im, im}
		return
	}
	if re != 1 {
		for i := range 2 {
			p.weight[i] *= re
			p.cross[i] *= re
		}
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

// plain is the contract of Gemm, written out; it serves tiny products and tests.
func plain[T Scalar](opA, opB Op, m, n, k int, alpha T, a []T, lda int, b []T, ldb int, beta T, c []T, ldc int) {
	rowA, colA := opA.strides(lda)
	rowB, colB := opB.strides(ldb)
	conjugates := IsComplex[T]() && (opA.conjugates() || opB.conjugates())
	for i := range m {
		for j := range n {
			var sum T
			for l := range k {
				x, y := a[i*rowA+l*colA], b[l*rowB+j*colB]
				if conjugates {
					if opA.conjugates() {
						x = Conj(x)
					}
					if opB.conjugates() {
						y = Conj(y)
					}
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
