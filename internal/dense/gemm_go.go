package dense

import "sync"

// Blocks of the product in plain Go, in real numbers. A strip of A and a panel of B (stripDepth×4) stay in the first-level cache, the
// packed A and B in the second. BenchmarkGemm sets them anew.
const (
	goDepth  = 256
	goHeight = 64
	goWidth  = 256
)

// goPacks holds one block of A and one of B.
type goPacks struct {
	a [goHeight * goDepth]float64
	b [goWidth * goDepth]float64
}

var goPool = sync.Pool{New: func() any { return new(goPacks) }}

// blocked is Gemm in plain Go, on packed copies: strips of two rows of A, with alpha and the operation applied, and panels of four
// columns of B. Complex numbers are pairs of real columns,
//
//	C += [Re A, Im A] [B; iB]
//
// which costs no more than complex arithmetic.
func blocked[T Scalar](opA, opB Op, m, n, k int, alpha T, a []T, lda int, b []T, ldb int, beta T, c []T, ldc int) {
	per := 1 // real numbers in an element
	if IsComplex[T]() {
		per = 2
	}
	p := goPool.Get().(*goPacks)
	defer goPool.Put(p)
	scaleRows(m, n, beta, c, ldc)
	to := floats(c)
	for l := 0; l < k; l += goDepth / per {
		kk := min(goDepth/per, k-l)
		for j := 0; j < n; j += goWidth / per {
			nn := min(goWidth/per, n-j)
			packRight(opB, kk, nn, l, j, b, ldb, p.b[:])
			for i := 0; i < m; i += goHeight {
				mm := min(goHeight, m-i)
				packLeft(opA, mm, kk, i, l, alpha, a, lda, p.a[:])
				strips(mm, per*nn, per*kk, p.a[:], p.b[:], to[per*(i*ldc+j):], per*ldc)
			}
		}
	}
}

// strips adds the product of packed blocks to the m×n matrix c.
func strips(m, n, k int, a, b, c []float64, ldc int) {
	for i := 0; i < m; i += 2 {
		strip := a[i*k:][:2*k]
		row0 := c[i*ldc:]
		for j := 0; j < n; j += 4 {
			s00, s01, s02, s03, s10, s11, s12, s13 := tile2x4(strip, b[j*k:][:4*k])
			if i+1 < m && j+4 <= n {
				r0, r1 := (*[4]float64)(row0[j:]), (*[4]float64)(row0[ldc+j:])
				r0[0] += s00
				r0[1] += s01
				r0[2] += s02
				r0[3] += s03
				r1[0] += s10
				r1[1] += s11
				r1[2] += s12
				r1[3] += s13
				continue
			}
			sums := [2][4]float64{{s00, s01, s02, s03}, {s10, s11, s12, s13}}
			for r := range min(2, m-i) {
				for q := range min(4, n-j) {
					row0[r*ldc+j+q] += sums[r][q]
				}
			}
		}
	}
}

// tile2x4 multiplies a strip and a panel. Eight sums and six factors are what sixteen registers hold.
func tile2x4(a, b []float64) (s00, s01, s02, s03, s10, s11, s12, s13 float64) {
	for len(a) >= 2 && len(b) >= 4 {
		a0, a1 := a[0], a[1]
		b0, b1, b2, b3 := b[0], b[1], b[2], b[3]
		s00 += a0 * b0
		s01 += a0 * b1
		s02 += a0 * b2
		s03 += a0 * b3
		s10 += a1 * b0
		s11 += a1 * b1
		s12 += a1 * b2
		s13 += a1 * b3
		a, b = a[2:], b[4:]
	}
	return
}

// packLeft writes alpha op(A)[i0:i0+m, l0:l0+k] in strips of two rows; a row that is missing is zero.
func packLeft[T Scalar](op Op, m, k, i0, l0 int, alpha T, a []T, lda int, out []float64) {
	row, col := op.strides(lda)
	switch a := any(a).(type) {
	case []float64:
		alpha := any(alpha).(float64)
		for i := 0; i < m; i += 2 {
			strip := out[i*k:][:2*k]
			if i+1 == m {
				clear(strip)
			}
			for r := range min(2, m-i) {
				at := (i0+i+r)*row + l0*col
				for l := r; l < len(strip); l += 2 {
					strip[l] = alpha * a[at]
					at += col
				}
			}
		}
	case []complex128:
		alpha, conj := any(alpha).(complex128), op.conjugates()
		for i := 0; i < m; i += 2 {
			strip := out[2*i*k:][:4*k]
			if i+1 == m {
				clear(strip)
			}
			for r := range min(2, m-i) {
				at := (i0+i+r)*row + l0*col
				for l := r; l < len(strip); l += 4 {
					z := a[at]
					if conj {
						z = complex(real(z), -imag(z))
					}
					z *= alpha
					strip[l], strip[l+2] = real(z), imag(z)
					at += col
				}
			}
		}
	}
}

// packRight writes op(B)[l0:l0+k, j0:j0+n] in panels of four real columns; columns that are missing are zero. Each row of complex
// numbers is followed by i times itself.
func packRight[T Scalar](op Op, k, n, l0, j0 int, b []T, ldb int, out []float64) {
	row, col := op.strides(ldb)
	switch b := any(b).(type) {
	case []float64:
		for j := 0; j < n; j += 4 {
			panel := out[j*k:][:4*k]
			if j+4 > n {
				clear(panel)
			}
			for q := range min(4, n-j) {
				at := l0*row + (j0+j+q)*col
				for l := q; l < len(panel); l += 4 {
					panel[l] = b[at]
					at += row
				}
			}
		}
	case []complex128:
		sign := 1.0
		if op.conjugates() {
			sign = -1
		}
		for j := 0; j < n; j += 2 {
			panel := out[4*j*k:][:8*k]
			if j+2 > n {
				clear(panel)
			}
			for q := range min(2, n-j) {
				at := l0*row + (j0+j+q)*col
				for l := 2 * q; l < len(panel); l += 8 {
					re, im := real(b[at]), sign*imag(b[at])
					panel[l], panel[l+1] = re, im
					panel[l+4], panel[l+5] = -im, re
					at += row
				}
			}
		}
	}
}
