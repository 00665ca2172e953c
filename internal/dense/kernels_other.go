//go:build !amd64 || purego

package dense

// There is no assembly for this machine or in this build.
const (
	haveAVX512 = false
	haveAVX2   = false
)

const haveTiles = false

func runTiles(p *tileCall, size int, transA, transB bool, m, n, k, lda, ldb, ldc int) {
	panic("dense: built without assembly")
}

func dotRealTiles(x, y []float64) float64 { panic("dense: built without assembly") }

func dotComplexTiles(x, y []float64) complex128 { panic("dense: built without assembly") }

func axpyTiles(alpha complex128, x, y []float64) { panic("dense: built without assembly") }

func scaleTiles(alpha complex128, x []float64) { panic("dense: built without assembly") }

func largestTiles(x []float64) float64 { panic("dense: built without assembly") }
