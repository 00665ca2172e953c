//go:build !race

package task

import (
	"testing"

	"github.com/stretchr/testify/assert"
)

// The race detector drops recycled memory at random.
func TestDoAllocatesNothing(t *testing.T) {
	var sums [4 * 8]int
	run := func(worker, i int) { sums[8*worker] += i }
	for threads := 1; threads <= 4; threads++ {
		p := New(threads)
		p.Do(100, large, run)
		assert.Zero(t, testing.AllocsPerRun(50, func() { p.Do(100, large, run) }), "threads=%d", threads)
	}
}
