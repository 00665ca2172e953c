package mpo

import (
	"fmt"
	"slices"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// An environment is the contraction of all sites on one side of a bond with the MPO between bra and ket (Schollwoeck 2011,
// section 6). It is a rank-three tensor of total charge zero with q(bra) = q(ket) + q(MPO index) on both sides. Its axes are
//
//	left   (bra Out, MPO In, ket In)
//	right  (MPO In, ket In, bra Out)
//
// chosen so that each step of its growth is one GEMM a block pair.

// LeftEdge returns the environment left of the first site: one element, 1.
func LeftEdge[T dense.Scalar](o *Operator[T]) *block.Tensor[T] {
	unit := block.NewAxis(block.In, block.Sector{Dim: 1})
	s := block.NewStructure(o.Group, []block.Axis{unit.Reversed(), unit, unit}, block.Charge{})
	t := block.New[T](s)
	t.Block(0)[0] = dense.FromFloat[T](1)
	return t
}

// RightEdge returns the environment right of the last site: one element, 1, if the operator leads from the total charge
// ket to the total charge bra; otherwise the tensor has no blocks and every matrix element is zero.
func RightEdge[T dense.Scalar](o *Operator[T], bra, ket block.Charge) *block.Tensor[T] {
	one := func(f block.Flow, c block.Charge) block.Axis {
		return block.NewAxis(f, block.Sector{Charge: c, Dim: 1})
	}
	axes := []block.Axis{o.Bonds[len(o.Bonds)-1].Axis(block.In), one(block.In, ket), one(block.Out, bra)}
	t := block.New[T](block.NewStructure(o.Group, axes, block.Charge{}))
	if len(t.Blocks) > 0 {
		t.Block(0)[0] = dense.FromFloat[T](1)
	}
	return t
}

// GrowLeft returns the left environment one site to the right of env: env, the site tensors bra and ket (axes left In,
// site In, right Out) and the MPO of the site.
func GrowLeft[T dense.Scalar](o *Operator[T], site int, env, bra, ket *block.Tensor[T], ws *Workspace[T], pool *task.Pool) *block.Tensor[T] {
	g := NewPlanner(o).Left(site, env.Structure, bra.Structure, ket.Structure)
	out := block.New[T](g.Out)
	g.Run(out, env, bra, ket, ws, pool)
	return out
}

// GrowRight returns the right environment one site to the left of env.
func GrowRight[T dense.Scalar](o *Operator[T], site int, env, bra, ket *block.Tensor[T], ws *Workspace[T], pool *task.Pool) *block.Tensor[T] {
	g := NewPlanner(o).Right(site, env.Structure, bra.Structure, ket.Structure)
	out := block.New[T](g.Out)
	g.Run(out, env, bra, ket, ws, pool)
	return out
}

// mustMeet panics unless an environment fits the bonds that it stands on.
func mustMeet(side string, site int, env, want []block.Axis) {
	if !slices.EqualFunc(env, want, block.Axis.Equal) {
		panic(fmt.Sprintf("mpo: %s environment with the axes %v at site %d; the sites have %v", side, env, site, want))
	}
}
