//go:build amd64 && !purego

package dense

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
	"unsafe"

	"github.com/stretchr/testify/assert"
)

func allTilings() map[string]*tiling {
	out := map[string]*tiling{}
	if haveAVX2 {
		out["real 256"], out["complex 256"] = &real256, &complex256
	}
	if haveAVX512 {
		out["real 512"], out["complex 512"] = &real512, &complex512
	}
	return out
}

// TestBlocks runs all sizes through the packing code, cut into blocks so small that every loop turns more than once.
func TestBlocks(t *testing.T) {
	set(t, &inPlaceBytes, -1)
	set(t, &inPlaceRows, -1)
	for _, tiling := range allTilings() {
		set(t, &tiling.depth, 13)
		set(t, &tiling.width, 2*tiling.vectors*tiling.lanes)
		set(t, &tiling.height, 11)
		set(t, &tiling.dotHeight, 0)
		set(t, &tiling.crowdedRows, -1)
	}
	for _, kernels := range []kernelSet{avx2Kernels, avx512Kernels} {
		if kernels.available() {
			t.Run(kernels.String(), func(t *testing.T) {
				use(t, kernels)
				both(t, everySize[float64], everySize[complex128])
			})
		}
	}
}

// TestTurnedA: rows of a transposed A that lie a power of two apart are copied.
func TestTurnedA(t *testing.T) {
	for _, tiling := range allTilings() {
		set(t, &tiling.turnedStride, 0)
	}
	for _, kernels := range []kernelSet{avx2Kernels, avx512Kernels} {
		if kernels.available() {
			use(t, kernels)
			for seed := range uint64(8) { // the strides are random, 512 one time in four
				checkGemm[float64](t, Trans, Op(seed%4), 512, 66, 35, 1, float64(seed%2), seed)
				checkGemm[complex128](t, ConjTrans, Op(seed%4), 256, 66, 35, 1i, 0, seed)
			}
		}
	}
}

// set changes a variable until the test ends.
func set[V any](t *testing.T, p *V, to V) {
	saved := *p
	*p = to
	t.Cleanup(func() { *p = saved })
}

// TestPack compares the packed panels with the loops of their description, for every width and depth, in both directions, from rows near to each other and far apart.
func TestPack(t *testing.T) {
	for name, tiling := range allTilings() {
		t.Run(name, func(t *testing.T) {
			per := tiling.size / 8
			for n := 1; n <= 2*tiling.vectors*tiling.lanes+1; n++ {
				for k := 1; k <= 19; k++ {
					for _, transposed := range []bool{false, true} {
						checkPack(t, tiling, per, n, k, 3*per, transposed)
					}
				}
				for _, k := range []int{15, 16, 17, 33} { // rows a page apart
					checkPack(t, tiling, per, n, k, 512, false)
				}
			}
		})
	}
}

func checkPack(t *testing.T, g *tiling, per, n, k, pad int, transposed bool) {
	t.Helper()
	rng := rand.New(rand.NewPCG(uint64(n), uint64(k)))
	rows, cols := k, n
	if transposed {
		rows, cols = n, k
	}
	entries := make([]float64, rows*cols*per)
	Random(rng, entries)
	b := input(rows, cols*per, pad, 3, entries)
	vectors := (n + g.lanes - 1) / g.lanes
	out := newPadded[float64](1, vectors*g.lanes*per*k, 0, 5, -777.25)
	rowB, colB := 8*b.ld, g.size
	if transposed {
		rowB, colB = g.size, 8*b.ld
	}
	g.pack(unsafe.Pointer(&out.a[0]), unsafe.Pointer(&b.a[0]), k, n, rowB, colB, transposed)
	what := fmt.Sprintf("n=%d k=%d transposed=%v", n, k, transposed)
	out.checkGuards(t, what)
	at := 0
	w, wide, count := g.cut(vectors)
	for i, j := 0, 0; i < count; i++ {
		if i == wide {
			w--
		}
		for l := range k {
			for q := range w * g.lanes {
				for part := range per {
					want := 0.0
					if j+q < n {
						r, c := l, j+q
						if transposed {
							r, c = c, r
						}
						want = b.at(r, c*per+part)
					}
					if out.a[at] != want {
						t.Fatalf("%s: row %d column %d part %d is %v, want %v", what, l, j+q, part, out.a[at], want)
					}
					at++
				}
			}
		}
		j += w * g.lanes
	}
	assert.Equal(t, len(out.a), at)
}

