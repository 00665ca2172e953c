package mpo

import (
	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// Projected is the Hamiltonian projected on one or two neighbouring sites between a left and a right environment: the effective
// Hamiltonian of DMRG (Schollwoeck 2011, section 6.3), planned once for a structure and applied many times. It acts on slabs
// of tensors with axes (l In, s1 In[, s2 In], r Out) and total charge zero.
type Projected[T dense.Scalar] struct {
	Theta       *block.Structure
	left, right *block.Tensor[T]
	plan        *projection[T]
	mixed       [2][]T // the mixtures of the left and of the right

	planner *Planner[T]
	first   int // site
}

// Project plans the Hamiltonian on sites first..first+count-1 (count 1 or 2) for the tensor structure theta.
func Project[T dense.Scalar](o *Operator[T], first, count int, left, right *block.Tensor[T], theta *block.Structure) *Projected[T] {
	return NewPlanner(o).Project(first, count, left, right, theta)
}

// Project plans the Hamiltonian on sites first..first+count-1 (count 1 or 2) for the tensor structure theta. The environments must keep their
// elements as long as the result is used.
func (p *Planner[T]) Project(first, count int, left, right *block.Tensor[T], theta *block.Structure) *Projected[T] {
	w := p.site(first)
	if count == 2 {
		w = p.pair(first)
	}
	t := asKet(theta)
	mustMeet("left", first, left.Axes, []block.Axis{t.left().Reversed(), w.wl, t.left()})
	mustMeet("right", first+count-1, right.Axes, []block.Axis{w.wr, t.right().Reversed(), t.right()})
	vacant, done := placeOf(w.wl, p.op.Bonds[first].Vacant), placeOf(w.wr, p.op.Bonds[first+count].Done)
	if !isIdentity(left, true, vacant) {
		vacant = nowhere
	}
	if !isIdentity(right, false, done) {
		done = nowhere
	}
	key := projectionKey{theta, left.Structure, right.Structure, vacant, done}
	h := &Projected[T]{Theta: theta, left: left, right: right, planner: p, first: first, plan: p.projection(first, w, key)}
	for i, m := range []*mixtures[T]{h.plan.lefts, h.plan.rights} {
		h.mixed[i], p.spare[i] = grow(p.spare[i], m.size), nil
		m.fill(h.mixed[i], []*block.Tensor[T]{left, right}[i].Data)
	}
	return h
}

// Sites returns the first site that h acts on, and their number.
func (h *Projected[T]) Sites() (first, count int) { return h.first, len(h.Theta.Axes) - 2 }

// Release gives the memory of h back to its planner; h must not be used any more. Without it the collector does so.
func (h *Projected[T]) Release() {
	for i := range h.mixed {
		if cap(h.mixed[i]) > cap(h.planner.spare[i]) {
			h.planner.spare[i] = h.mixed[i]
		}
		h.mixed[i] = nil
	}
	h.plan = nil
}

// placeOf returns the place of an index of an axis; nowhere if it is negative.
func placeOf(a block.Axis, index int) place {
	for i, s := range a.Sectors {
		if index >= 0 && index < s.Dim {
			return place{i, index}
		}
		index -= s.Dim
	}
	return nowhere
}

// Flops returns the operations of the matrix products of one application, in the arithmetic of T.
func (h *Projected[T]) Flops() float64 { return h.plan.flops }

// Apply sets dst = H src on slabs of the structure Theta.
func (h *Projected[T]) Apply(dst, src []T, ws *Workspace[T], pool *task.Pool) {
	r := &ws.run
	r.bind()
	r.plan = h.plan
	r.slabs = [operands][]T{theta: src, leftEnvironment: h.left.Data, leftMixed: h.mixed[0], rightEnvironment: h.right.Data, rightMixed: h.mixed[1]}
	r.dst = dst
	r.scratch = ws.spaces(pool.Threads(), h.plan.scratch)
	clearGaps(h.Theta, dst)
	pool.Do(len(h.plan.chains), h.plan.chainFlops, r.onChain)
	pool.Do(len(h.plan.bands), h.plan.bandFlops, r.onBand)
	r.plan, r.slabs, r.dst, r.scratch = nil, [operands][]T{}, nil, nil
}

// projectionRun carries a running plan to the tasks of the pool. The functions are bound once, so that nothing is allocated.
type projectionRun[T dense.Scalar] struct {
	plan    *projection[T]
	slabs   [operands][]T
	dst     []T
	scratch [][]T // by worker

	onChain, onBand func(worker, i int)
}

func (r *projectionRun[T]) bind() {
	if r.onChain == nil {
		r.onChain, r.onBand = r.chain, r.band
	}
}

func (r *projectionRun[T]) chain(_, i int) {
	c := &r.plan.chains[i]
	if c.from == c.to {
		for j := range c.rows {
			clear(r.dst[c.at+j*c.ld:][:c.cols])
		}
	}
	for j := c.from; j < c.to; j++ {
		g := &r.plan.products[j]
		g.run(r.slabs[g.fromA], r.slabs[g.fromB], r.dst)
	}
	for j := c.movesFrom; j < c.movesTo; j++ {
		move(&r.plan.moves[j], r.slabs[theta], r.dst)
	}
}

func (r *projectionRun[T]) band(worker, i int) {
	slabs := r.slabs
	r.plan.run(&r.plan.bands[i], &slabs, r.scratch[worker], r.dst)
}
