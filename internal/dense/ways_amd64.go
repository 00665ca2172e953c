//go:build amd64 && !purego

package dense

import "unsafe"

const haveTiles = true

// Choices that all tilings share. They are variables for the tests' sake.
var (
	inPlaceRows  = 32        // of C up to which any B is read where it lies, if it is not transposed
	inPlaceBytes = 128 << 10 // that B may span otherwise
	dotBonus     = 240       // what copying B costs besides a share for each element, in steps along k
)

const (
	dotDepth    = 1024 // length along k that dots kernels take at a time
	vectorRows  = 2    // of C up to which a crowded B is read few rows at a time, for the sake of the pages, and how few
	vectorDepth = 16
)

// runTiles computes a product by assembly kernels. The numbers have size bytes; p has the addresses, the scalars and the signs.
func runTiles(p *tileCall, size int, transA, transB bool, m, n, k, lda, ldb, ldc int) {
	t := tilingOf(size)
	p.rowA, p.colA = lda*size, size
	if transA {
		p.rowA, p.colA = size, lda*size
	}
	p.rowB, p.rowC = ldb*size, ldc*size
	if !transA {
		few := n <= t.dotColumns
		switch {
		case few && (transB || n == 1 && ldb == 1), transB && t.dotsServe(m, n, k):
			t.dotProducts(p, m, n, k)
			return
		case few && k >= 16 && m*k >= t.turnedFrom:
			t.turnedDots(p, m, n, k)
			return
		}
	}
	inPlace := !transB && t.readsInPlace(m, k, p.rowB)
	if inPlace && m <= t.height && k <= t.depth && n <= t.vectors<<t.shift {
		vectors := (n + t.lanes - 1) >> t.shift
		p.k, p.tail = k, n-(vectors-1)<<t.shift
		p.split(m, t.rows)
		t.runTile(p, vectors)
		return
	}
	t.blocks(p, transA, transB, inPlace, m, n, k)
}

// readsInPlace tells whether a copy of B, which is not transposed, would cost more than it saves.
func (t *tiling) readsInPlace(m, k, rowB int) bool {
	switch {
	case m <= t.crowdedRows:
		return true
	case m <= inPlaceRows:
		return rowB < 4096 || !crowded(k, rowB)
	}
	return k*rowB <= inPlaceBytes && !crowded(k, rowB)
}

// dotsServe tells whether sums over lanes cost less than the copy of a transposed B that tiles would need.
func (t *tiling) dotsServe(m, n, k int) bool {
	return m <= t.dotHeight && k <= dotDepth && n*(t.dotWeight*m-k) <= dotBonus
}

// crowded tells whether rows lie so that many of them share a set of the first-level cache, which holds eight lines or more.
func crowded(rows, stride int) bool { return rows*min(stride&-stride, 4096) > 8*4096 }

// dotProducts computes a product by dots kernels. One call of a kernel stays short, as it cannot be preempted.
func (t *tiling) dotProducts(p *tileCall, m, n, k int) {
	a, b, c := unsafe.Pointer(p.a), unsafe.Pointer(p.b), unsafe.Pointer(p.c)
	for l := 0; l < k; l += dotDepth {
		kk := min(dotDepth, k-l)
		p.k = (kk - 1) >> t.shift
		p.tail = kk - p.k<<t.shift
		height := max(8, 64*dotDepth/kk)
		for i := 0; i < m; i += height {
			p.split(min(height, m-i), t.dotRows)
			p.a = (*float64)(unsafe.Add(a, i*p.rowA+l*p.colA))
			for j := 0; j < n; j += t.dotColumns {
				p.b = (*float64)(unsafe.Add(b, l*t.size+j*p.rowB))
				p.c = (*float64)(unsafe.Add(c, i*p.rowC+j*t.size))
				t.runDots(p, min(t.dotColumns, n-j))
			}
		}
		p.add = 1
	}
}

// turnedDots computes a product of few columns by dots kernels from a transposed copy of B.
func (t *tiling) turnedDots(p *tileCall, m, n, k int) {
	width := (k + t.lanes - 1) &^ (t.lanes - 1) * t.size
	buffer := packPool.Get().(*packBuffer)
	turned := (*float64)(buffer.room(n * width / 8))
	t.turn(turned, p.b, n, k, p.rowB, width)
	p.b, p.rowB = turned, width
	t.dotProducts(p, m, n, k)
	packPool.Put(buffer)
}

