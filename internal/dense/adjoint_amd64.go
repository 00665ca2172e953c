//go:build amd64 && !purego

package dense

import "unsafe"

// adjointColumns and adjointRows bound the piece that one call of a kernel transposes: few enough columns that the rows written stay in
// the cache until they are whole lines, and little enough for one call.
const (
	adjointColumns = 32
	adjointRows    = 512
)

// transposeTiles writes the transpose of the first rows of the m×n matrix a to b, by the kernels in use, and returns how many rows
// those are: a multiple of what a vector holds.
func transposeTiles(size, m, n int, a unsafe.Pointer, lda int, b unsafe.Pointer, ldb int) int {
	edge := 32 / size
	if kernels == avx512Kernels {
		edge = 64 / size
	}
	m -= m % edge
	for i := 0; i < m; i += adjointRows {
		rows := min(adjointRows, m-i)
		for j := 0; j < n; j += adjointColumns {
			cols := min(adjointColumns, n-j)
			from := (*float64)(unsafe.Add(a, (i*lda+j)*size))
			to := (*float64)(unsafe.Add(b, (j*ldb+i)*size))
			switch {
			case kernels == avx512Kernels && size == 8:
				packColumnsReal512(to, from, cols, lda*size, rows, ldb*size)
			case kernels == avx512Kernels:
				packColumnsComplex512(to, from, cols, lda*size, rows, ldb*size)
			case size == 8:
				packColumnsReal256(to, from, cols, lda*size, rows, ldb*size)
			default:
				packColumnsComplex256(to, from, cols, lda*size, rows, ldb*size)
			}
		}
	}
	return m
}

func conjugateTiles(dst, src []float64) {
	for len(src) > 0 {
		n := min(vectorChunk, len(src))
		if kernels == avx512Kernels {
			conjugate512(&dst[0], &src[0], n)
		} else {
			conjugate256(&dst[0], &src[0], n)
		}
		dst, src = dst[n:], src[n:]
	}
}
