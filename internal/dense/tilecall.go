package dense

// tileCall is what an assembly kernel is told; the generator of the kernels reads the layout from this file. Distances are in bytes. For
// each of its rows a kernel computes, with A and B complex where its name says so and w the elements of its x vectors,
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
//
//lint:file-ignore U1000 the fields are for assembly
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