// TestSplit: every size is cut into whole parts that differ by one.
func TestSplit(t *testing.T) {
	for _, g := range allTilings() {
		for m := 1; m <= 300; m++ {
			var p tileCall
			p.split(m, g.rows)
			assert.Equal(t, m, p.blocks*p.rows+p.rest*(p.rows-1))
			assert.True(t, p.rows >= 1 && p.rows <= g.rows && p.blocks >= 1 && p.rest >= 0 && (p.rest == 0 || p.rows > 1), "%d: %+v", m, p)
			w, wide, count := g.cut(m)
			assert.Equal(t, m, wide*w+(count-wide)*(w-1))
			assert.True(t, w >= 1 && w <= g.vectors && wide >= 1 && (wide == count || w > 1), "%d: %d %d %d", m, w, wide, count)
		}
	}
}

// TestTilesAtNaN: what lies beyond a cut vector is not multiplied either, as a NaN there would show, and a NaN inside stays in its row.
func TestTilesAtNaN(t *testing.T) {
	for _, set := range []kernelSet{avx2Kernels, avx512Kernels} {
		if !set.available() {
			continue
		}
		use(t, set)
		for n := 1; n <= 50; n++ {
			a, b, c := random[float64](n*n), random[float64](n*n), make([]float64, n*n)
			a[(n/2)*n] = math.NaN()
			Gemm(NoTrans, NoTrans, n, n, n, 1, a, n, b, n, 0, c, n)
			for i := range n {
				for j := range n {
					assert.Equal(t, i == n/2, math.IsNaN(c[i*n+j]), "n=%d C[%d,%d]", n, i, j)
				}
			}
		}
	}
}

// BenchmarkWays measures what the numbers of a tiling were set by.
func BenchmarkWays(b *testing.B) {
	saved, rows, bytes := real512, inPlaceRows, inPlaceBytes
	defer func() { real512, inPlaceRows, inPlaceBytes = saved, rows, bytes }()
	product := func(name string, opA, opB Op, m, n, k int) {
		b.Run(fmt.Sprintf("%s/ops=%v%v/m=%d/n=%d/k=%d", name, opA, opB, m, n, k), func(b *testing.B) {
			benchmarkProduct[float64](b, opA, opB, m, n, k)
		})
	}
	if !haveAVX512 {
		b.Skip("the benchmark is written for AVX-512")
	}
	for _, depth := range []int{128, 192, 256, 384, 512} {
		real512.depth = depth
		product(fmt.Sprintf("depth=%d", depth), NoTrans, NoTrans, 600, 600, 600)
	}
	real512 = saved
	for _, height := range []int{64, 128, 256} {
		real512.height = height
		product(fmt.Sprintf("height=%d", height), NoTrans, NoTrans, 600, 600, 600)
	}
	real512 = saved
	for _, width := range []int{240, 504, 1008} {
		real512.width = width
		product(fmt.Sprintf("width=%d", width), NoTrans, NoTrans, 600, 600, 600)
	}
	real512 = saved
	for _, n := range []int{64, 96, 128, 200} {
		for _, inPlaceBytes = range []int{0, 1 << 30} {
			product(fmt.Sprintf("inPlaceBytes=%d", inPlaceBytes), NoTrans, NoTrans, n, n, n)
		}
	}
	inPlaceBytes = bytes
	for _, m := range []int{8, 16, 32, 48, 64} {
		for _, inPlaceRows = range []int{0, 1 << 30} {
			product(fmt.Sprintf("inPlaceRows=%d", inPlaceRows), NoTrans, NoTrans, m, 500, 500)
		}
	}
	inPlaceRows = rows
	if kernels == avx512Kernels {
		kernels = avx2Kernels
		defer func(crowded int) { kernels, real256.crowdedRows = avx512Kernels, crowded }(real256.crowdedRows)
		for _, m := range []int{4, 8, 12, 16, 32} {
			for _, real256.crowdedRows = range []int{0, 32} {
				product(fmt.Sprintf("kernel=avx2/crowdedRows=%d", real256.crowdedRows), NoTrans, NoTrans, m, 512, 512)
			}
		}
		kernels = avx512Kernels
	}
	for _, k := range []int{4, 8, 16, 32, 64} {
		for _, m := range []int{4, 8, 16, 32} {
			for _, n := range []int{8, 32} {
				for _, real512.dotHeight = range []int{0, 1 << 30} {
					real512.dotWeight = 0
					product(fmt.Sprintf("dotHeight=%d", real512.dotHeight), NoTrans, Trans, m, n, k)
				}
			}
		}
	}
	real512 = saved
	for _, k := range []int{8, 16, 32, 64} {
		for _, m := range []int{4, 16, 64} {
			for _, real512.turnedFrom = range []int{0, 1 << 30} {
				product(fmt.Sprintf("turnedFrom=%d", real512.turnedFrom), NoTrans, NoTrans, m, 3, k)
			}
		}
	}
}
