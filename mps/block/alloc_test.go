//go:build !race

package block

import (
	"runtime"
	"testing"

	"github.com/stretchr/testify/assert"

	"rundle/internal/dense"
)

// Under the race detector sync.Pool, which the dense kernels use, drops objects at random; hence the build tag.

func TestRunDoesNotAllocate(t *testing.T) {
	g := mustGroup(t, 0)
	l, s := bellAxis(In, -3, 3, 40), NewAxis(In, Sector{Charge{-1}, 1}, Sector{Charge{1}, 1})
	for name, layout := range map[string][2][]int{"direct": {{2}, {0}}, "permuted": {{1}, {1}}} {
		a := Random[float64](NewStructure(g, []Axis{l, s, l.Reversed()}, Charge{}), fixed(1))
		b := Random[float64](NewStructure(g, []Axis{l, s.Reversed(), l.Reversed()}, Charge{}), fixed(2))
		p := PlanContract(a.Structure, b.Structure, layout[0], layout[1])
		out := New[float64](p.Out)
		var ws Scratch[float64]
		RunContract(p, out.Data, a.Data, b.Data, &ws, nil)
		assert.Zero(t, testing.AllocsPerRun(10, func() { RunContract(p, out.Data, a.Data, b.Data, &ws, nil) }), name)
	}
}

// TestWorkspaceKeepsMemory measures what the second decomposition of a tensor allocates: its results and its plans.
func TestWorkspaceKeepsMemory(t *testing.T) {
	if kernels, _ := dense.Kernels(); kernels == "netlib" {
		t.Skip("LAPACK's scratch memory is allocated by call")
	}
	x := typicalTheta[float64](t, 300)
	var ws Workspace[float64]
	size := 0
	run := func() {
		u, _, v, err := SVD(x, 2, Cut{Bond: 300}, &ws, nil)
		assert.NoError(t, err)
		q, r, err := QR(x, 2, &ws, nil)
		assert.NoError(t, err)
		size = 8 * (u.Size + v.Size + q.Size + r.Size)
	}
	run()
	const runs, plans = 10, 150e3 // bytes
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	for range runs {
		run()
	}
	runtime.ReadMemStats(&after)
	assert.Less(t, float64(after.TotalAlloc-before.TotalAlloc)/runs, 1.5*float64(size)+plans)
	t.Logf("%d bytes a run, %d of them results", (after.TotalAlloc-before.TotalAlloc)/runs, size)
}