// blocks computes a product by tiles, block by block: from copies of B in panels as wide as a tile, or from B in place.
func (t *tiling) blocks(p *tileCall, transA, transB, inPlace bool, m, n, k int) {
	depth, width, height := even(k, t.depth, 1), even(n, t.width, t.lanes*t.vectors), even(m, t.height, t.rows)
	if inPlace && m <= vectorRows && crowded(k, p.rowB) {
		depth = even(k, vectorDepth, 1)
	}
	a, rowA, colA := unsafe.Pointer(p.a), p.rowA, p.colA
	b, rowB, colB := unsafe.Pointer(p.b), p.rowB, t.size
	if transB {
		rowB, colB = colB, rowB
	}
	c := unsafe.Pointer(p.c)
	// A copy of A is by rows, with a line between them.
	turnA, widthA := transA && n >= 64 && colA >= t.turnedStride && crowded(depth, colA), 0
	if turnA {
		widthA = (depth+t.lanes-1)&^(t.lanes-1)*t.size + 64
		p.rowA, p.colA = widthA, t.size
	}
	var buffer *packBuffer
	var copyA, copyB unsafe.Pointer
	if turnA || !inPlace {
		buffer = packPool.Get().(*packBuffer)
		copyA = buffer.room((height*widthA + depth*(width+t.lanes)*t.size) / 8)
		copyB = unsafe.Add(copyA, height*widthA)
	}
	add := p.add
	for j := 0; j < n; j += width {
		nn := min(width, n-j)
		p.add = add
		for l := 0; l < k; l += depth {
			p.k = min(depth, k-l)
			blockB := unsafe.Add(b, l*rowB+j*colB)
			if !inPlace {
				t.pack(copyB, blockB, p.k, nn, rowB, colB, transB)
				blockB = copyB
			}
			for i := 0; i < m; i += height {
				mm := min(height, m-i)
				p.a = (*float64)(unsafe.Add(a, i*rowA+l*colA))
				if turnA {
					t.turn((*float64)(copyA), p.a, mm, p.k, colA, widthA)
					p.a = (*float64)(copyA)
				}
				p.split(mm, t.rows)
				t.panels(p, nn, blockB, unsafe.Add(c, i*p.rowC+j*t.size), !inPlace)
			}
			p.add = 1
		}
	}
	if buffer != nil {
		packPool.Put(buffer)
	}
}

// even returns the size of the parts that n is cut into: about equal, at most that large, a multiple of unit but for the last.
func even(n, most, unit int) int {
	if n <= most {
		return n
	}
	parts := (n + most - 1) / most
	size := (n + parts - 1) / parts
	return min((size+unit-1)/unit*unit, most)
}

// split cuts m rows into blocks of at most that many, which differ by one row at most.
func (p *tileCall) split(m, most int) {
	if m <= most {
		p.rows, p.blocks, p.rest = m, 1, 0
		return
	}
	count := int(uint32(m+most-1) / uint32(most))
	p.rows = int(uint32(m+count-1) / uint32(count))
	p.blocks = m - count*(p.rows-1)
	p.rest = count - p.blocks
}

// cut returns the count of panels for so many vectors, the width of the first, and how many have that width; the others have one less.
func (t *tiling) cut(vectors int) (w, wide, count int) {
	if vectors <= t.vectors {
		return vectors, 1, 1
	}
	count = int(uint32(vectors+t.vectors-1) / uint32(t.vectors))
	w = int(uint32(vectors+count-1) / uint32(count))
	return w, vectors - count*(w-1), count
}

// panels runs over the columns of a block of B, panel by panel.
func (t *tiling) panels(p *tileCall, n int, b, c unsafe.Pointer, packed bool) {
	vectors := (n + t.lanes - 1) >> t.shift
	w, wide, count := t.cut(vectors)
	p.tail = t.lanes
	for i := range count {
		if i == wide {
			w--
		}
		if i == count-1 {
			p.tail = n - (vectors-1)<<t.shift
		}
		bytes := w * t.lanes * t.size
		p.b, p.c = (*float64)(b), (*float64)(c)
		if packed {
			p.rowB = bytes
		}
		t.runTile(p, w)
		if i == count-1 {
			return // a pointer must not leave its matrix, not even unused
		}
		c = unsafe.Add(c, bytes)
		if packed {
			bytes *= p.k
		}
		b = unsafe.Add(b, bytes)
	}
}

// packRowsAtOnce is the number of rows that pack carries across all panels at once where the rows are pages apart, so that few translations of
// addresses are missed: 46 Gflop/s instead of 39 at 16×512×512, real, AVX2; 41 with 32 rows.
const packRowsAtOnce = 16

// pack copies a block of B, or of its transpose, into panels.
func (t *tiling) pack(to, b unsafe.Pointer, k, n, rowB, colB int, transposed bool) {
	step := k
	if !transposed && rowB >= 4096 {
		step = packRowsAtOnce
	}
	for l := 0; l < k; l += step {
		t.packPart(to, unsafe.Add(b, l*rowB), l, min(step, k-l), k, n, rowB, colB, transposed)
	}
}

// packPart copies rows of B, which starts with the first of them, to the rows from on of panels of k rows.
func (t *tiling) packPart(to, b unsafe.Pointer, from, rows, k, n, rowB, colB int, transposed bool) {
	vectors := (n + t.lanes - 1) >> t.shift
	w, wide, count := t.cut(vectors)
	for i := range count {
		if i == wide {
			w--
		}
		columns := min(w<<t.shift, n)
		tail := (columns - (w-1)<<t.shift) * t.size / 8
		bytes := w * t.lanes * t.size
		panel := (*float64)(unsafe.Add(to, from*bytes))
		switch {
		case transposed:
			t.turn(panel, (*float64)(b), rows, columns, colB, bytes)
		case t.lanes*t.size == 64:
			packRows512(panel, (*float64)(b), rows, rowB, w, tail)
		default:
			packRows256(panel, (*float64)(b), rows, rowB, w, tail)
		}
		if i == count-1 {
			return
		}
		to = unsafe.Add(to, bytes*k)
		b = unsafe.Add(b, columns*colB)
		n -= columns
	}
}
