//go:build amd64 && !purego

package dense

//go:generate go -C _asm run .

// The kernels; tileCall says what they do. The number after x is of vectors.

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

// The dots kernels are for few columns, so many as the number after x. Vectors run along k: rows of A and columns of B must be without
// gaps; rowB is the distance of columns, colA is not read. k counts the whole vectors before the last, which has tail elements.

//go:noescape
func dotsReal512x1(p *tileCall)

//go:noescape
func dotsReal512x2(p *tileCall)

//go:noescape
func dotsReal512x3(p *tileCall)

//go:noescape
func dotsReal512x4(p *tileCall)

//go:noescape
func dotsComplex512x1(p *tileCall)

//go:noescape
func dotsComplex512x2(p *tileCall)

//go:noescape
func dotsReal256x1(p *tileCall)

//go:noescape
func dotsReal256x2(p *tileCall)

//go:noescape
func dotsReal256x3(p *tileCall)

//go:noescape
func dotsReal256x4(p *tileCall)

//go:noescape
func dotsComplex256x1(p *tileCall)

//go:noescape
func dotsComplex256x2(p *tileCall)

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
