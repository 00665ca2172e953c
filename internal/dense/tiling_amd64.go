//go:build amd64 && !purego

package dense

// tiling is a family of kernels, the shape of their tiles, and the sizes by which runTiles chooses its way. BenchmarkWays sets these
// anew; the numbers are from a Zen 5 core (48 KiB, 1 MiB, 32 MiB of cache), where most of them have a wide optimum.
type tiling struct {
	size         int // bytes of an element
	lanes, shift int // elements of a vector, 1 << shift

	tile          tileKernel // one vector wide
	rows, vectors int        // of the largest tile
	depth         int        // of a block of A and B
	height        int        // of a block of A: with the depth, a quarter of the second-level cache
	width         int        // of a block of B, a multiple of a tile's

	dots                dotsKernel // for one column
	dotRows, dotColumns int        // of the largest tile of these
	dotHeight           int        // rows up to which dots kernels may serve more columns,
	dotWeight           int        // and how many steps along k an element's sum over lanes costs
	turnedFrom          int        // m·k from which they are worth a copy of B for few columns

	crowdedRows  int // of C up to which a B whose rows crowd the caches, a page or more apart, is read where it lies
	turnedStride int // of a transposed A from which a copy is worth it if it crowds the cache
}

var (
	real512 = tiling{
		size: 8, lanes: 8, shift: 3, tile: tileReal512, rows: 8, vectors: 3, depth: 256, height: 128, width: 504,
		dots: dotsReal512, dotRows: 4, dotColumns: 4, dotHeight: 32, dotWeight: 4, turnedFrom: 512, turnedStride: 1 << 62, crowdedRows: 32,
	}
	complex512 = tiling{
		size: 16, lanes: 4, shift: 2, tile: tileComplex512, rows: 4, vectors: 3, depth: 128, height: 128, width: 252,
		dots: dotsComplex512, dotRows: 4, dotColumns: 2, dotHeight: 32, dotWeight: 8, turnedFrom: 512, turnedStride: 1 << 14, crowdedRows: 32,
	}
	real256 = tiling{
		size: 8, lanes: 4, shift: 2, tile: tileReal256, rows: 4, vectors: 3, depth: 256, height: 128, width: 504,
		dots: dotsReal256, dotRows: 2, dotColumns: 4, dotHeight: 32, dotWeight: 2, turnedFrom: 2048, crowdedRows: 12,
	}
	complex256 = tiling{
		size: 16, lanes: 2, shift: 1, tile: tileComplex256, rows: 3, vectors: 2, depth: 128, height: 128, width: 252,
		dots: dotsComplex256, dotRows: 2, dotColumns: 2, dotHeight: 16, dotWeight: 4, turnedFrom: 2048, crowdedRows: 9,
	}
)

// tilingOf returns the tiling in use for numbers of that size.
func tilingOf(size int) *tiling {
	if kernels == avx512Kernels {
		if size == 8 {
			return &real512
		}
		return &complex512
	}
	if size == 8 {
		return &real256
	}
	return &complex256
}

// tileKernel numbers the kernels; those of a family follow each other by width.
type tileKernel byte

const (
	tileReal512    tileKernel = 0
	tileComplex512 tileKernel = 3
	tileReal256    tileKernel = 6
	tileComplex256 tileKernel = 9
)

// dotsKernel numbers the dots kernels; those of a family follow each other by columns.
type dotsKernel byte

const (
	dotsReal512    dotsKernel = 0
	dotsComplex512 dotsKernel = 4
	dotsReal256    dotsKernel = 6
	dotsComplex256 dotsKernel = 10
)

// runTile calls the kernel that is so many vectors wide. Direct calls keep the argument on the stack.
func (t *tiling) runTile(p *tileCall, vectors int) {
	switch t.tile + tileKernel(vectors-1) {
	case tileReal512:
		tileReal512x1(p)
	case tileReal512 + 1:
		tileReal512x2(p)
	case tileReal512 + 2:
		tileReal512x3(p)
	case tileComplex512:
		tileComplex512x1(p)
	case tileComplex512 + 1:
		tileComplex512x2(p)
	case tileComplex512 + 2:
		tileComplex512x3(p)
	case tileReal256:
		tileReal256x1(p)
	case tileReal256 + 1:
		tileReal256x2(p)
	case tileReal256 + 2:
		tileReal256x3(p)
	case tileComplex256:
		tileComplex256x1(p)
	case tileComplex256 + 1:
		tileComplex256x2(p)
	}
}

// runDots calls the kernel for so many columns.
func (t *tiling) runDots(p *tileCall, columns int) {
	switch t.dots + dotsKernel(columns-1) {
	case dotsReal512:
		dotsReal512x1(p)
	case dotsReal512 + 1:
		dotsReal512x2(p)
	case dotsReal512 + 2:
		dotsReal512x3(p)
	case dotsReal512 + 3:
		dotsReal512x4(p)
	case dotsComplex512:
		dotsComplex512x1(p)
	case dotsComplex512 + 1:
		dotsComplex512x2(p)
	case dotsReal256:
		dotsReal256x1(p)
	case dotsReal256 + 1:
		dotsReal256x2(p)
	case dotsReal256 + 2:
		dotsReal256x3(p)
	case dotsReal256 + 3:
		dotsReal256x4(p)
	case dotsComplex256:
		dotsComplex256x1(p)
	case dotsComplex256 + 1:
		dotsComplex256x2(p)
	}
}

// turn writes the transpose of rows of k elements, ld bytes apart, to k rows of width bytes.
func (t *tiling) turn(to, from *float64, k, rows, ld, width int) {
	switch t.tile {
	case tileReal512:
		packColumnsReal512(to, from, k, ld, rows, width)
	case tileComplex512:
		packColumnsComplex512(to, from, k, ld, rows, width)
	case tileReal256:
		packColumnsReal256(to, from, k, ld, rows, width)
	case tileComplex256:
		packColumnsComplex256(to, from, k, ld, rows, width)
	}
}
