//go:build amd64 && !purego

package dense

import (
	"sync"
	"unsafe"
)

// tiling is the shape of a family of kernels and of the blocks that they are fed.
type tiling struct {
	first       tileKernel // the kernel one vector wide
	size        int        // bytes of an element
	lanes       int        // elements of a vector: 1 << shift
	shift       int
	rows        int // of the largest tile
	vectors     int // of the largest tile
	depth       int // of a block of A and B
	height      int // of a block of A
	width       int // of a block of B
	complexPack bool
}

// tileKernel numbers the kernels; those of a family follow each other by width.
type tileKernel byte

const (
	kernelReal512 tileKernel = iota
	_
	_
	kernelComplex512
	_
	_
	kernelReal256
	_
	_
	kernelComplex256
	_
)

// Blocks. BenchmarkBlocks sets them anew. Widths are multiples of a tile's.
var (
	real512    = tiling{first: kernelReal512, size: 8, lanes: 8, shift: 3, rows: 8, vectors: 3, depth: 256, height: 128, width: 504}
	complex512 = tiling{first: kernelComplex512, size: 16, lanes: 4, shift: 2, rows: 4, vectors: 3, depth: 256, height: 128, width: 252, complexPack: true}
	real256    = tiling{first: kernelReal256, size: 8, lanes: 4, shift: 2, rows: 4, vectors: 3, depth: 256, height: 128, width: 504}
	complex256 = tiling{first: kernelComplex256, size: 16, lanes: 2, shift: 1, rows: 3, vectors: 2, depth: 256, height: 128, width: 252, complexPack: true}
)

// run calls the kernel that is so many vectors wide. Direct calls keep the argument on the stack.
func (t *tiling) run(p *tileCall, vectors int) {
	switch t.first + tileKernel(vectors-1) {
	case kernelReal512:
		tileReal512x1(p)
	case kernelReal512 + 1:
		tileReal512x2(p)
	case kernelReal512 + 2:
		tileReal512x3(p)
	case kernelComplex512:
		tileComplex512x1(p)
	case kernelComplex512 + 1:
		tileComplex512x2(p)
	case kernelComplex512 + 2:
		tileComplex512x3(p)
	case kernelReal256:
		tileReal256x1(p)
	case kernelReal256 + 1:
		tileReal256x2(p)
	case kernelReal256 + 2:
		tileReal256x3(p)
	case kernelComplex256:
		tileComplex256x1(p)
	case kernelComplex256 + 1:
		tileComplex256x2(p)
	}
}

// tiledReal is Gemm by assembly kernels; no size is zero.
func tiledReal(set kernelSet, opA, opB Op, m, n, k int, alpha float64, a []float64, lda int, b []float64, ldb int, beta float64, c []float64, ldc int) {
	t := &real512
	if set == avx2Kernels {
		t = &real256
	}
	var p tileCall
	p.weight[0] = alpha
	if beta != 0 {
		p.add = 1
		scaleRows(m, n, beta, c, ldc)
	}
	t.multiply(&p, opA, opB, m, n, k, unsafe.Pointer(&a[0]), lda, unsafe.Pointer(&b[0]), ldb, unsafe.Pointer(&c[0]), ldc)
}

// tiledComplex is tiledReal for complex128.
func tiledComplex(set kernelSet, opA, opB Op, m, n, k int, alpha complex128, a []complex128, lda int, b []complex128, ldb int, beta complex128, c []complex128, ldc int) {
	t := &complex512
	if set == avx2Kernels {
		t = &complex256
	}
	var p tileCall
	if beta != 0 {
		p.add = 1
		scaleRows(m, n, beta, c, ldc)
	}
	switch {
	case !opA.conjugates() && !opB.conjugates():
		p.weight, p.cross = [2]float64{1, 1}, [2]float64{-1, 1}
	case !opB.conjugates():
		p.weight, p.cross = [2]float64{1, 1}, [2]float64{1, -1}
	case !opA.conjugates():
		p.weight, p.cross = [2]float64{1, -1}, [2]float64{1, 1}
	default:
		p.weight, p.cross = [2]float64{1, -1}, [2]float64{-1, -1}
	}
	re, im := real(alpha), imag(alpha)
	if im == 0 {
		for i := range 2 {
			p.weight[i] *= re
			p.cross[i] *= re
		}
	} else {
		p.turn = 1
		p.alphaReal, p.alphaImag = [2]float64{re, re}, [2]float64{-im, im}
	}
	t.multiply(&p, opA, opB, m, n, k, unsafe.Pointer(&a[0]), lda, unsafe.Pointer(&b[0]), ldb, unsafe.Pointer(&c[0]), ldc)
}

// Limits below which B is read where it is: bytes of B, rows of C.
var (
	inPlaceBytes = 64 << 10
	inPlaceRows  = 8
)

