//go:build !race

package krylov

import (
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"

	"rundle/internal/dense"
)

// The race detector allocates on its own.
func TestWorkspaceIsReused(t *testing.T) {
	rng := rand.New(rand.NewPCG(17, 18))
	p := newProblem[float64](t, rng, uniform(rng, 40))
	start := make([]float64, p.n)
	dense.Random(rng, start)
	x := make([]float64, p.n)
	var w Workspace[float64]
	call := func() { copy(x, start); Lowest(p.apply, x, nil, Options{MaxVectors: 10}, &w) }
	call()
	want := append([]float64(nil), x...)
	assert.LessOrEqual(t, testing.AllocsPerRun(10, call), 2.0, "one for the bound method, none for vectors")
	assert.Equal(t, want, x, "the same call twice must give the same bits")
}
