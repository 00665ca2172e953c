package dmrg

import (
	"slices"

	"rundle/internal/task"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// rewritten is a problem solved in real modes (ladder.Modes): the search sees the Hamiltonian of the modes, the user states in the old ones.
type rewritten struct {
	modes  *ladder.Modes
	frames *ladder.Frames // the user's, complex
	scope  *ladder.Scope
}

// complexCost is the operations of a complex product in those of a real one.
const complexCost = 4

// rewrite turns a complex problem into one in real modes where there are some that keep its charges and cost less: operations go as the bonds of
// the operator. What the user starts from stays as it is.
func (p *problem) rewrite(sector ladder.Sector) error {
	if p.strings.Real || p.opt.Complex || p.opt.Start != nil {
		return nil
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
	before, err := bondSum[complex128](p.strings)
	if err != nil {
		return err
	}
	after, err := bondSum[float64](s)
	if err != nil || after >= complexCost*before {
		return err
	}
	p.rewritten = &rewritten{modes: m, frames: p.frames, scope: p.h.Scope}
	p.frames, p.target, p.strings = frames, target, s
	return nil
}

func bondSum[T float64 | complex128](s *ladder.Strings) (sum float64, err error) {
	op, err := mpo.Build[T](s, mpo.Options{})
	if err != nil {
		return 0, err
	}
	for _, d := range op.BondDims() {
		sum += float64(d)
	}
	return sum, nil
}

// wayBack is the weight that going back may discard at a pair: nothing that an energy shows, and 1e-9 of an observable.
const wayBack = 1e-18

// state takes a chain of the modes to the user's, pair by pair.
func (r *rewritten) state(c *mps.Chain[float64], frames *ladder.Frames, _ *ladder.Scope) (*mps.State, error) {
	out := mps.Promote(c)
	pool := task.New(0)
	pairs := r.modes.Pairs
	if c.Center > c.Len()/2 { // from the end at which the centre stands
		pairs = slices.Clone(pairs)
		slices.Reverse(pairs)
	}
	for _, i := range pairs {
		gate, err := r.gate(i, frames)
		if err != nil {
			return nil, err
		}
		if _, err := out.ApplyPair(i, gate, block.Cut{Weight: wayBack}, pool); err != nil {
			return nil, err
		}
	}
	out.MoveCenter(max(c.Center, 0), pool)
	return mps.NewComplex(out, r.frames, r.scope)
}

// gate is the matrix of a pair between the frames of the modes and those of the user.
func (r *rewritten) gate(i int, modes *ladder.Frames) (*block.Tensor[complex128], error) {
	l := r.scope.Ladder()
	pair := r.modes.Pair(i)
	d := l.Site(i).Dim()
	n := d * d
	to := kron(d, r.frames.Unitary(l, i), r.frames.Unitary(l, i+1))
	from := kron(d, modes.Unitary(l, i), modes.Unitary(l, i+1))
	half, data := make([]complex128, n*n), make([]complex128, n*n)
	for x := range n {
		for y := range n {
			for k := range n {
				half[x*n+y] += to[x*n+k] * pair[k*n+y]
			}
		}
	}
	for x := range n {
		for y := range n {
			for k := range n {
				z := from[y*n+k]
				data[x*n+y] += half[x*n+k] * complex(real(z), -imag(z))
			}
		}
	}
	a, b := r.frames.Sites[i].Axis(), r.frames.Sites[i+1].Axis()
	u, v := modes.Sites[i].Axis(), modes.Sites[i+1].Axis()
	s := block.NewStructure(r.frames.Group, []block.Axis{a, b, u.Reversed(), v.Reversed()}, block.Charge{})
	return block.FromDense(s, data, gateRounding)
}

// gateRounding is what a pair matrix may hold outside of its charges.
const gateRounding = 1e-13

// kron is the Kronecker product of two d×d matrices.
func kron(d int, a, b []complex128) []complex128 {
	n := d * d
	out := make([]complex128, n*n)
	for i := range n {
		for k := range n {
			out[i*n+k] = a[i/d*d+k/d] * b[i%d*d+k%d]
		}
	}
	return out
}
