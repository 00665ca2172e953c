package mpo

import (
	"fmt"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// Growth is the planned step of an environment across one site. A plan may be run as long as the structures of all
// that enters stay the same, and where it takes environments for the identity, these are.
//
// It runs in bands, of columns of the result on the left, of rows on the right, that share nothing: no part of the result has two writers. A band
// goes through the sectors of the bra's bond next to the old environment and adds what each brings.
type Growth[T dense.Scalar] struct {
	Out *block.Structure

	lists[T]
	key      growthKey
	mixed    *mixtures[T]
	bands    []growthBand
	steps    []band // moves of none
	blanks   []blank
	units    []unitTask
	scratch  int // elements of the space of a band
	flops    float64
	bandWork float64
}

// growthKey is what a plan depends on, besides its site.
type growthKey struct {
	env, bra, ket *block.Structure
	left          bool
	same          place // where env is the identity and the result will be, too; nowhere: no such place
}

func (k *growthKey) equal(o *growthKey) bool {
	return k.left == o.left && k.same == o.same && k.env.Equal(o.env) && k.ket.Equal(o.ket) && k.bra.Equal(o.bra)
}

// growthBand is steps and the parts of the result that no step overwrites: blanks, and on these ones on a diagonal.
type growthBand struct{ steps, blanks, units span }

// blank is a matrix of zeros; unitTask n ones, step apart.
type (
	blank    struct{ at, rows, cols, ld int }
	unitTask struct{ at, n, step int }
)

// Flops returns the operations of the matrix products of one run, in the arithmetic of T.
func (g *Growth[T]) Flops() float64 { return g.flops }

func (g *Growth[T]) tasks() int { return g.lists.tasks() + len(g.steps) + len(g.blanks) + len(g.units) }

// Run overwrites out.Data (of structure g.Out) with the environment one site further on.
func (g *Growth[T]) Run(out, env, bra, ket *block.Tensor[T], ws *Workspace[T], pool *task.Pool) {
	if len(out.Data) != g.Out.Size {
		panic(fmt.Sprintf("mpo: environment slab of %d elements where the plan has %d", len(out.Data), g.Out.Size))
	}
	r := &ws.growth
	if r.onPart == nil {
		r.onPart, r.onBand = r.part, r.band
	}
	ws.mixed = grow(ws.mixed, g.mixed.size)
	r.plan, r.dst, r.scratch = g, out.Data, ws.spaces(pool.Threads(), g.scratch)
	r.slabs = [operands][]T{theta: ket.Data, braSite: bra.Data, leftEnvironment: env.Data, rightEnvironment: env.Data, leftMixed: ws.mixed, rightMixed: ws.mixed}
	pool.Do(len(g.mixed.parts), copyWeight*float64(g.mixed.size), r.onPart)
	clearGaps(g.Out, out.Data)
	pool.Do(len(g.bands), g.bandWork, r.onBand)
	r.plan, r.slabs, r.dst, r.scratch = nil, [operands][]T{}, nil, nil
}

// growthRun carries a running plan to the tasks of the pool.
type growthRun[T dense.Scalar] struct {
	plan    *Growth[T]
	slabs   [operands][]T
	dst     []T
	scratch [][]T // by worker

	onPart, onBand func(worker, i int)
}

func (r *growthRun[T]) part(_, i int) {
	r.plan.mixed.fillPart(i, r.slabs[leftMixed], r.slabs[leftEnvironment])
}

func (r *growthRun[T]) band(worker, i int) {
	b := &r.plan.bands[i]
	for _, z := range r.plan.blanks[b.blanks.from:b.blanks.to] {
		for k := range z.rows {
			clear(r.dst[z.at+k*z.ld:][:z.cols])
		}
	}
	for _, u := range r.plan.units[b.units.from:b.units.to] {
		for k := range u.n {
			r.dst[u.at+k*u.step] = 1
		}
	}
	slabs := r.slabs
	for j := b.steps.from; j < b.steps.to; j++ {
		r.plan.run(&r.plan.steps[j], &slabs, r.scratch[worker], r.dst)
	}
}

// Left plans the growth of a left environment: out(r', w, r) = sum conj(bra(l', s', r')) W(a, w; s', s) env(l', a, l) ket(l, s, r).
func (p *Planner[T]) Left(site int, env, bra, ket *block.Structure) *Growth[T] {
	return p.growth(site, growthKey{env, bra, ket, true, nowhere})
}

// Right plans the growth of a right environment: out(a, l, l') = sum W(a, w; s', s) ket(l, s, r) env(w, r, r') conj(bra(l', s', r')).
func (p *Planner[T]) Right(site int, env, bra, ket *block.Structure) *Growth[T] {
	return p.growth(site, growthKey{env, bra, ket, false, nowhere})
}

// LeftIsometry is Left across a left-canonical tensor, bra and ket the same. Where env is the identity for terms not begun, so is the result; it is
// written as such, without rounding. RightIsometry does so across a right-canonical tensor for terms that are done.
func (p *Planner[T]) LeftIsometry(site int, env *block.Tensor[T], a *block.Structure) *Growth[T] {
	same := placeOf(p.site(site).wl, p.op.Bonds[site].Vacant)
	if p.op.Bonds[site+1].Vacant < 0 || !isIdentity(env, true, same) {
		same = nowhere
	}
	return p.growth(site, growthKey{env.Structure, a, a, true, same})
}

func (p *Planner[T]) RightIsometry(site int, env *block.Tensor[T], a *block.Structure) *Growth[T] {
	same := placeOf(p.site(site).wr, p.op.Bonds[site+1].Done)
	if p.op.Bonds[site].Done < 0 || !isIdentity(env, false, same) {
		same = nowhere
	}
	return p.growth(site, growthKey{env.Structure, a, a, false, same})
}

// growth returns the plan of a step: the last one made there if it fits, a new one otherwise.
func (p *Planner[T]) growth(site int, key growthKey) *Growth[T] {
	w := p.site(site)
	at := 4 * site
	if key.same != nowhere {
		at += 2
	}
	if key.left {
		at++
		mustMeet("left", site, key.env.Axes, []block.Axis{key.bra.Axes[0].Reversed(), w.wl, key.ket.Axes[0]})
	} else {
		mustMeet("right", site, key.env.Axes, []block.Axis{w.wr, key.ket.Axes[2].Reversed(), key.bra.Axes[2]})
	}
	slot := &p.growths[at]
	if *slot != nil && (*slot).key.equal(&key) {
		return *slot
	}
	if *slot != nil {
		p.tasks -= (*slot).tasks()
		*slot = nil
	}
	plan := p.grown(site, w, key)
	if p.tasks+plan.tasks() <= planTasks {
		p.tasks += plan.tasks()
		*slot = plan
	}
	return plan
}
