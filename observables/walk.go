package observables

import (
	"context"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// walk is one pass over the sites.
type walk[T dense.Scalar] struct {
	ctx     context.Context
	pool    *task.Pool
	forest  *forest[T]
	active  []live[T]
	scratch []block.Scratch[T] // one a worker
}

// live is a beginning of strings with its environment E, waiting for the next site: axes (bra In, ket Out), its total charge what the
// operators so far add.
type live[T dense.Scalar] struct {
	node *node[T]
	env  *block.Tensor[T]
}

// contribution is the value of a string, with its weight, to a result.
type contribution struct {
	result int
	value  complex128
}

// job goes on with one node: from an environment, or from the centre where the node begins a string.
type job[T dense.Scalar] struct {
	node *node[T]
	from *block.Tensor[T] // nil: a beginning
}

// step applies the operators of one site. Strings that end there give their values, all others new environments.
func (w *walk[T]) step(site int, b, center *block.Tensor[T]) ([]contribution, error) {
	var jobs []job[T]
	for _, a := range w.active {
		for _, n := range a.node.children {
			jobs = append(jobs, job[T]{n, a.env})
		}
	}
	for _, n := range w.forest.starts[site] {
		jobs = append(jobs, job[T]{node: n})
	}
	here := newStand(w.forest, b)
	begin := newStand(w.forest, center)
	var flops float64
	for _, j := range jobs {
		if j.from == nil {
			begin.prepare(j)
		} else {
			here.prepare(j)
		}
		if len(j.node.children) > 0 {
			flops += stepFlops(b)
		}
	}
	next := make([]*block.Tensor[T], len(jobs))
	values := make([]complex128, len(jobs))
	w.pool.Do(len(jobs), flops, func(worker, i int) {
		if w.ctx.Err() != nil {
			return
		}
		j := jobs[i]
		at := here
		if j.from == nil {
			at = begin
		}
		if len(j.node.ends) > 0 {
			values[i] = dense.ToComplex(at.close(j))
		}
		if len(j.node.children) > 0 {
			next[i] = at.goOn(j, &w.scratch[worker])
		}
	})
	if err := w.ctx.Err(); err != nil {
		return nil, err
	}
	w.active = nil
	var all []contribution
	for i, j := range jobs {
		for _, e := range j.node.ends {
			all = append(all, contribution{e.result, e.weight * values[i]})
		}
		if next[i] != nil {
			w.active = append(w.active, live[T]{j.node, next[i]})
		}
	}
	return all, nil
}

// stand is a site tensor with all that steps across it share: the operators applied to it, what closes strings, and plans.
type stand[T dense.Scalar] struct {
	forest  *forest[T]
	b, conj *block.Tensor[T]
	applied map[int32]*block.Tensor[T] // O·b, by number of the operator
	closing map[int32]*block.Tensor[T] // sum over s, r of b conj(O·b), with the structure of the environments that it closes
	across  map[[2]block.Charge]*block.ContractPlan
	down    map[block.Charge]*block.ContractPlan
}

func newStand[T dense.Scalar](f *forest[T], b *block.Tensor[T]) *stand[T] {
	return &stand[T]{forest: f, b: b, conj: b.Conj(), applied: make(map[int32]*block.Tensor[T]), closing: make(map[int32]*block.Tensor[T]),
		across: make(map[[2]block.Charge]*block.ContractPlan), down: make(map[block.Charge]*block.ContractPlan)}
}

// prepare makes what a job needs; it must not run beside jobs.
func (s *stand[T]) prepare(j job[T]) {
	op := j.node.op
	ob := s.applied[op]
	if ob == nil {
		ob = s.b
		if o := s.forest.ops[op]; o != nil {
			ob = block.Permute(block.Contract(o, s.b, []int{1}, []int{1}), 1, 0, 2)
		}
		s.applied[op] = ob
	}
	if j.from == nil {
		if len(j.node.children) > 0 {
			s.plan(ob.Structure)
		}
		return
	}
	if len(j.node.ends) > 0 && s.closing[op] == nil {
		s.closing[op] = block.Contract(s.b, ob.Conj(), []int{1, 2}, []int{1, 2})
	}
	if len(j.node.children) > 0 {
		key := [2]block.Charge{j.from.Total, ob.Total}
		if s.across[key] == nil {
			s.across[key] = block.PlanContract(j.from.Structure, ob.Structure, []int{1}, []int{0})
		}
		s.plan(s.across[key].Out)
	}
}

// plan plans the contraction of conj(b) with a tensor like it, in the bond on the left and the site.
func (s *stand[T]) plan(u *block.Structure) {
	if s.down[u.Total] == nil {
		s.down[u.Total] = block.PlanContract(s.conj.Structure, u, []int{0, 1}, []int{0, 1})
	}
}

// close returns the value of the strings that end with a job. Environments and operators whose charges do not cancel have none.
func (s *stand[T]) close(j job[T]) T {
	if j.from == nil {
		if ob := s.applied[j.node.op]; ob.Total == s.b.Total {
			return block.Dot(s.b, ob)
		}
		return dense.FromFloat[T](0)
	}
	if m := s.closing[j.node.op]; m.Total == j.from.Total {
		return block.Dot(m, j.from)
	}
	return dense.FromFloat[T](0)
}

// goOn returns the environment behind the site.
func (s *stand[T]) goOn(j job[T], ws *block.Scratch[T]) *block.Tensor[T] {
	u := s.applied[j.node.op]
	if j.from != nil {
		p := s.across[[2]block.Charge{j.from.Total, u.Total}]
		t := &block.Tensor[T]{Structure: p.Out, Data: ws.Take(p.Out.Size)}
		defer ws.Give(t.Data)
		block.RunContract(p, t.Data, j.from.Data, u.Data, ws, nil)
		u = t
	}
	p := s.down[u.Total]
	env := block.New[T](p.Out)
	block.RunContract(p, env.Data, s.conj.Data, u.Data, ws, nil)
	return env
}

// stepFlops estimates the cost of one step.
func stepFlops[T dense.Scalar](a *block.Tensor[T]) float64 {
	var f float64
	for _, b := range a.Blocks {
		f += 4 * float64(b.Len) * float64(b.Shape[0])
	}
	return f
}
