package dmrg

import (
	"fmt"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// rewriting is a problem in real form where the user's sites do not give one: in other modes (ladder.Modes) or on merged sites
// (ladder.Merged). The search sees that form, the user states on the old sites.
type rewriting interface {
	// state takes a chain of the search, which it leaves alone, to the user's sites; the centre is at the last site.
	state(c *mps.Chain[float64], pool *task.Pool) (*mps.Chain[complex128], error)
	fmt.Stringer
}

// rewritten is what a problem in real form keeps of the user's.
type rewritten struct {
	way    rewriting
	frames *ladder.Frames // the user's, complex
	scope  *ladder.Scope
}

// Approach is the form in which a search works on a Hamiltonian.
type Approach struct {
	Strings   *ladder.Strings // that its operator is built from
	Rewritten string          // in what other modes or sites, for people; "": on the user's
}

// Approached tells how Ground would work on a problem, without a search.
func Approached(h *ladder.Hamiltonian, sector ladder.Sector, opt Options) (Approach, error) {
	p, err := newProblem(h, sector, opt)
	if err != nil {
		return Approach{}, err
	}
	a := Approach{Strings: p.strings}
	if p.rewritten != nil {
		a.Rewritten = p.rewritten.way.String()
	}
	return a, nil
}

// complexCost is the operations of a complex product in those of a real one.
const complexCost = 4

// rewrite turns a complex problem into a real one where there is one that keeps its charges and costs less. What the user starts from stays as
// it is.
func (p *problem) rewrite(sector ladder.Sector) error {
	if p.strings.Real || p.opt.Complex || p.opt.Start != nil || len(p.opt.Levels) > 0 {
		return nil
	}
	if m := p.h.Merged(p.frames); m != nil {
		cheaper, err := p.cheaper(m.Strings)
		if cheaper {
			p.rewritten = &rewritten{way: &mergedWay{m, p.frames}, frames: p.frames, scope: p.h.Scope}
			p.strings = m.Strings
		}
		return err
	}
	m := p.h.Modes()
	if m == nil {
		return nil
	}
	names := make([]string, len(p.frames.Charges))
	for i, c := range p.frames.Charges {
		names[i] = c.Name
	}
	frames, err := m.Hamiltonian.Frames(ladder.FrameOptions{Charges: names})
	if err != nil || !frames.Real || frames.Group != p.frames.Group {
		return nil // the modes do not keep the charges
	}
	target, err := frames.Target(sector)
	if err != nil {
		return nil
	}
	s, err := frames.Strings(m.Hamiltonian.Poly)
	if err != nil || !s.Real {
		return err
	}
	cheaper, err := p.cheaper(s)
	if cheaper {
		p.rewritten = &rewritten{way: &modesWay{m, p.frames, frames}, frames: p.frames, scope: p.h.Scope}
		p.frames, p.target, p.strings = frames, target, s
	}
	return err
}

// cheaper reports whether real strings take fewer operations than the complex ones of the problem.
func (p *problem) cheaper(s *ladder.Strings) (bool, error) {
	before, err := sweepCost[complex128](p.strings)
	if err != nil {
		return false, err
	}
	after, err := sweepCost[float64](s)
	return after < before, err
}

// Operations of an update: so many products with the effective Hamiltonian, and a decomposition of so many times rows · columns · the
// smaller of both.
const (
	updateProducts = 5
	svdWork        = 10
)

// sweepCost counts the operations of a sweep, for equal bonds of the state everywhere and in units of their cube.
func sweepCost[T dense.Scalar](s *ladder.Strings) (cost float64, err error) {
	op, err := mpo.Build[T](s, mpo.Options{})
	if err != nil {
		return 0, err
	}
	for i := range len(s.Axes) - 1 {
		a, b := s.Axes[i].Dim(), s.Axes[i+1].Dim()
		cost += float64(a * b * (2*updateProducts*(op.Bonds[i].Dim()+op.Bonds[i+2].Dim()) + svdWork*min(a, b)))
	}
	if dense.IsComplex[T]() {
		cost *= complexCost
	}
	return cost, nil
}

// wayBack is the weight that going back may discard at a pair: nothing that an energy shows, and 1e-9 of an observable.
const wayBack = 1e-18

// state takes a chain of the search to the user's sites.
func (r *rewritten) state(c *mps.Chain[float64], _ *ladder.Frames, _ *ladder.Scope) (*mps.State, error) {
	pool := task.New(0)
	out, err := r.way.state(c, pool)
	if err != nil {
		return nil, err
	}
	out.MoveCenter(0, pool)
	return mps.NewComplex(out, r.frames, r.scope)
}

// modesWay goes back from other modes, pair by pair.
type modesWay struct {
	modes        *ladder.Modes
	user, frames *ladder.Frames
}

func (w *modesWay) state(c *mps.Chain[float64], pool *task.Pool) (*mps.Chain[complex128], error) {
	out := mps.Promote(c)
	for _, i := range w.modes.Pairs {
		a, b := w.user.Sites[i].Axis(), w.user.Sites[i+1].Axis()
		u, v := w.frames.Sites[i].Axis(), w.frames.Sites[i+1].Axis()
		s := block.NewStructure(c.Group, []block.Axis{a, b, u.Reversed(), v.Reversed()}, block.Charge{})
		gate, err := block.FromDense(s, w.modes.Between(i, w.user, w.frames), gateRounding)
		if err != nil {
			return nil, err
		}
		if _, err := out.ApplyPair(i, gate, block.Cut{Weight: wayBack}, pool); err != nil {
			return nil, err
		}
	}
	return out, nil
}

func (w *modesWay) String() string {
	return "in the modes (a + b)/sqrt2 and i (a - b)/sqrt2 of neighbouring legs a and b"
}

// mergedWay splits merged sites.
type mergedWay struct {
	merged *ladder.Merged
	user   *ladder.Frames
}

func (w *mergedWay) String() string {
	return "with the sites of neighbouring legs merged, in the even and odd states of each rung"
}

func (w *mergedWay) state(c *mps.Chain[float64], pool *task.Pool) (*mps.Chain[complex128], error) {
	from := mps.Promote(c)
	from.MoveCenter(0, pool)
	var sites []*block.Tensor[complex128]
	for k, t := range from.Sites { // t is the centre: what is to its right is an isometry from the right
		if k > 0 {
			q, r, err := block.QR(sites[len(sites)-1], 2, nil, pool)
			if err != nil {
				return nil, err
			}
			sites[len(sites)-1] = q
			t = block.Contract(r, t, []int{1}, []int{0})
		}
		split, err := w.split(k, t, pool)
		if err != nil {
			return nil, err
		}
		sites = append(sites, split...)
	}
	out, err := mps.NewChain(c.Group, sites)
	if err != nil {
		return nil, err
	}
	out.Center = len(sites) - 1
	return out, nil
}

// split cuts the tensor of merged site k into those of the user's sites, the last of which holds the norm.
func (w *mergedWay) split(k int, t *block.Tensor[complex128], pool *task.Pool) ([]*block.Tensor[complex128], error) {
	m, first := t.Axes[1], w.merged.First[k]
	axes := []block.Axis{w.user.Sites[first].Axis()}
	if m.Dim() > axes[0].Dim() {
		axes = append(axes, w.user.Sites[first+1].Axis())
	}
	gate, err := block.FromDense(block.NewStructure(t.Group, append(axes, m.Reversed()), block.Charge{}), w.merged.Split(k, w.user), gateRounding)
	if err != nil {
		return nil, err
	}
	t = block.Contract(t, gate, []int{1}, []int{len(axes)}) // l, r, then the sites
	if len(axes) == 1 {
		return []*block.Tensor[complex128]{block.Permute(t, 0, 2, 1)}, nil
	}
	u, values, v, err := block.SVD(block.Permute(t, 0, 2, 3, 1), 2, block.Cut{Weight: wayBack}, nil, pool)
	if err != nil {
		return nil, err
	}
	block.ScaleBond(v, 0, values.Values)
	return []*block.Tensor[complex128]{u, v}, nil
}

// gateRounding is what a pair matrix may hold outside of its charges.
const gateRounding = 1e-13