// multiply runs the blocks. B is copied into panels as wide as a tile if it is transposed, or so large that its rows are far apart and
// read often; A is read in place.
func (t *tiling) multiply(p *tileCall, opA, opB Op, m, n, k int, a unsafe.Pointer, lda int, b unsafe.Pointer, ldb int, c unsafe.Pointer, ldc int) {
	rowA, colA := opA.strides(lda)
	p.rowA, p.colA, p.rowC = rowA*t.size, colA*t.size, ldc*t.size
	rowB, colB := opB.strides(ldb)
	rowB *= t.size
	colB *= t.size
	if !opB.transposes() && (n*k*t.size <= inPlaceBytes || m <= inPlaceRows) && m <= t.height && k <= t.depth {
		p.k, p.rowB = k, rowB
		p.a = (*float64)(a)
		t.split(p, m)
		t.panels(p, n, b, c, false)
		return
	}
	t.blocks(p, opB.transposes(), m, n, k, a, b, rowB, colB, c)
}

func (t *tiling) blocks(p *tileCall, transposed bool, m, n, k int, a, b unsafe.Pointer, rowB, colB int, c unsafe.Pointer) {
	depth, width, height := even(k, t.depth, 1), even(n, t.width, t.lanes*t.vectors), even(m, t.height, t.rows)
	buffer := packPool.Get().(*packBuffer)
	packed := buffer.room(depth * (width + t.lanes) * t.size / 8)
	add := p.add
	for j := 0; j < n; j += width {
		nn := min(width, n-j)
		p.add = add
		for l := 0; l < k; l += depth {
			p.k = min(depth, k-l)
			t.pack(packed, unsafe.Add(b, l*rowB+j*colB), p.k, nn, rowB, colB, transposed)
			for i := 0; i < m; i += height {
				p.a = (*float64)(unsafe.Add(a, i*p.rowA+l*p.colA))
				t.split(p, min(height, m-i))
				t.panels(p, nn, packed, unsafe.Add(c, i*p.rowC+j*t.size), true)
			}
			p.add = 1
		}
	}
	packPool.Put(buffer)
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

// split cuts m rows into blocks that differ by one row at most.
func (t *tiling) split(p *tileCall, m int) {
	if m <= t.rows {
		p.rows, p.blocks, p.rest = m, 1, 0
		return
	}
	count := int(uint32(m+t.rows-1) / uint32(t.rows))
	p.rows = int(uint32(m+count-1) / uint32(count))
	p.blocks = m - count*(p.rows-1)
	p.rest = count - p.blocks
}

// panels runs over the columns of a block of B, in panels that differ by one vector at most.
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
			b = unsafe.Add(b, bytes*p.k)
		} else {
			b = unsafe.Add(b, bytes)
		}
		c = unsafe.Add(c, bytes)
		t.run(p, w)
	}
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

// pack copies a block of B, or of its transpose, into panels.
func (t *tiling) pack(to, b unsafe.Pointer, k, n, rowB, colB int, transposed bool) {
	vectors := (n + t.lanes - 1) >> t.shift
	w, wide, count := t.cut(vectors)
	avx512 := t.lanes*t.size == 64
	for i := range count {
		if i == wide {
			w--
		}
		cols := min(w<<t.shift, n)
		tail := cols - (w-1)<<t.shift
		bytes := w * t.lanes * t.size
		dst, src := (*float64)(to), (*float64)(b)
		switch {
		case !transposed && avx512:
			packRows512(dst, src, k, rowB, w, tail*t.size/8)
		case !transposed:
			packRows256(dst, src, k, rowB, w, tail*t.size/8)
		case avx512 && t.complexPack:
			packColumnsComplex512(dst, src, k, colB, cols, bytes)
		case avx512:
			packColumnsReal512(dst, src, k, colB, cols, bytes)
		case t.complexPack:
			packColumnsComplex256(dst, src, k, colB, cols, bytes)
		default:
			packColumnsReal256(dst, src, k, colB, cols, bytes)
		}
		to = unsafe.Add(to, bytes*k)
		b = unsafe.Add(b, cols*colB)
		n -= cols
	}
}

// packBuffer holds packed panels between calls.
type packBuffer struct{ data []float64 }

var packPool = sync.Pool{New: func() any { return new(packBuffer) }}

// room returns space for n numbers, aligned to a cache line.
func (b *packBuffer) room(n int) unsafe.Pointer {
	if len(b.data) < n+8 {
		b.data = make([]float64, max(2*len(b.data), n+8, 4096))
	}
	at := unsafe.Pointer(&b.data[0])
	if off := int(uintptr(at) & 63); off != 0 {
		at = unsafe.Add(at, 64-off)
	}
	return at
}
