package dense

import "unsafe"

// adjoint writes the conjugate transpose of the m×n matrix a into b (n×m).
func adjoint[T Scalar](m, n int, a []T, lda int, b []T, ldb int) {
	if m == 0 || n == 0 {
		return
	}
	done := 0
	if useTiles() {
		var one T
		done = transposeTiles(int(unsafe.Sizeof(one)), m, n, unsafe.Pointer(&a[0]), lda, unsafe.Pointer(&b[0]), ldb)
	}
	transposeLoop(m-done, n, a[min(done*lda, len(a)):], lda, b[done:], ldb)
	if !IsComplex[T]() {
		return
	}
	for j := range n {
		row := b[j*ldb : j*ldb+m]
		Conjugate(row, row)
	}
}

// transposeLoop writes the transpose of the m×n matrix a into b, column by column in strips that stay in the cache.
func transposeLoop[T Scalar](m, n int, a []T, lda int, b []T, ldb int) {
	const strip = 16
	for j := 0; j < n; j += strip {
		end := min(j+strip, n)
		for i := range m {
			for at, x := range a[i*lda+j : i*lda+end] {
				b[(j+at)*ldb+i] = x
			}
		}
	}
}
