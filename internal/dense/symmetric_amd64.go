//go:build amd64 && !purego

package dense

// symmetricReal reads so many rows of n numbers of a, lda bytes apart, once for two products: it adds the dot product of row r with v
// to dots[r], and row r times x[r] to y.
//
//go:noescape
func symmetricReal512(a *float64, lda, rows, n int, v, x, y, dots *float64)

//go:noescape
func symmetricReal256(a *float64, lda, rows, n int, v, x, y, dots *float64)

// symmetricComplex is the same for complex numbers, which count as two in n. Nothing is conjugated.
//
//go:noescape
func symmetricComplex512(a *float64, lda, rows, n int, v, x, y, dots *float64)

//go:noescape
func symmetricComplex256(a *float64, lda, rows, n int, v, x, y, dots *float64)
