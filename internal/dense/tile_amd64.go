//go:build amd64 && !purego

package dense

//go:generate go -C _asm run .

// tileCall is what an assembly kernel is told; the generator reads the layout from this file. Distances are in bytes. For each of
// its rows a kernel computes, with op(A) and B complex where its name says so and w the elements of its x vectors,
//
//	for j := range w {
//		var sum T
//		for l := range k {
//			sum += a[i*rowA + l*colA] * b[l*rowB + j*size]
//		}
//		c[i*rowC + j*size] = alpha*sum (+ c[i*rowC + j*size] if add)
//	}
//
// A kernel that is x vectors wide stops after tail elements of the last vector: nothing beyond is read or written.
type tileCall struct {
	a, b, c      *float64
	k            int // at least 1
	rowA, colA   int
	rowB, rowC   int
	rows         int // in each of the first blocks, at least 1
	blocks, rest int // so many blocks of rows, then so many of one row less
	tail         int // elements in the last vector, at least 1
	add          int // 1: add to C; 0: C is not read
	left         int // scratch

	// real kernels: weight[0] is alpha. Complex ones first form weight*[Re a * b] + cross*[Im a * (Im b, Re b)], element by element
	// of (re, im) pairs: the signs conjugate A, B or both.
	weight, cross [2]float64
	// complex kernels: the sum is then multiplied by alpha, if turn is 1.
	turn      int
	alphaReal [2]float64 // Re alpha twice
	alphaImag [2]float64 // -Im alpha, Im alpha
}

//go:noescape
func tileReal512x1(p *tileCall)

//go:noescape
func tileReal512x2(p *tileCall)

//go:noescape
func tileReal512x3(p *tileCall)

//go:noescape
func tileComplex512x1(p *tileCall)

//go:noescape
func tileComplex512x2(p *tileCall)

//go:noescape
func tileComplex512x3(p *tileCall)

//go:noescape
func tileReal256x1(p *tileCall)

//go:noescape
func tileReal256x2(p *tileCall)

//go:noescape
func tileReal256x3(p *tileCall)

//go:noescape
func tileComplex256x1(p *tileCall)

//go:noescape
func tileComplex256x2(p *tileCall)

// packRows copies k rows of so many vectors, the last with tail numbers, from rows ld bytes apart to rows without gaps. Numbers up to
// the end of a vector become zero. A complex number counts as two.
//
//go:noescape
func packRows512(dst, src *float64, k, ld, vectors, tail int)

//go:noescape
func packRows256(dst, src *float64, k, ld, vectors, tail int)

// packColumns writes the transpose of a matrix of so many rows of k elements, ld bytes apart, to k rows of width bytes. Elements up to
// the end of a vector become zero.
//
//go:noescape
func packColumnsReal512(dst, src *float64, k, ld, rows, width int)

//go:noescape
func packColumnsComplex512(dst, src *float64, k, ld, rows, width int)

//go:noescape
func packColumnsReal256(dst, src *float64, k, ld, rows, width int)

//go:noescape
func packColumnsComplex256(dst, src *float64, k, ld, rows, width int)
