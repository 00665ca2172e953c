package dense

import (
	"fmt"
	"math"
	"math/cmplx"
	"unsafe"

	"gonum.org/v1/gonum/blas/gonum"
)

// ref is gonum's pure-Go BLAS, called directly so that no registered backend can slip in.
var ref gonum.Implementation

func checkLengths(what string, x, y int) {
	if x != y {
		panic(fmt.Sprintf("dense: %s of vectors of lengths %d and %d", what, x, y))
	}
}

// Dot returns the sum of conj(x[i]) y[i].
func Dot[T Scalar](x, y []T) T {
	checkLengths("dot product", len(x), len(y))
	var out T
	if len(x) == 0 {
		return out
	}
	if useTiles() {
		if unsafe.Sizeof(out) == 8 {
			*(*float64)(unsafe.Pointer(&out)) = dotRealTiles(floats(x), floats(y))
		} else {
			*(*complex128)(unsafe.Pointer(&out)) = dotComplexTiles(floats(x), floats(y))
		}
		return out
	}
	switch x := any(x).(type) {
	case []float64:
		*any(&out).(*float64) = ref.Ddot(len(x), x, 1, any(y).([]float64), 1)
	case []complex128:
		*any(&out).(*complex128) = ref.Zdotc(len(x), x, 1, any(y).([]complex128), 1)
	}
	return out
}

// Axpy adds alpha x to y.
func Axpy[T Scalar](alpha T, x, y []T) {
	checkLengths("sum", len(x), len(y))
	if len(x) == 0 {
		return
	}
	if useTiles() {
		axpyTiles(wide(alpha), floats(x), floats(y))
		return
	}
	switch x := any(x).(type) {
	case []float64:
		ref.Daxpy(len(x), any(alpha).(float64), x, 1, any(y).([]float64), 1)
	case []complex128:
		ref.Zaxpy(len(x), any(alpha).(complex128), x, 1, any(y).([]complex128), 1)
	}
}

// Scale multiplies x by alpha. Zero clears x, whatever it held.
func Scale[T Scalar](alpha T, x []T) {
	switch {
	case alpha == 0:
		clear(x)
	case alpha == 1:
	case useTiles():
		scaleTiles(wide(alpha), floats(x))
	default:
		for i := range x {
			x[i] *= alpha
		}
	}
}

// Norm returns the Euclidean norm, free of overflow and underflow in between.
func Norm[T Scalar](x []T) float64 {
	if len(x) == 0 {
		return 0
	}
	// The plain sum is exact enough unless it has left the range where squares are normal numbers.
	const small, large = 1e-280, 1e280
	parts := floats(x)
	if s := Dot(parts, parts); s > small && s < large {
		return math.Sqrt(s)
	}
	switch x := any(x).(type) {
	case []float64:
		return ref.Dnrm2(len(x), x, 1)
	case []complex128:
		return ref.Dznrm2(len(x), x, 1)
	}
	return 0
}

// Conjugate writes conj(src) to dst; the two may be the same slice.
func Conjugate[T Scalar](dst, src []T) {
	checkLengths("conjugate", len(dst), len(src))
	switch s := any(src).(type) {
	case []float64:
		copy(dst, src)
	case []complex128:
		if useTiles() {
			conjugateTiles(floats(dst), floats(src))
			return
		}
		d := any(dst).([]complex128)
		for i, z := range s {
			d[i] = cmplx.Conj(z)
		}
	}
}

// floats views numbers as real ones, complex ones as pairs.
func floats[T Scalar](x []T) []float64 {
	var one T
	return unsafe.Slice((*float64)(unsafe.Pointer(unsafe.SliceData(x))), len(x)*int(unsafe.Sizeof(one))/8)
}

// wide is ToComplex without the way over an interface.
func wide[T Scalar](x T) complex128 {
	if unsafe.Sizeof(x) == 8 {
		return complex(*(*float64)(unsafe.Pointer(&x)), 0)
	}
	return *(*complex128)(unsafe.Pointer(&x))
}

// largest returns max |x| over the real and imaginary parts of an m×n matrix; NaN if any entry is NaN.
func largest[T Scalar](m, n int, a []T, lda int) float64 {
	top := 0.0
	for i := range m {
		row := floats(a[i*lda : i*lda+n])
		if useTiles() {
			top = max(top, largestTiles(row))
		} else {
			top = larger(top, row)
		}
	}
	return top
}

// larger returns the largest of top and |x|, NaN if one of them is.
func larger(top float64, x []float64) float64 {
	for _, x := range x {
		if x := math.Abs(x); !(x <= top) {
			if top != top {
				return top
			}
			top = x
		}
	}
	return top
}

// matrix panics unless rows×cols elements with stride ld fit into a slice of length have.
func matrix(name string, rows, cols, ld, have int) {
	if rows < 0 || cols < 0 || ld < cols || (rows > 0 && cols > 0 && have < (rows-1)*ld+cols) {
		panic(fmt.Sprintf("dense: %s is %d×%d with stride %d but holds %d elements", name, rows, cols, ld, have))
	}
}

// copyMatrix copies the m×n matrix a to b, multiplied by s.
func copyMatrix[T Scalar](m, n int, s float64, a []T, lda int, b []T, ldb int) {
	scale := FromFloat[T](s)
	for i := range m {
		row := b[i*ldb : i*ldb+n]
		copy(row, a[i*lda:i*lda+n])
		if s != 1 {
			Scale(scale, row)
		}
	}
}
