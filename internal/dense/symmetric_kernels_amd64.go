//go:build amd64 && !purego

package dense

import "unsafe"

// symmetricNumbers bounds the rows times columns of a call.
const symmetricNumbers = 1 << 17

// twoProductsTiles is twoProducts by the kernels in use, for numbers of that size.
func twoProductsTiles(size, m, n, lda int, a, v, x, dots, y unsafe.Pointer) {
	rows := max(8, symmetricNumbers/n&^7)
	for ; m > 0; m -= rows {
		now := min(rows, m)
		pa, pv, px, py, pd := (*float64)(a), (*float64)(v), (*float64)(x), (*float64)(y), (*float64)(dots)
		switch {
		case kernels == avx512Kernels && size == 8:
			symmetricReal512(pa, lda*size, now, n, pv, px, py, pd)
		case kernels == avx512Kernels:
			symmetricComplex512(pa, lda*size, now, 2*n, pv, px, py, pd)
		case size == 8:
			symmetricReal256(pa, lda*size, now, n, pv, px, py, pd)
		default:
			symmetricComplex256(pa, lda*size, now, 2*n, pv, px, py, pd)
		}
		if now < m {
			a, x, dots = unsafe.Add(a, now*lda*size), unsafe.Add(x, now*size), unsafe.Add(dots, now*size)
		}
	}
}
