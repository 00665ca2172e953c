package dmrg

import (
	"context"
	"errors"
	"fmt"
	"math"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// Ground finds the lowest state of h in a sector by two-site DMRG. Charges that the sector does not name are left free: the
// result is the lowest over all their values, found from starts in several of them, and its Sector names the values found.
//
// An error says what the caller must mend: a sector that the ladder cannot hold, a bad option. If ctx ends, the result holds
// the last state and the error is ctx's.
func Ground(ctx context.Context, h *ladder.Hamiltonian, sector ladder.Sector, opt Options) (*Result, error) {
	p, err := newProblem(h, sector, opt)
	if err != nil {
		return nil, err
	}
	if p.strings.Real {
		return ground(ctx, p, mps.NewReal)
	}
	return ground(ctx, p, mps.NewComplex)
}

// problem is a Hamiltonian in its frames with a target sector and settled options.
type problem struct {
	h       *ladder.Hamiltonian
	frames  *ladder.Frames
	strings *ladder.Strings
	target  ladder.Target
	opt     settled
	scale   float64 // largest coupling
}

func newProblem(h *ladder.Hamiltonian, sector ladder.Sector, opt Options) (*problem, error) {
	frames, err := h.Frames(ladder.FrameOptions{Charges: opt.Charges, Complex: opt.Complex})
	if err != nil {
		return nil, err
	}
	target, err := frames.Target(sector)
	if err != nil {
		return nil, err
	}
	s, err := frames.Strings(h.Poly)
	if err != nil {
		return nil, err
	}
	p := &problem{h: h, frames: frames, strings: s, target: target}
	for _, c := range s.Coef {
		p.scale = max(p.scale, math.Hypot(real(c), imag(c)))
	}
	if p.scale == 0 {
		p.scale = 1
	}
	p.opt, err = opt.settle(p.scale)
	return p, err
}

// ground runs the search in arithmetic T; wrap makes the untyped state.
func ground[T dense.Scalar](ctx context.Context, p *problem, wrap func(*mps.Chain[T], *ladder.Frames, *ladder.Scope) (*mps.State, error)) (*Result, error) {
	op, err := mpo.Build[T](p.strings, mpo.Options{})
	if err != nil {
		return nil, err
	}
	total, err := p.pickTotal(ctx, func(q block.Charge) (float64, error) { return scout[T](ctx, p, op, q) })
	if err != nil {
		return nil, err
	}
	psi, err := startChain[T](p, total)
	if err != nil {
		return nil, err
	}
	toState := func(c *mps.Chain[T]) *mps.State {
		s, err := wrap(c, p.frames, p.h.Scope)
		if err != nil {
			panic(fmt.Sprintf("dmrg: a state of the search does not fit its frames: %v", err))
		}
		return s
	}
	e := newEngine(op, psi, p.opt.Threads, p.opt.Seed)
	e.onBond = p.opt.OnBond
	s := &search[T]{engine: e, opt: p.opt, scale: p.scale, wrap: toState}
	verdict, reason, est, err := s.run(ctx)
	r := &Result{State: toState(e.psi), Verdict: verdict, Reason: reason, Sweeps: s.sweeps, Stages: s.reports,
		Sector: p.frames.Values(total), OperatorBonds: op.BondDims(), LargestBond: e.psi.MaxBond(),
		Energy: math.NaN(), EnergyLimit: est.limit, EnergyError: est.err}
	if n := len(s.sweeps); n > 0 {
		r.DiscardedWeight = s.sweeps[n-1].Discarded
	}
	if err != nil && (errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded)) {
		return r, err
	}
	if err != nil {
		return nil, err
	}
	r.Energy = dense.Real(mpo.Expectation(e.psi, op, e.pool))
	return r, nil
}

// startChain is the given start state where it fits, else a product state of low diagonal energy.
func startChain[T dense.Scalar](p *problem, total block.Charge) (*mps.Chain[T], error) {
	if p.opt.Start != nil {
		return givenChain[T](p, total)
	}
	return productChain[T](p, total)
}

func productChain[T dense.Scalar](p *problem, total block.Charge) (*mps.Chain[T], error) {
	states, _, err := startStates(p.strings, total)
	if err != nil {
		return nil, err
	}
	return mps.Product[T](p.strings.Group, p.strings.Axes, states)
}

func givenChain[T dense.Scalar](p *problem, total block.Charge) (*mps.Chain[T], error) {
	c, err := mps.ChainOf[T](p.opt.Start)
	if err != nil {
		return nil, fmt.Errorf("dmrg: the start state does not fit: %w", err)
	}
	if c.Group != p.strings.Group || c.Len() != len(p.strings.Axes) {
		return nil, fmt.Errorf("dmrg: the start state has %d sites and charges %v, the Hamiltonian %d and %v", c.Len(), c.Group, len(p.strings.Axes), p.strings.Group)
	}
	for i, a := range p.strings.Axes {
		if !c.Sites[i].Axes[1].Equal(a) {
			return nil, fmt.Errorf("dmrg: site %d of the start state has other local states than the Hamiltonian's", i)
		}
	}
	if c.Charge() != total {
		return nil, fmt.Errorf("dmrg: the start state lies in the sector %v, not %v", p.frames.Values(c.Charge()), p.frames.Values(total))
	}
	return c.Clone(), nil
}

// Settings of the short runs that choose among the values of free charges.
const (
	scoutBond   = 32
	scoutSweeps = 3
	scoutLimit  = 4096 // values of the free charges looked at
)

// scout returns the energy of a short run in a sector.
func scout[T dense.Scalar](ctx context.Context, p *problem, op *mpo.Operator[T], total block.Charge) (float64, error) {
	psi, err := productChain[T](p, total)
	if err != nil {
		return 0, err
	}
	e := newEngine(op, psi, p.opt.Threads, p.opt.Seed)
	var energy float64
	set := setting{bond: scoutBond, weight: 1e-10, mixing: 1e-3, noise: 1e-2, vectors: vectorsEarly, tolerance: 1e-6 * p.scale}
	for k := 0; k <= scoutSweeps; k++ {
		if k == scoutSweeps {
			set.mixing, set.noise = 0, 0
		}
		out, err := e.sweep(ctx, set)
		if err != nil {
			return 0, err
		}
		energy = out.energy
		set.mixing *= 0.1
		set.noise *= 0.3
	}
	return energy, nil
}
