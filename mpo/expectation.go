package mpo

import (
	"fmt"
	"math"
	"slices"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps"
	"rundle/mps/block"
)

// MatrixElement returns <bra|o|ket>; the states need not be normalized. It is zero unless o leads from the charge of ket to that
// of bra. Operators and states on different sites panic.
func MatrixElement[T dense.Scalar](bra, ket *mps.Chain[T], o *Operator[T], pool *task.Pool) T {
	mustAct("matrix element", o, bra)
	mustAct("matrix element", o, ket)
	if bra.Charge() != o.Group.Add(ket.Charge(), o.Charge()) {
		return dense.FromFloat[T](0)
	}
	var ws Workspace[T]
	env, scale := LeftEdge(o), 0
	for i := range o.Sites {
		env = GrowLeft(o, i, env, bra.Sites[i], ket.Sites[i], &ws, pool)
		scale += rescale(env)
	}
	return edgeValue(env, scale)
}

// Expectation returns <psi|o|psi>/<psi|psi>. It is not a number for a state of norm zero.
func Expectation[T dense.Scalar](psi *mps.Chain[T], o *Operator[T], pool *task.Pool) T {
	mustAct("expectation value", o, psi)
	if o.Charge() != (block.Charge{}) {
		return dense.FromFloat[T](0)
	}
	psi = normalized(psi, psi.Center, pool)
	return MatrixElement(psi, psi, o, pool)
}

// mustAct panics unless o acts on the sites of psi.
func mustAct[T dense.Scalar](what string, o *Operator[T], psi *mps.Chain[T]) {
	if o.Group != psi.Group || !slices.EqualFunc(o.Phys, psi.Axes(), block.Axis.Equal) {
		dims := make([]int, psi.Len())
		for i, a := range psi.Axes() {
			dims[i] = a.Dim()
		}
		panic(fmt.Sprintf("mpo: %s of an operator over %v with local dimensions %v in a state over %v with %v",
			what, o.Group, o.dims(), psi.Group, dims))
	}
}

// normalized returns psi over its norm with the centre at the given site (-1: at any). It shares tensors with psi.
func normalized[T dense.Scalar](psi *mps.Chain[T], center int, pool *task.Pool) *mps.Chain[T] {
	c := &mps.Chain[T]{Group: psi.Group, Sites: slices.Clone(psi.Sites), Center: psi.Center}
	c.MoveCenter(max(center, 0), pool) // replaces the tensors that it changes
	c.Sites[c.Center] = c.Sites[c.Center].Clone()
	if c.Normalize() == 0 {
		c.Sites[c.Center].Scale(dense.FromFloat[T](math.NaN()))
	}
	return c
}

// rescale divides a tensor by the power of two that brings its largest element near one, and returns the exponent.
func rescale[T dense.Scalar](t *block.Tensor[T]) int {
	top := 0.0
	for _, x := range t.Data {
		top = max(top, dense.Abs(x))
	}
	if top == 0 || math.IsInf(top, 0) || math.IsNaN(top) {
		return 0
	}
	_, e := math.Frexp(top)
	for i := range t.Data {
		t.Data[i] = ldexp(t.Data[i], -e)
	}
	return e
}

// edgeValue reads the only element of an environment behind the last site (before the first), times 2^scale.
func edgeValue[T dense.Scalar](env *block.Tensor[T], scale int) T {
	if len(env.Blocks) == 0 {
		return dense.FromFloat[T](0)
	}
	return ldexp(env.Block(0)[0], scale)
}
