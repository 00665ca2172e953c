//go:build !amd64 || purego

package dense

import "unsafe"

// There is no assembly for this machine or in this build.

func sumsTiles(squared bool, d, z []float64, pole, t float64) (sum, slope float64) {
	panic("dense: built without assembly")
}

func quotientsTiles(squared bool, product, d []float64, pole, t, other float64) {
	panic("dense: built without assembly")
}

func rowTiles(kind rowKind, d, z, row []float64, pole, t float64) (squares float64) {
	panic("dense: built without assembly")
}

func twoProductsTiles(size, m, n, lda int, a, v, x, dots, y unsafe.Pointer) {
	panic("dense: built without assembly")
}

func transposeTiles(size, m, n int, a unsafe.Pointer, lda int, b unsafe.Pointer, ldb int) int {
	panic("dense: built without assembly")
}

func conjugateTiles(dst, src []float64) { panic("dense: built without assembly") }
