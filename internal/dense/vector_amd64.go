//go:build amd64 && !purego

package dense

// Kernels on vectors of n numbers. Complex numbers count as two.

// dotReal returns the sum of x[i] y[i].
//
//go:noescape
func dotReal512(x, y *float64, n int) float64

//go:noescape
func dotReal256(x, y *float64, n int) float64

// dotComplex returns the sum of conj(x[i]) y[i].
//
//go:noescape
func dotComplex512(x, y *float64, n int) (re, im float64)

//go:noescape
func dotComplex256(x, y *float64, n int) (re, im float64)

// axpyReal adds alpha x to y.
//
//go:noescape
func axpyReal512(alpha float64, x, y *float64, n int)

//go:noescape
func axpyReal256(alpha float64, x, y *float64, n int)

//go:noescape
func axpyComplex512(re, im float64, x, y *float64, n int)

//go:noescape
func axpyComplex256(re, im float64, x, y *float64, n int)

// scaleReal multiplies x by alpha.
//
//go:noescape
func scaleReal512(alpha float64, x *float64, n int)

//go:noescape
func scaleReal256(alpha float64, x *float64, n int)

//go:noescape
func scaleComplex512(re, im float64, x *float64, n int)

//go:noescape
func scaleComplex256(re, im float64, x *float64, n int)

// largest returns max |x[i]|, NaN if one is NaN.
//
//go:noescape
func largest512(x *float64, n int) float64

//go:noescape
func largest256(x *float64, n int) float64

// conjugate writes the conjugates of x to y.
//
//go:noescape
func conjugate512(y, x *float64, n int)

//go:noescape
func conjugate256(y, x *float64, n int)
