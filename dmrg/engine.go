package dmrg

import (
	"errors"
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

// engine holds a state, the environments of its orthogonality centre and the workspaces of one search. Between two updates the centre
// is at site psi.Center, and the environments left of the sites 0..Center and right of the sites Center.. stand. What an update leaves to later
// ones beside chain and environments, which are a function of it, must be in the record of a waypoint.
type engine[T dense.Scalar] struct {
	op       *mpo.Operator[T]
	plan     *mpo.Planner[T]
	psi      *mps.Chain[T]
	envs     *environments[T]
	memory   int64            // cap on the bytes held; 0: none
	lower    []*lowerState[T] // states to stay orthogonal to
	scratch  block.Scratch[T] // of their overlaps and of contractions
	factors  block.Workspace[T]
	cutting  cutting[T]
	lent     [2][]T
	pool     *task.Pool
	seed     uint64
	pcg      *rand.PCG // seeded anew for each update
	rng      *rand.Rand
	work     mpo.Workspace[T]
	kry      krylov.Workspace[T]
	unit     float64      // of energy, near the largest coupling where that is far from one
	halt     func() error // why the search has to stop now; nil: go on; asked from any thread
	brief    *task.Pool   // pool, for decompositions that give up midway once halt says why
	onBond   func(Position)
	onPause  func() error // called between two updates; nil: nothing
	way      *passage     // the sweep under way; nil between sweeps
	sweeps   int
	products int     // with projected Hamiltonians
	flops    float64 // of environments and projected Hamiltonians, in real operations
	residual float64 // of the last eigenvector
	narrow   float64 // inverse of the gap above it, as far as its Krylov space tells
	gain     float64 // of the last eigenvector against its start
	growth   float64 // those of the environments of the last left-going half sweep
}

// setting is what one sweep is told.
type setting struct {
	bond         int     // cap on the bond dimension
	weight       float64 // weight a truncation may discard
	perturbation float64 // weight of the perturbation
	noise        float64 // size of the random part of the start vectors
	vectors      int     // Krylov vectors a bond
	tolerance    float64 // residual of the eigenvector
	least        float64 // gain of energy by which another Krylov vector is worth its product; 0: any
	update       Update  // of the bonds
	passing      bool    // on the way to a larger bond dimension: no stage counts it
}

// clean is whether a sweep measures what truncation costs: both sites of a bond are optimized, and nothing but the truncation disturbs them.
func (s setting) clean() bool { return s.update == TwoSites && s.perturbation == 0 && !s.passing }

// outcome is what one sweep reports.
type outcome struct {
	energy    float64
	discarded float64 // largest of the left-going half
	total     float64 // sum over the bonds of the left-going half
	largest   int
	residual  float64 // largest of the left-going half
	rest      float64 // root of the squared residuals, summed over the bonds of the left-going half
	narrow    float64 // inverse of the smallest gap that a Krylov space of the whole sweep told; 0: none did
	gain      float64 // of energy by all updates of the left-going half
	change    float64 // largest norm by which an update changed its normalized two-site tensor, in the whole sweep
	products  int     // with projected Hamiltonians, in the whole sweep
	flops     float64 // of both, in the whole sweep
	seconds   float64 // in the whole sweep
}

// halfway keeps what counts for the whole sweep.
func (o outcome) halfway() outcome {
	return outcome{change: o.change, narrow: o.narrow, products: o.products, flops: o.flops, seconds: o.seconds}
}

// newEngine begins a search from psi, which it keeps and normalizes; prepare must follow. Once halt says why to stop, the engine's methods return
// that.
func newEngine[T dense.Scalar](op *mpo.Operator[T], psi *mps.Chain[T], opt settled, halt func() error) *engine[T] {
	e := standingEngine(op, psi, opt, halt)
	psi.Canonicalize(0, e.pool)
	psi.Normalize()
	return e
}

// standingEngine goes on with psi as it is, which must have a centre.
func standingEngine[T dense.Scalar](op *mpo.Operator[T], psi *mps.Chain[T], opt settled, halt func() error) *engine[T] {
	e := &engine[T]{op: op, plan: mpo.NewPlanner(op), psi: psi, pool: task.New(opt.Threads), halt: halt, unit: opt.unit,
		seed: opt.Seed, pcg: rand.NewPCG(opt.Seed, noiseStream), envs: newEnvironments[T](psi.Len(), opt.depot), memory: opt.Memory}
	e.rng = rand.New(e.pcg)
	e.brief = e.pool.Until(func() bool { return halt() != nil })
	return e
}

// leastGap keeps inverse gaps finite.
const leastGap = 1e-300

// noiseStream sets the random numbers of the engine apart from others of the same seed.
const noiseStream = 0x72756e646c65

// reseed makes the random numbers of an update a function of its place, so that they need no memory.
func (e *engine[T]) reseed(bond int, right bool) {
	place := 2 * (uint64(e.sweeps)*uint64(e.psi.Len()) + uint64(bond))
	if right {
		place++
	}
	e.pcg.Seed(e.seed, noiseStream^place<<32)
}

// prepare makes the environments of the centre from nothing. A search that goes on has counted that work before.
func (e *engine[T]) prepare() error {
	if flops, growth := e.flops, e.growth; flops > 0 {
		defer func() { e.flops, e.growth = flops, growth }()
	}
	last := e.psi.Len() - 1
	e.envs.setLeft(0, mpo.LeftEdge(e.op))
	e.envs.setRight(last, mpo.RightEdge(e.op, e.psi.Charge(), e.psi.Charge()))
	for i := last; i > e.psi.Center; i-- {
		if err := e.halt(); err != nil {
			return err
		}
		if err := e.beside(i-1, false, e.psi.MaxBond(), func() error { return e.growRight(i) }); err != nil {
			return err
		}
	}
	for i := range e.psi.Center {
		if err := e.halt(); err != nil {
			return err
		}
		if err := e.beside(i, true, e.psi.MaxBond(), func() error { return e.growLeft(i) }); err != nil {
			return err
		}
	}
	return nil
}

// growLeft makes the environment left of site i+1 from that left of site i; growRight that right of site i-1 from that right of site i.
func (e *engine[T]) growLeft(i int) error {
	from, err := e.envs.left(i)
	if err != nil {
		return err
	}
	a := e.psi.Sites[i]
	g := e.plan.LeftIsometry(i, from, a.Structure)
	to := e.envs.fresh(g.Out)
	g.Run(to, from, a, a, &e.work, e.pool)
	e.envs.setLeft(i+1, to)
	e.count(g.Flops())
	e.overlapsLeft(i)
	return nil
}

func (e *engine[T]) growRight(i int) error {
	from, err := e.envs.right(i)
	if err != nil {
		return err
	}
	a := e.psi.Sites[i]
	g := e.plan.RightIsometry(i, from, a.Structure)
	to := e.envs.fresh(g.Out)
	g.Run(to, from, a, a, &e.work, e.pool)
	e.envs.setRight(i-1, to)
	e.growth += e.count(g.Flops())
	e.overlapsRight(i)
	return nil
}

// count adds multiplications and additions to flops, in real operations.
func (e *engine[T]) count(flops float64) float64 {
	if dense.IsComplex[T]() {
		flops *= 4
	}
	e.flops += flops
	return flops
}

// sweep goes right and left once over all bonds, or ends the sweep under way. Told to halt it stops between two updates, or gives up the one at
// hand, and returns why; the chain is then a valid state, and the sweep still under way.
func (e *engine[T]) sweep(s setting) (outcome, error) {
	if e.psi.Len() == 1 {
		e.sweeps++
		return e.single(s)
	}
	if e.way == nil {
		e.sweeps++
		e.way = &passage{next: e.psi.Center}
	}
	for w := e.way; !w.over(); {
		begin, products, flops := time.Now(), e.products, e.flops
		err := e.step(w.next, !w.left, s, &w.out)
		w.out.seconds += time.Since(begin).Seconds()
		if err != nil {
			e.products, e.flops = products, flops // it is done again
			return w.out, err
		}
		w.out.products += e.products - products
		w.out.flops += e.flops - flops
		if w.advance(e.psi.Len() - 1); w.left && w.next == e.psi.Len()-2 {
			e.growth = 0
		}
		if e.onPause != nil {
			if err := e.onPause(); err != nil {
				return w.out, err
			}
		}
	}
	out := e.way.out
	e.way = nil
	return out, nil
}

func (e *engine[T]) step(i int, right bool, s setting, out *outcome) error {
	if err := e.halt(); err != nil {
		return err
	}
	e.pool.Hold()
	defer e.pool.Release()
	e.reseed(i, right)
	update := e.update
	// The overlaps with lower states know nothing of an expanded bond.
	if s.update == OneSite || s.update == Expanding && len(e.lower) == 0 {
		update = e.updateOne
	}
	var energy, discarded, change float64
	err := e.beside(i, right, s.bond, func() (err error) {
		energy, discarded, change, err = update(i, right, s)
		return err
	})
	if err != nil {
		return err
	}
	out.energy = energy
	out.change = max(out.change, change)
	out.discarded = max(out.discarded, discarded)
	out.total += discarded
	out.largest = max(out.largest, e.psi.Bond(i).Dim())
	out.residual = max(out.residual, e.residual)
	out.rest = math.Hypot(out.rest, e.residual)
	out.narrow = max(out.narrow, e.narrow)
	out.gain += e.gain
	if e.onBond != nil {
		bonds, done := e.psi.Len()-1, i+1
		if !right {
			done = 2*bonds - i
		}
		e.onBond(Position{Sweep: e.sweeps, Bond: i, Bonds: bonds, Done: done, Energy: energy})
	}
	return nil
}

// update optimizes sites i and i+1 together (White 1992) and moves the orthogonality centre on. On an error the chain and its environments are
// as they were.
func (e *engine[T]) update(i int, right bool, s setting) (energy, discarded, change float64, err error) {
	left, beyond, err := e.envs.around(i, i+1)
	if err != nil {
		return 0, 0, 0, e.at(i, err)
	}
	a, b := e.psi.Sites[i], e.psi.Sites[i+1]
	p := block.PlanContract(a.Structure, b.Structure, []int{2}, []int{0})
	theta := e.lend(0, p.Out)
	block.RunContract(p, theta.Data, a.Data, b.Data, &e.scratch, e.pool)
	h := e.plan.Project(i, 2, left, beyond, theta.Structure)
	defer h.Release()
	if s.noise > 0 {
		e.shake(theta, s.noise)
	}
	before := e.lend(1, p.Out)
	copy(before.Data, theta.Data)
	if energy, err = e.lowest(h, theta, s); err != nil {
		return 0, 0, 0, e.at(i, err)
	}
	change = distance(before, theta)
	if s.perturbation > 0 {
		a, b, discarded, err = e.splitPerturbed(h, theta, right, s)
	} else {
		a, b, discarded, err = e.split(theta, right, s)
	}
	if err != nil {
		return 0, 0, 0, e.at(i, err)
	}
	return energy, discarded, change, e.move(i, right, a, b)
}

// lend returns tensor k of the two that an update works on, its elements arbitrary; they are lent again for the next update.
func (e *engine[T]) lend(k int, s *block.Structure) *block.Tensor[T] {
	if cap(e.lent[k]) < s.Size {
		e.lent[k] = make([]T, s.Size)
	}
	return &block.Tensor[T]{Structure: s, Data: e.lent[k][:s.Size]}
}

// at names the bond of a failure.
func (e *engine[T]) at(bond int, err error) error {
	if why := e.halt(); why != nil && (errors.Is(err, why) || errors.Is(err, dense.ErrStopped)) {
		return why
	}
	return fmt.Errorf("dmrg: bond %d: %w", bond, err)
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

// A ladder of one site is solved at once: singleVectors bounds the Krylov space of a whole site, and singleNoise lets all states of the sector in. It must not
// be one, or the noise could cancel a sector of one state.
const (
	singleVectors = 256
	singleNoise   = 0.5
)

// single is the sweep of a ladder of one site.
func (e *engine[T]) single(s setting) (outcome, error) {
	left, right, err := e.envs.around(0, 0)
	if err != nil {
		return outcome{}, e.at(0, err)
	}
	theta := e.psi.Sites[0].Clone()
	h := e.plan.Project(0, 1, left, right, theta.Structure)
	defer h.Release()
	products, flops := e.products, e.flops
	e.reseed(0, true)
	e.shake(theta, singleNoise)
	s.vectors = singleVectors
	energy, err := e.lowest(h, theta, s)
	if err != nil {
		return outcome{}, e.at(0, err)
	}
	e.psi.Sites[0] = theta
	return outcome{energy: energy, largest: 1, residual: e.residual, rest: e.residual, narrow: e.narrow, products: e.products - products, flops: e.flops - flops}, nil
}

// lowest replaces theta by the lowest eigenvector that a few Krylov vectors give, and returns its energy.
func (e *engine[T]) lowest(h *mpo.Projected[T], theta *block.Tensor[T], s setting) (float64, error) {
	var halted error
	apply := func(dst, src []T) {
		if halted = e.halt(); halted != nil {
			clear(dst) // ends the iteration
			return
		}
		h.Apply(dst, src, &e.work, e.pool)
		e.products++
		e.count(h.Flops())
	}
	against := e.constraints(h)
	if !e.freed(theta, against) {
		energy := e.blocked(theta, apply)
		return energy, halted
	}
	r := krylov.Lowest(apply, theta.Data, against, krylov.Options{MaxVectors: s.vectors, Tolerance: s.tolerance, Gain: s.least, Pool: e.pool}, &e.kry)
	if halted != nil {
		return 0, halted
	}
	if math.IsNaN(r.Value) || math.IsInf(r.Value, 0) {
		return 0, errors.New("the energy is not finite; look for couplings whose products overflow")
	}
	e.residual, e.gain, e.narrow = r.Residual, r.Start-r.Value, 1/max(r.Gap, leastGap)
	return r.Value, nil
}

// energy returns <H> of the state, from the environments of its centre where they stand.
func (e *engine[T]) energy() (float64, error) {
	c := e.psi.Center
	if !e.envs.stand(c, c) {
		return dense.Real(mpo.Expectation(e.psi, e.op, e.pool)), nil
	}
	left, right, err := e.envs.around(c, c)
	if err != nil {
		return 0, err
	}
	theta := e.psi.Sites[c]
	h := e.plan.Project(c, 1, left, right, theta.Structure)
	defer h.Release()
	out := block.New[T](theta.Structure)
	h.Apply(out.Data, theta.Data, &e.work, e.pool)
	norm := theta.Norm()
	return dense.Real(block.Dot(theta, out)) / (norm * norm), nil
}

// shake adds a random part of relative norm size to theta, inside its blocks.
func (e *engine[T]) shake(theta *block.Tensor[T], size float64) {
	noise := block.New[T](theta.Structure)
	e.randomize(noise)
	norm := noise.Norm()
	if norm == 0 {
		return
	}
	theta.Axpy(dense.FromFloat[T](size*theta.Norm()/norm), noise)
}

// randomize fills the blocks of a tensor.
func (e *engine[T]) randomize(t *block.Tensor[T]) {
	for i := range t.Blocks {
		dense.Random(e.rng, t.Block(i))
	}
}

// split cuts theta by singular values; the centre goes to the right or the left tensor, normalized.
func (e *engine[T]) split(theta *block.Tensor[T], right bool, s setting) (a, b *block.Tensor[T], discarded float64, err error) {
	u, spec, v, err := block.SVD(theta, 2, block.Cut{Bond: s.bond, Weight: s.weight}, &e.factors, e.brief)
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
