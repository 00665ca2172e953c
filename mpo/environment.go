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

// Growth is the planned step of an environment across one site. A plan may be run as long as the structures of all
// that enters stay the same.
type Growth[T dense.Scalar] struct {
	Out  *block.Structure
	net  network[T]
	left bool
}

// Flops returns the operations of one run.
func (g *Growth[T]) Flops() float64 { return g.net.flops() }

// Run overwrites out.Data (of structure g.Out) with the environment one site further on.
func (g *Growth[T]) Run(out, env, bra, ket *block.Tensor[T], ws *Workspace[T], pool *task.Pool) {
	if len(out.Data) != g.Out.Size {
		panic(fmt.Sprintf("mpo: environment slab of %d elements where the plan has %d", len(out.Data), g.Out.Size))
	}
	if g.left {
		g.net.run(out.Data, env.Data, ket.Data, bra.Data, nil, ws, pool)
	} else {
		g.net.run(out.Data, ket.Data, env.Data, nil, bra.Data, ws, pool)
	}
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

// Left plans the growth of a left environment: out(r', w, r) = sum conj(bra(l', s', r')) W(a, w; s', s) env(l', a, l) ket(l, s, r).
func (p *Planner[T]) Left(site int, env, bra, ket *block.Structure) *Growth[T] {
	w := p.site(site)
	mustMeet("left", site, env.Axes, []block.Axis{bra.Axes[0].Reversed(), w.wl, ket.Axes[0]})
	out := block.NewStructure(w.group, []block.Axis{bra.Axes[2], w.wr, ket.Axes[2].Reversed()}, block.Charge{})
	g := &Growth[T]{Out: out, left: true}
	var x, y slab
	source := newLeftSource(&g.net, w, env, asKet(ket), &x)
	// For each result block the bra blocks that end in r', rows (l', s') of y, columns (w, r).
	byRight := blocksByAxis(bra, 2)
	for i := range out.Blocks {
		ob := &out.Blocks[i]
		to, v, r := ob.Sectors[0], ob.Sectors[1], ob.Sectors[2]
		cols := ob.Shape[1] * ob.Shape[2]
		for _, b := range byRight[to] {
			bb := &bra.Blocks[b]
			if !source.moves(&g.net, bb.Sectors[0], v, bb.Sectors[1], r) {
				continue
			}
			rows := bb.Shape[0] * bb.Shape[1]
			at := g.net.piece(&y, rows*cols)
			g.net.chained(gemmTask{a: bb.Offset, b: at, c: ob.Offset, m: bb.Shape[2], n: cols, k: rows,
				lda: bb.Shape[2], ldb: cols, ldc: cols, opA: dense.ConjTrans})
		}
		g.net.endChain()
	}
	g.net.seal(x, y)
	return g
}

// Right plans the growth of a right environment: out(a, l, l') = sum W(a, w; s', s) ket(l, s, r) env(w, r, r') conj(bra(l', s', r')).
func (p *Planner[T]) Right(site int, env, bra, ket *block.Structure) *Growth[T] {
	w := p.site(site)
	mustMeet("right", site, env.Axes, []block.Axis{w.wr, ket.Axes[2].Reversed(), bra.Axes[2]})
	out := block.NewStructure(w.group, []block.Axis{w.wl, ket.Axes[0], bra.Axes[0].Reversed()}, block.Charge{})
	g := &Growth[T]{Out: out}
	var x, y slab
	source := newRightSource(&g.net, w, env, asKet(ket), &x)
	down := steps(w.group, bra.Axes[2], -1, w.wr, ket.Axes[2])
	byLeft := blocksByAxis(bra, 0)
	for i := range out.Blocks {
		ob := &out.Blocks[i]
		a, l, to := ob.Sectors[0], ob.Sectors[1], ob.Sectors[2]
		rows := ob.Shape[0] * ob.Shape[1]
		for _, b := range byLeft[to] {
			bb := &bra.Blocks[b]
			if !source.moves(&g.net, down, a, bb.Sectors[1], l, bb.Sectors[2]) {
				continue
			}
			cols := bb.Shape[1] * bb.Shape[2]
			at := g.net.piece(&y, rows*cols)
			g.net.chained(gemmTask{a: at, b: bb.Offset, c: ob.Offset, m: rows, n: bb.Shape[0], k: cols,
				lda: cols, ldb: cols, ldc: bb.Shape[0], opB: dense.ConjTrans})
		}
		g.net.endChain()
	}
	g.net.seal(x, y)
	return g
}

// mustMeet panics unless an environment fits the bonds that it stands on.
func mustMeet(side string, site int, env, want []block.Axis) {
	if !slices.EqualFunc(env, want, block.Axis.Equal) {
		panic(fmt.Sprintf("mpo: %s environment with the axes %v at site %d; the sites have %v", side, env, site, want))
	}
}

// blocksByAxis lists the blocks of a structure by their sector on one axis.
func blocksByAxis(s *block.Structure, axis int) [][]int {
	by := make([][]int, len(s.Axes[axis].Sectors))
	for i := range s.Blocks {
		q := s.Blocks[i].Sectors[axis]
		by[q] = append(by[q], i)
	}
	return by
}
