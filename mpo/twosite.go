package mpo

import (
	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps"
	"rundle/mps/block"
)

// TwoSiteVariance returns what single-site and two-site changes of psi see of ||(h - E) psi||² / ||psi||², and the number of operations it
// took (multiplications and additions, complex ones counted once): the squared norms of h psi projected on the complement
// of psi's tensors at one site and at two neighbours,
//
//	sum_i ||P_i h psi||² + sum_i ||P_{i,i+1} h psi||²   (Hubig, Haegeman, Schollwoeck 2018).
//
// The spaces are orthogonal to each other and to psi, so that the sum is never above the full variance but by rounding, some (eps |E|)².
// It is the full variance where no term of h reaches over more than two neighbouring sites. Longer terms also lead to changes of three and
// more sites, which it misses: on a ladder in rung-major order every hop along a leg is one. How much is missing depends on the
// model; see TestTwoSiteVarianceMisses.
//
// h must add no charge. It costs about one application of the projected Hamiltonian a site and a bond, a small part of Variance.
func TwoSiteVariance[T dense.Scalar](psi *mps.Chain[T], h *Operator[T], pool *task.Pool) (variance, flops float64) {
	mustAct("two-site variance", h, psi)
	psi = normalized(psi, 0, pool)
	n := psi.Len()
	plan := NewPlanner(h)
	right := make([]*block.Tensor[T], n)
	right[n-1] = RightEdge(h, psi.Charge(), psi.Charge())
	var ws Workspace[T]
	for i := n - 1; i > 0; i-- {
		a := psi.Sites[i]
		g := plan.RightIsometry(i, right[i], a.Structure)
		right[i-1] = block.New[T](g.Out)
		g.Run(right[i-1], right[i], a, a, &ws, pool)
		flops += g.Flops()
	}
	variance, more, _ := TwoSiteVarianceFrom(psi, plan, func(i int) (*block.Tensor[T], error) { return right[i], nil }, &ws, pool) // nothing to fail
	return variance, flops + more
}

// TwoSiteVarianceFrom is TwoSiteVariance of a normalized chain with its centre at the first site, where the environments stand already:
// right(i) returns the one right of site i. An error of right ends the work.
func TwoSiteVarianceFrom[T dense.Scalar](psi *mps.Chain[T], plan *Planner[T], right func(i int) (*block.Tensor[T], error), ws *Workspace[T],
	pool *task.Pool) (variance, flops float64, err error) {
	if psi.Center != 0 {
		panic("mpo: two-site variance of a chain whose centre is not its first site")
	}
	n := psi.Len()
	left, centre := LeftEdge(plan.op), psi.Sites[0]
	here, err := right(0)
	if err != nil {
		return 0, 0, err
	}
	var factors block.Workspace[T]
	for i := range n {
		q, c, err := block.QR(centre, 2, &factors, pool)
		if err != nil {
			return 0, 0, err
		}
		y, count := plan.applied(i, left, here, centre, ws, pool)
		flops += count
		leave(y, q)
		variance += square(y)
		if i == n-1 {
			break
		}
		next := psi.Sites[i+1]
		if here, err = right(i + 1); err != nil {
			return 0, 0, err
		}
		theta := block.Contract(centre, next, []int{2}, []int{0})
		y, count = plan.applied(i, left, here, theta, ws, pool)
		flops += count
		leave(y, q)
		leaveRight(y, next)
		variance += square(y)

		g := plan.LeftIsometry(i, left, q.Structure)
		grown := block.New[T](g.Out)
		g.Run(grown, left, q, q, ws, pool)
		flops += g.Flops()
		left, centre = grown, block.Contract(c, next, []int{1}, []int{0})
	}
	return variance, flops, nil
}

// applied returns the projected operator on x, a tensor of one site or of two from site i on, and the operations of one application.
func (p *Planner[T]) applied(i int, left, right, x *block.Tensor[T], ws *Workspace[T], pool *task.Pool) (*block.Tensor[T], float64) {
	h := p.Project(i, len(x.Axes)-2, left, right, x.Structure)
	defer h.Release()
	y := block.New[T](x.Structure)
	h.Apply(y.Data, x.Data, ws, pool)
	return y, h.Flops()
}

// leave takes out of y, with the axes (l, s, ...), what lies in the span of the left-canonical tensor a: y -= a (a^+ y).
func leave[T dense.Scalar](y, a *block.Tensor[T]) {
	along := block.Contract(a.Conj(), y, []int{0, 1}, []int{0, 1})
	y.Axpy(dense.FromFloat[T](-1), block.Contract(a, along, []int{2}, []int{0}))
}

// leaveRight takes out of y, with the axes (..., s, r), what lies in the span of the right-canonical tensor b: y -= (y b^+) b.
func leaveRight[T dense.Scalar](y, b *block.Tensor[T]) {
	k := len(y.Axes)
	along := block.Contract(y, b.Conj(), []int{k - 2, k - 1}, []int{1, 2})
	y.Axpy(dense.FromFloat[T](-1), block.Contract(along, b, []int{k - 2}, []int{0}))
}

func square[T dense.Scalar](y *block.Tensor[T]) float64 {
	norm := y.Norm()
	return norm * norm
}
