package dmrg

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"time"

	"rundle/internal/dense"
	"rundle/internal/krylov"
	"rundle/internal/task"
	"rundle/mpo"
	"rundle/mps"
	"rundle/mps/block"
)

// engine holds a state, its environments and the workspaces of one search.
type engine[T dense.Scalar] struct {
	op     *mpo.Operator[T]
	plan   *mpo.Planner[T]
	psi    *mps.Chain[T]
	left   []*block.Tensor[T] // left[i]: everything left of site i
	right  []*block.Tensor[T] // right[i]: everything right of site i
	pool   *task.Pool
	rng    *rand.Rand
	work   mpo.Workspace[T]
	kry    krylov.Workspace[T]
	onBond func(Position)
	sweeps int

	residual float64 // of the last eigenvector
}

// setting is what one sweep is told.
type setting struct {
	bond      int     // cap on the bond dimension
	weight    float64 // weight a truncation may discard
	mixing    float64 // weight of the perturbation
	noise     float64 // size of the random part of the start vectors
	vectors   int     // Krylov vectors a bond
	tolerance float64 // residual of the eigenvector
}

// outcome is what one sweep reports.
type outcome struct {
	energy    float64
	discarded float64 // largest of the left-going half
	total     float64 // sum over the bonds of the left-going half
	largest   int
	residual  float64 // largest of the left-going half
	change    float64 // largest norm by which an update changed its normalized two-site tensor, in the whole sweep
}

func newEngine[T dense.Scalar](op *mpo.Operator[T], psi *mps.Chain[T], threads int, seed uint64) *engine[T] {
	e := &engine[T]{op: op, plan: mpo.NewPlanner(op), psi: psi, pool: task.New(threads), rng: rand.New(rand.NewPCG(seed, 0x72756e646c65))}
	n := psi.Len()
	e.left, e.right = make([]*block.Tensor[T], n), make([]*block.Tensor[T], n)
	psi.Canonicalize(0, e.pool)
	e.left[0] = mpo.LeftEdge(op)
	e.right[n-1] = mpo.RightEdge(op, psi.Charge(), psi.Charge())
	for i := n - 1; i > 0; i-- {
		e.growRight(i)
	}
	return e
}

// growLeft makes left[i+1] from left[i]; growRight makes right[i-1] from right[i].
func (e *engine[T]) growLeft(i int) {
	a := e.psi.Sites[i]
	g := e.plan.Left(i, e.left[i].Structure, a.Structure, a.Structure)
	e.left[i+1] = block.New[T](g.Out)
	g.Run(e.left[i+1], e.left[i], a, a, &e.work, e.pool)
}

func (e *engine[T]) growRight(i int) {
	a := e.psi.Sites[i]
	g := e.plan.Right(i, e.right[i].Structure, a.Structure, a.Structure)
	e.right[i-1] = block.New[T](g.Out)
	g.Run(e.right[i-1], e.right[i], a, a, &e.work, e.pool)
}

// sweep goes right and left once over all bonds. On a cancelled context it stops between two bonds and returns its error;
// the chain is then a valid state.
func (e *engine[T]) sweep(ctx context.Context, s setting) (outcome, error) {
	e.sweeps++
	n := e.psi.Len()
	if n == 1 {
		return e.single(s)
	}
	var out outcome
	for i := 0; i < n-1; i++ {
		if _, err := e.step(ctx, i, true, s, &out); err != nil {
			return out, err
		}
	}
	out = outcome{change: out.change}
	for i := n - 2; i >= 0; i-- {
		energy, err := e.step(ctx, i, false, s, &out)
		if err != nil {
			return out, err
		}
		out.energy = energy
	}
	return out, nil
}

func (e *engine[T]) step(ctx context.Context, i int, right bool, s setting, out *outcome) (float64, error) {
	if err := ctx.Err(); err != nil {
		return 0, err
	}
	energy, discarded, change, err := e.update(i, right, s)
	if err != nil {
		return 0, fmt.Errorf("dmrg: bond %d: %w", i, err)
	}
	out.change = max(out.change, change)
	out.discarded = max(out.discarded, discarded)
	out.total += discarded
	out.largest = max(out.largest, e.psi.Bond(i).Dim())
	out.residual = max(out.residual, e.residual)
	if e.onBond != nil {
		e.onBond(Position{Sweep: e.sweeps, Bond: i, Bonds: e.psi.Len() - 1, Energy: energy})
	}
	return energy, nil
}

