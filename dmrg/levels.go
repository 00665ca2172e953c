package dmrg

import (
	"context"
	"errors"
	"math"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mps"
	"rundle/mps/block"
)

// levels finds the states of one total charge one after the other, each orthogonal to those before.
type levels[T dense.Scalar] struct {
	from    *problem
	op      *mpo.Operator[T]
	total   block.Charge
	wrap    func(*mps.Chain[T]) (*mps.State, error)
	found   []*found[T]
	starts  []*mps.Chain[T] // seen on the way: some of them will be near the next state
	cleared float64         // below this no other start led from the last state; -Inf where none tells
}

// found is a state that was found.
type found[T dense.Scalar] struct {
	chain  *mps.Chain[T]
	result *Result
	est    estimate
}

func newLevels[T dense.Scalar](p *problem, op *mpo.Operator[T], total block.Charge, wrap wrapper[T]) *levels[T] {
	return &levels[T]{from: p, op: op, total: total, cleared: math.Inf(-1),
		wrap: func(c *mps.Chain[T]) (*mps.State, error) { return wrap(c, p.frames, p.h.Scope) }}
}

// next searches for the lowest state orthogonal to those found, from a start that it keeps. A search ends before its time where all that is left lies
// above a limit.
func (l *levels[T]) next(start *mps.Chain[T], limit float64) (*Result, error) {
	s := newSearch[T](l.from)
	s.limit = limit
	if len(l.found) > 0 {
		s.opt.weight = max(leastWeight, s.opt.weight*orthogonalWeight)
	}
	s.engine = newEngine(l.op, start, s.opt, l.from.halt)
	s.engine.avoid(l.chains())
	return l.run(s)
}

// run takes a search to its end. Where the context ends it, the result holds the last state, beside the context's error.
func (l *levels[T]) run(s *search[T]) (*Result, error) {
	s.engine.onBond, s.wrap = l.from.opt.OnBond, l.wrap
	verdict, reason, err := s.probed()
	ended := errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded)
	if err != nil && !ended {
		return nil, err
	}
	r, failed := s.result(verdict, reason, ended)
	if failed != nil {
		return nil, failed
	}
	r.Sector = l.from.frames.Values(l.total)
	state, failed := l.wrap(s.engine.psi)
	if failed != nil {
		return nil, failed
	}
	r.State, r.LargestBond = state, state.MaxBond()
	if !l.from.undecided {
		if r.Waypoint, failed = s.waypoint(); failed != nil {
			return nil, failed
		}
	}
	r.Real = !dense.IsComplex[T]()
	l.found = append(l.found, &found[T]{s.engine.psi, r, s.estimate()})
	l.starts, l.cleared = append(l.starts, s.beyond...), s.cleared
	return r, err
}

// orthogonalWeight is the part of the weight that truncations of a level above others may discard: what they discard comes back as an overlap with the
// levels below, which each update takes out again at a cost of its own.
const orthogonalWeight = 1e-4

func (l *levels[T]) chains() []*mps.Chain[T] {
	all := make([]*mps.Chain[T], len(l.found))
	for i, f := range l.found {
		all[i] = f.chain
	}
	return all
}

// exhausted reports whether the sector holds no further state.
func (l *levels[T]) exhausted() bool { return !l.from.starter.holds(l.total, len(l.found)+1) }

// start takes the lowest of the states seen on the way that those found do not span, or else a state made up.
func (l *levels[T]) start() (*mps.Chain[T], error) {
	best, low := -1, math.Inf(1)
	for i, c := range l.starts {
		if c == nil {
			continue
		}
		var inside float64
		for _, f := range l.found {
			a := dense.Abs(mps.Overlap(f.chain, c, nil))
			inside += a * a
		}
		if inside > 0.5 {
			l.starts[i] = nil
			continue
		}
		if e := dense.Real(mpo.Expectation(c, l.op, nil)); e < low {
			best, low = i, e
		}
	}
	if best >= 0 {
		c := l.starts[best]
		l.starts[best] = nil
		return c, nil
	}
	starts, err := otherStarts[T](l.from, l.total, 1, uint64(len(l.found)<<16))
	if err != nil {
		return productChain[T](l.from, l.total)
	}
	return starts[0], nil
}
