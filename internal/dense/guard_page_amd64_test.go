//go:build linux && amd64 && !purego

package dense

import "testing"

// TestBlocksStayInside does the same with every B packed.
func TestBlocksStayInside(t *testing.T) {
	set(t, &inPlaceBytes, -1)
	set(t, &inPlaceRows, -1)
	TestGemmStaysInside(t)
}
