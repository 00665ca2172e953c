//go:build !race

package block

import (
	"testing"

	"github.com/stretchr/testify/assert"
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