// update optimizes sites i and i+1 together (White 1992) and moves the orthogonality centre on.
func (e *engine[T]) update(i int, right bool, s setting) (energy, discarded, change float64, err error) {
	theta := block.Contract(e.psi.Sites[i], e.psi.Sites[i+1], []int{2}, []int{0})
	h := e.plan.Project(i, 2, e.left[i], e.right[i+1], theta.Structure)
	if s.noise > 0 {
		e.shake(theta, s.noise)
	}
	before := theta.Clone()
	energy, err = e.lowest(h, theta, s)
	if err != nil {
		return 0, 0, 0, err
	}
	change = distance(before, theta)
	var a, b *block.Tensor[T]
	if s.mixing > 0 {
		a, b, discarded, err = e.splitMixed(h, theta, right, s)
	} else {
		a, b, discarded, err = e.split(theta, right, s)
	}
	if err != nil {
		return 0, 0, 0, err
	}
	e.psi.Sites[i], e.psi.Sites[i+1] = a, b
	if right {
		e.psi.Center = i + 1
		e.growLeft(i)
	} else {
		e.psi.Center = i
		e.growRight(i + 1)
	}
	return energy, discarded, change, nil
}

// distance is the norm of the part of y, normalized, that is orthogonal to x. It overwrites x.
func distance[T dense.Scalar](x, y *block.Tensor[T]) float64 {
	nx := x.Norm()
	if nx == 0 {
		return 1
	}
	x.Scale(dense.FromFloat[T](1 / nx))
	along := block.Dot(x, y)
	x.Scale(-along)
	x.Axpy(dense.FromFloat[T](1), y)
	return x.Norm()
}

// single is the ladder of one site.
func (e *engine[T]) single(s setting) (outcome, error) {
	theta := e.psi.Sites[0]
	h := e.plan.Project(0, 1, e.left[0], e.right[0], theta.Structure)
	dense.Random(e.rng, theta.Block(0))
	s.vectors = 200
	energy, err := e.lowest(h, theta, s)
	return outcome{energy: energy, largest: 1}, err
}

func (e *engine[T]) lowest(h *mpo.Projected[T], theta *block.Tensor[T], s setting) (float64, error) {
	r := krylov.Lowest(func(dst, src []T) { h.Apply(dst, src, &e.work, e.pool) }, theta.Data, nil,
		krylov.Options{MaxVectors: s.vectors, Tolerance: s.tolerance}, &e.kry)
	if math.IsNaN(r.Value) || math.IsInf(r.Value, 0) {
		return 0, fmt.Errorf("the eigensolver met a number that is not finite; look for couplings whose products overflow")
	}
	e.residual = r.Residual
	return r.Value, nil
}

// shake adds a random part of relative norm size to theta, inside its blocks.
func (e *engine[T]) shake(theta *block.Tensor[T], size float64) {
	noise := block.New[T](theta.Structure)
	for i := range noise.Blocks {
		dense.Random(e.rng, noise.Block(i))
	}
	norm := noise.Norm()
	if norm == 0 {
		return
	}
	theta.Axpy(dense.FromFloat[T](size*theta.Norm()/norm), noise)
}

// split cuts theta by singular values; the centre goes to the right or the left tensor, normalized.
func (e *engine[T]) split(theta *block.Tensor[T], right bool, s setting) (a, b *block.Tensor[T], discarded float64, err error) {
	u, spec, v, err := block.SVD(theta, 2, block.Cut{Bond: s.bond, Weight: s.weight}, e.pool)
	if err != nil {
		return nil, nil, 0, err
	}
	if right {
		block.ScaleBond(v, 0, spec.Values)
		v.Scale(dense.FromFloat[T](1 / v.Norm()))
	} else {
		block.ScaleBond(u, 2, spec.Values)
		u.Scale(dense.FromFloat[T](1 / u.Norm()))
	}
	return u, v, spec.Discarded, nil
}

func since(t time.Time) float64 { return time.Since(t).Seconds() }
