package dmrg

import (
	"context"
	"errors"
	"fmt"
	"math"
	"time"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// Ground finds the lowest state of h in a sector by two-site DMRG. Charges that the sector does not name are left free: the
// result is the lowest over all their values, found from starts in several of them, and its Sector names the values found.
//
// An error says what the caller must mend: a sector that the ladder cannot hold, a bad option. If ctx ends, the error is ctx's, and the
// result holds the last state; it is nil if ctx ended while free charges were still being chosen.
func Ground(ctx context.Context, h *ladder.Hamiltonian, sector ladder.Sector, opt Options) (*Result, error) {
	p, err := begun(ctx, h, sector, opt, time.Now())
	if err != nil {
		return nil, err
	}
	defer p.opt.depot.remove()
	if p.rewritten != nil {
		return ground(p, p.rewritten.state)
	}
	if p.strings.Real && !opt.Complex {
		return ground(p, mps.NewReal)
	}
	return ground(p, mps.NewComplex)
}

// begun checks the options and poses the problem; the time is counted from begin.
func begun(ctx context.Context, h *ladder.Hamiltonian, sector ladder.Sector, opt Options, begin time.Time) (*problem, error) {
	if err := opt.check(); err != nil {
		return nil, err
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	p, err := newProblem(h, sector, opt)
	if err != nil {
		return nil, err
	}
	p.halt = func() error {
		if err := ctx.Err(); err != nil {
			return err
		}
		if opt.Time > 0 && time.Since(begin) >= opt.Time {
			return errTime
		}
		return nil
	}
	return p, nil
}

// problem is a Hamiltonian in its frames with a target sector and settled options.
type problem struct {
	h       *ladder.Hamiltonian
	frames  *ladder.Frames
	strings *ladder.Strings
	target  ladder.Target
	starter *starter
	opt     settled
	scale   float64 // largest coupling, 1 if there is none
	halt    func() error

	undecided bool // the time was up while free charges were still being chosen

	rewritten *rewritten // where the search works in other modes than the user's; h is the user's
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
	p := &problem{h: h, frames: frames, strings: s, target: target, opt: settled{Options: opt}}
	if err := p.rewrite(sector); err != nil {
		return nil, err
	}
	p.starter = newStarter(p.strings)
	if p.scale = p.starter.scale; p.scale == 0 {
		p.scale = 1
	}
	p.opt = opt.settle(p.scale)
	return p, nil
}

// wrapper makes the untyped state of a chain.
type wrapper[T dense.Scalar] func(*mps.Chain[T], *ladder.Frames, *ladder.Scope) (*mps.State, error)

// ground runs the search in arithmetic T.
func ground[T dense.Scalar](p *problem, wrap wrapper[T]) (*Result, error) {
	op, err := mpo.Build[T](p.strings, mpo.Options{})
	if err != nil {
		return nil, err
	}
	total, err := pickTotal(p, op)
	if err != nil {
		return nil, err
	}
	s := newSearch[T](p)
	if err := s.begin(p, op, total); err != nil {
		return nil, err
	}
	return newLevels(p, op, total, wrap).run(s)
}

// begin puts an engine at the start, or at the waypoint to go on from.
func (s *search[T]) begin(p *problem, op *mpo.Operator[T], total block.Charge) error {
	if w := p.opt.From; w != nil {
		psi, err := chainOf[T](p, w)
		if err != nil {
			return err
		}
		s.engine = standingEngine(op, psi, p.opt, p.halt)
		return s.goOn(w)
	}
	psi, err := startChain[T](p, total)
	if err != nil {
		return err
	}
	s.engine = newEngine(op, psi, p.opt, p.halt)
	return nil
}

// result gathers what the search found; where it was ended from outside, without what takes time.
func (s *search[T]) result(verdict Verdict, reason string, ended bool) (*Result, error) {
	e, est := s.engine, s.estimate()
	r := &Result{Verdict: verdict, Reason: reason, Sweeps: s.sweeps, Stages: s.reports, OperatorBonds: e.op.BondDims(),
		LargestBond: e.psi.MaxBond(), Energy: math.NaN(), EnergyLimit: est.limit - s.mixing, EnergyError: est.err + s.mixing,
		Variance: math.NaN(), VarianceRounding: math.NaN(), TwoSiteVariance: math.NaN()}
	if gap := seenGap(s.stages); !math.IsInf(gap, 1) {
		r.Gap = gap
	}
	if n := len(s.sweeps); n > 0 {
		r.DiscardedWeight = s.sweeps[n-1].Discarded
	}
	if !ended {
		var err error
		if r.Energy, err = e.energy(); err != nil {
			return nil, err
		}
		if r.TwoSiteVariance, err = e.twoSiteVariance(); err != nil {
			return nil, err
		}
		if s.varianceIsCheap() {
			r.Variance, r.VarianceRounding = mpo.Variance(e.psi, e.op, e.pool)
		}
	}
	if math.IsNaN(r.EnergyLimit) {
		r.EnergyLimit = r.Energy
	}
	r.Flops, r.Escapes = e.flops, s.escapes
	return r, nil
}

// startChain is the given start state where there is one, else a product state of low diagonal energy.
func startChain[T dense.Scalar](p *problem, total block.Charge) (*mps.Chain[T], error) {
	if p.opt.Start != nil {
		return givenChain[T](p, p.opt.Start, total)
	}
	return productChain[T](p, total)
}

// productChain is a product state of low diagonal energy.
func productChain[T dense.Scalar](p *problem, total block.Charge) (*mps.Chain[T], error) {
	states, _, err := p.starter.states(total)
	if err != nil {
		return nil, err
	}
	return mps.Product[T](p.strings.Group, p.strings.Axes, states)
}

// givenChain copies a start state, if it fits.
func givenChain[T dense.Scalar](p *problem, start *mps.State, total block.Charge) (*mps.Chain[T], error) {
	theirs := start.Frames()
	if theirs.Group != p.strings.Group || len(theirs.Sites) != len(p.strings.Axes) {
		return nil, fmt.Errorf("dmrg: the start state has %d sites and charges %v, the Hamiltonian %d and %v", len(theirs.Sites), theirs.Group, len(p.strings.Axes), p.strings.Group)
	}
	c, err := mps.ChainOf[T](start)
	if err != nil {
		return nil, errors.New("dmrg: the start state is complex, this Hamiltonian real; start from a state of a real one, or ask for complex arithmetic (Options.Complex)")
	}
	for i, a := range p.strings.Axes {
		if !c.Sites[i].Axes[1].Equal(a) || theirs.Sites[i].Rotation != p.frames.Sites[i].Rotation {
			return nil, fmt.Errorf("dmrg: site %d of the start state has other local states than the Hamiltonian's; start from a state of a Hamiltonian with the same charges", i)
		}
	}
	if c.Charge() != total {
		return nil, fmt.Errorf("dmrg: the start state lies in the sector %v, not %v", p.frames.Values(c.Charge()), p.frames.Values(total))
	}
	if norm := c.Norm(); !(norm > 0) || math.IsInf(norm, 0) {
		return nil, fmt.Errorf("dmrg: the start state has the norm %v; expected a state that is not zero", norm)
	}
	return c.Clone(), nil
}
