package dense

import (
	"math/cmplx"
	"sync"
	"unsafe"

	"gonum.org/v1/gonum/blas"
)

// Tile edges. gonum runs a product on its own goroutines once C spans four of its 64×64 blocks; a C tile of tileM×tileN spans at
// most two. The other reason for the sizes is the cache: the B tile (tileK×tileN numbers, 64 KiB) stays in L2 and a row of C in L1
// while the rows of A run past. BenchmarkGemm sets them anew.
const (
	tileM = 64
	tileN = 128
	tileK = 64
)

// narrow is the width of C, in real numbers, below which dot products along k beat updates along rows of C, provided that k is at
// least twice the width (BenchmarkGemm, m=512/n=4 and n=16).
const narrow = 24

// packs holds the copies of one tile of A and one of B.
type packs struct{ a, b [tileK * tileN]float64 }

var packPool = sync.Pool{New: func() any { return new(packs) }}

// tiledReal is Gemm over gonum's Dgemm. A transposed tile is copied straight first: gonum's loops for them are several times slower.
func tiledReal(opA, opB Op, m, n, k int, alpha float64, a []float64, lda int, b []float64, ldb int, beta float64, c []float64, ldc int) {
	p := packPool.Get().(*packs)
	defer packPool.Put(p)
	scaleRows(m, n, beta, c, ldc)
	dots := n < narrow && k >= 2*n
	for l0 := 0; l0 < k; l0 += tileK {
		kk := min(tileK, k-l0)
		for j0 := 0; j0 < n; j0 += tileN {
			nn := min(tileN, n-j0)
			bt, ldbt := b, ldb
			switch {
			case opB.transposes() && dots:
				bt = b[j0*ldb+l0:]
			case opB.transposes():
				bt, ldbt = p.b[:], nn
				transposeReal(nn, kk, b[j0*ldb+l0:], ldb, bt, nn)
			case dots:
				bt, ldbt = p.b[:], kk
				transposeReal(kk, nn, b[l0*ldb+j0:], ldb, bt, kk)
			default:
				bt = b[l0*ldb+j0:]
			}
			for i0 := 0; i0 < m; i0 += tileM {
				mm := min(tileM, m-i0)
				at, ldat := a, lda
				if opA.transposes() {
					at, ldat = p.a[:], kk
					transposeReal(kk, mm, a[l0*lda+i0:], lda, at, kk)
				} else {
					at = a[i0*lda+l0:]
				}
				tb := blas.NoTrans
				if dots {
					tb = blas.Trans
				}
				ref.Dgemm(blas.NoTrans, tb, mm, nn, kk, alpha, at, ldat, bt, ldbt, 1, c[i0*ldc+j0:], ldc)
			}
		}
	}
}

// transposeReal writes the transpose of the m×n matrix a to b (n×m).
func transposeReal(m, n int, a []float64, lda int, b []float64, ldb int) {
	for i := range m {
		for j, x := range a[i*lda : i*lda+n] {
			b[j*ldb+i] = x
		}
	}
}

// tiledComplex is Gemm over gonum's Dgemm, which is written in assembly where Zgemm is not. Read as real numbers a row of C is twice
// as long, and
//
//	C += [Re A, Im A] [B; iB]
//
// is the complex product at no extra cost: A's tile is copied split, with alpha and the operation applied, B's beside iB.
func tiledComplex(opA, opB Op, m, n, k int, alpha complex128, a []complex128, lda int, b []complex128, ldb int, beta complex128, c []complex128, ldc int) {
	p := packPool.Get().(*packs)
	defer packPool.Put(p)
	scaleRows(m, n, beta, c, ldc)
	dots := n < narrow/2 && k >= 2*n
	for l0 := 0; l0 < k; l0 += tileK / 2 {
		kk := min(tileK/2, k-l0)
		for j0 := 0; j0 < n; j0 += tileN / 2 {
			nn := min(tileN/2, n-j0)
			tb, ldbt := blas.NoTrans, 2*nn
			if dots {
				tb, ldbt = blas.Trans, 2*kk
			}
			packComplexB(opB, kk, nn, l0, j0, b, ldb, p.b[:], dots)
			for i0 := 0; i0 < m; i0 += tileM {
				mm := min(tileM, m-i0)
				packComplexA(opA, mm, kk, i0, l0, alpha, a, lda, p.a[:])
				ref.Dgemm(blas.NoTrans, tb, mm, 2*nn, 2*kk, 1, p.a[:], 2*kk, p.b[:], ldbt, 1, floats(c[i0*ldc+j0:]), 2*ldc)
			}
		}
	}
}

// floats views complex numbers as pairs of real ones.
func floats(x []complex128) []float64 {
	if len(x) == 0 {
		return nil
	}
	return unsafe.Slice((*float64)(unsafe.Pointer(&x[0])), 2*len(x))
}

// packComplexA writes alpha op(A)[i0:i0+m, l0:l0+k] as an m×2k real matrix, real parts left of imaginary parts.
func packComplexA(op Op, m, k, i0, l0 int, alpha complex128, a []complex128, lda int, out []float64) {
	row, col := op.strides(lda)
	conj := op.conjugates()
	for i := range m {
		re := out[i*2*k : i*2*k+k]
		im := out[i*2*k+k : i*2*k+2*k]
		at := (i0+i)*row + l0*col
		for l := range re {
			z := a[at]
			if conj {
				z = cmplx.Conj(z)
			}
			z *= alpha
			re[l], im[l] = real(z), imag(z)
			at += col
		}
	}
}

// packComplexB writes the tile op(B)[l0:l0+k, j0:j0+n] above i times itself as a 2k×2n real matrix, or the transpose of that.
func packComplexB(op Op, k, n, l0, j0 int, b []complex128, ldb int, out []float64, transposed bool) {
	row, col := op.strides(ldb)
	sign := 1.0
	if op.conjugates() {
		sign = -1
	}
	// Distances in out: to the next l, to iB, to the next j, to the imaginary part.
	nextL, below, nextJ, right := 2*n, 2*n*k, 2, 1
	if transposed {
		nextL, below, nextJ, right = 1, k, 4*k, 2*k
	}
	for l := range k {
		from, to := (l0+l)*row+j0*col, l*nextL
		for range n {
			re, im := real(b[from]), sign*imag(b[from])
			out[to], out[to+right] = re, im
			out[to+below], out[to+below+right] = -im, re
			from += col
			to += nextJ
		}
	}
}
