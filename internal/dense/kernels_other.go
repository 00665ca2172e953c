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
