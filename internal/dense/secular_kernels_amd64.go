//go:build amd64 && !purego

package dense

// The functions of this file run the kernels in use on poles, at least one. They are short: no problem has so many poles that a call
// takes long.

func sumsTiles(squared bool, d, z []float64, pole, t float64) (sum, slope float64) {
	switch {
	case kernels == avx512Kernels && squared:
		return secularSumsSquares512(&d[0], &z[0], len(d), pole, t)
	case kernels == avx512Kernels:
		return secularSums512(&d[0], &z[0], len(d), pole, t)
	case squared:
		return secularSumsSquares256(&d[0], &z[0], len(d), pole, t)
	}
	return secularSums256(&d[0], &z[0], len(d), pole, t)
}

func quotientsTiles(squared bool, product, d []float64, pole, t, other float64) {
	switch {
	case kernels == avx512Kernels && squared:
		secularQuotientsSquares512(&d[0], &product[0], len(d), pole, t, other)
	case kernels == avx512Kernels:
		secularQuotients512(&d[0], &product[0], len(d), pole, t, other)
	case squared:
		secularQuotientsSquares256(&d[0], &product[0], len(d), pole, t, other)
	default:
		secularQuotients256(&d[0], &product[0], len(d), pole, t, other)
	}
}

func rowTiles(kind rowKind, d, z, row []float64, pole, t float64) (squares float64) {
	wide := kernels == avx512Kernels
	switch {
	case wide && kind == leftRow:
		return secularRowLeft512(&d[0], &z[0], &row[0], len(d), pole, t)
	case wide && kind == squaredRow:
		return secularRowSquares512(&d[0], &z[0], &row[0], len(d), pole, t)
	case wide:
		return secularRow512(&d[0], &z[0], &row[0], len(d), pole, t)
	case kind == leftRow:
		return secularRowLeft256(&d[0], &z[0], &row[0], len(d), pole, t)
	case kind == squaredRow:
		return secularRowSquares256(&d[0], &z[0], &row[0], len(d), pole, t)
	}
	return secularRow256(&d[0], &z[0], &row[0], len(d), pole, t)
}
