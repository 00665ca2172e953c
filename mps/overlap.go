package mps

import (
	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// Overlap returns <a|b>, the sum of conj(a_s) b_s over all configurations. States of different charge have none. Chains on
// different sites panic.
func Overlap[T dense.Scalar](a, b *Chain[T], pool *task.Pool) T {
	mustFit("overlap", a, b)
	if a.Charge() != b.Charge() {
		return dense.FromFloat[T](0)
	}
	edge := block.NewAxis(block.In, block.Sector{Dim: 1})
	env := block.Identity[T](a.Group, edge) // axes: bond of a (In), bond of b (Out)
	exponent := 0
	var ws block.Scratch[T]
	for i := range a.Sites {
		x := multiply(env, b.Sites[i], []int{1}, []int{0}, &ws, pool)
		env = multiply(a.Sites[i].Conj(), x, []int{0, 1}, []int{0, 1}, &ws, pool)
		exponent += balance(env)
	}
	if len(env.Blocks) == 0 {
		return dense.FromFloat[T](0)
	}
	scaleBy(env, exponent)
	return env.Data[0]
}
