package block

import (
	"rundle/internal/dense"
	"rundle/internal/task"
)

// runner carries the operands of a running plan to the tasks of the pool. The functions are bound once, so that a runner
// kept in a Scratch runs without allocating.
type runner[T dense.Scalar] struct {
	moves     []move
	plan      *ContractPlan
	dst, a, b []T

	doMove, doChain func(worker, i int)
}

func (r *runner[T]) release() { r.moves, r.plan, r.dst, r.a, r.b = nil, nil, nil, nil, nil }

func (r *runner[T]) permute(p *PermutePlan, dst, src []T, pool *task.Pool) {
	mustFit("permutation, source", p.In, src)
	mustFit("permutation, result", p.Out, dst)
	if r.doMove == nil {
		r.doMove = r.move
	}
	r.moves, r.dst, r.a = p.moves, dst, src
	pool.Do(len(p.moves), copyCost*float64(p.Out.Size), r.doMove)
	r.release()
	clearGaps(p.Out, dst)
}

func (r *runner[T]) move(_, i int) { runMove(&r.moves[i], r.dst, r.a) }

func (r *runner[T]) contract(p *ContractPlan, dst, a, b []T, pool *task.Pool) {
	if r.doChain == nil {
		r.doChain = r.chain
	}
	flops := p.flops
	if dense.IsComplex[T]() {
		flops *= 4
	}
	r.plan, r.dst, r.a, r.b = p, dst, a, b
	pool.Do(len(p.chains), flops, r.doChain)
	r.release()
	for _, i := range p.empty {
		x := &p.Out.Blocks[i]
		clear(dst[x.Offset : x.Offset+x.Len])
	}
	clearGaps(p.Out, dst)
}

func (r *runner[T]) chain(_, i int) {
	p := r.plan
	c := p.chains[i]
	var beta T
	for j := c.from; j < c.to; j++ {
		g := &p.gemms[j]
		dense.Gemm(p.opA, p.opB, g.m, g.n, g.k, 1, r.a[g.a:], g.lda, r.b[g.b:], g.ldb, beta, r.dst[g.c:], g.ldc)
		beta = 1
	}
}

// clearGaps zeroes what lies between the blocks of a slab.
func clearGaps[T dense.Scalar](s *Structure, data []T) {
	for i := range s.Blocks {
		end := s.Blocks[i].Offset + s.Blocks[i].Len
		clear(data[end:align(end)])
	}
}
