package dmrg

import (
	"fmt"
	"math"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mps"
	"rundle/mps/block"
)

// lowerState is a state that a search stays orthogonal to, with its overlaps with the state searched on either side of the centre: left[i] is
// the overlap of all sites left of site i, axes (bond of the state searched In, bond of psi Out), right[i] of those right of it, axes (bond
// of psi In, bond of the state searched Out). They stand where the environments of the search do.
type lowerState[T dense.Scalar] struct {
	psi         *mps.Chain[T]
	left, right []*block.Tensor[T]
}

// avoid makes the search stay orthogonal to states of its sector: exactly at each update, up to what truncation brings back. The states must not
// change while the engine lives. To be called before prepare.
func (e *engine[T]) avoid(states []*mps.Chain[T]) {
	n := e.psi.Len()
	for _, psi := range states {
		if psi.Charge() != e.psi.Charge() {
			panic(fmt.Sprintf("dmrg: %v asked to stay orthogonal to %v", e.psi, psi))
		}
		l := &lowerState[T]{psi: psi, left: make([]*block.Tensor[T], n), right: make([]*block.Tensor[T], n)}
		l.left[0] = block.Identity[T](psi.Group, block.NewAxis(block.In, block.Sector{Dim: 1}))
		l.right[n-1] = block.Identity[T](psi.Group, psi.Bond(n-1).Reversed())
		e.lower = append(e.lower, l)
	}
}

// overlapsLeft makes the overlaps left of site i+1 from those left of site i; overlapsRight those right of site i-1 from those right of site i.
func (e *engine[T]) overlapsLeft(i int) {
	if len(e.lower) == 0 {
		return
	}
	bra := e.psi.Sites[i].Conj()
	for _, l := range e.lower {
		x := e.contract(l.left[i], l.psi.Sites[i], []int{1}, []int{0})
		l.left[i+1] = e.contract(bra, x, []int{0, 1}, []int{0, 1})
		l.right[i] = nil
	}
}

func (e *engine[T]) overlapsRight(i int) {
	if len(e.lower) == 0 {
		return
	}
	bra := e.psi.Sites[i].Conj()
	for _, l := range e.lower {
		x := e.contract(l.psi.Sites[i], l.right[i], []int{2}, []int{0})
		l.right[i-1] = e.contract(x, bra, []int{1, 2}, []int{1, 2})
		l.left[i] = nil
	}
}

// contract contracts on the threads of the pool and counts the operations.
func (e *engine[T]) contract(a, b *block.Tensor[T], axesA, axesB []int) *block.Tensor[T] {
	p := block.PlanContract(a.Structure, b.Structure, axesA, axesB)
	out := block.New[T](p.Out)
	block.RunContract(p, out.Data, a.Data, b.Data, &e.scratch, e.pool)
	e.count(p.Flops())
	return out
}

// negligible is the norm of a constraint that is not worth keeping: with it an overlap of as much may stay, which errs by its square in energy.
const negligible = 1e-9

// constraints returns orthonormal vectors that span the projections of the lower states on the sites that h acts on: what is orthogonal to them
// is orthogonal to the states.
func (e *engine[T]) constraints(h *mpo.Projected[T]) [][]T {
	first, count := h.Sites()
	var basis [][]T
	for _, l := range e.lower {
		x := l.left[first]
		for i := first; i < first+count; i++ {
			x = e.contract(x, l.psi.Sites[i], []int{i - first + 1}, []int{0})
		}
		x = e.contract(x, l.right[first+count-1], []int{count + 1}, []int{0})
		if !x.Structure.Equal(h.Theta) {
			panic(fmt.Sprintf("dmrg: a lower state projected on %v gives %v", h.Theta, x.Structure))
		}
		for range 2 {
			for _, y := range basis {
				dense.Axpy(-dense.Dot(y, x.Data), y, x.Data)
			}
		}
		norm := x.Norm()
		if norm <= negligible {
			continue
		}
		x.Scale(dense.FromFloat[T](1 / norm))
		for _, y := range basis { // what rounding left, where little remained
			dense.Axpy(-dense.Dot(y, x.Data), y, x.Data)
		}
		x.Scale(dense.FromFloat[T](1 / x.Norm()))
		basis = append(basis, x.Data)
	}
	return basis
}

// freed makes a start vector that the constraints leave something of: theta, or where they span it, at random. Where no vector is left,
// it reports false.
func (e *engine[T]) freed(theta *block.Tensor[T], against [][]T) bool {
	left := func() bool {
		x := theta.Clone()
		for range 2 {
			for _, y := range against {
				dense.Axpy(-dense.Dot(y, x.Data), y, x.Data)
			}
		}
		return x.Norm() > spanned*theta.Norm()
	}
	if len(against) == 0 || left() {
		return true
	}
	before := theta.Clone()
	e.shake(theta, 1)
	if left() {
		return true
	}
	copy(theta.Data, before.Data)
	return false
}

// spanned is the relative norm outside the constraints below which a start vector is rounding.
const spanned = 1e-10

// blocked leaves theta as it is, where no vector is orthogonal to the lower states, and returns its energy. The residual tells that nothing was
// solved.
func (e *engine[T]) blocked(theta *block.Tensor[T], apply func(dst, src []T)) float64 {
	theta.Scale(dense.FromFloat[T](1 / theta.Norm()))
	out := block.New[T](theta.Structure)
	apply(out.Data, theta.Data)
	e.residual, e.gain, e.narrow = math.Inf(1), 0, 0
	return dense.Real(block.Dot(theta, out))
}
