package dmrg

import (
	"errors"
	"math"
	"math/rand/v2"

	"rundle/internal/dense"
	"rundle/mps"
	"rundle/mps/block"
)

// Figures of the probes that guard the verdict Converged.
const (
	probeShare  = 0.25 // of the operations of the search
	probeBlink  = 4e7  // operations, where that is less
	probeBond   = 16   // of the first stage
	probeGrowth = 2    // factor between stages
	probeStates = 3    // searched for at once
	mixedBond   = 6    // of the random part of the start
	mostEscapes = 6    // lower states that a search goes on from
	mostAssists = 3    // for a search that does not settle

	probeStream = 0x70726f6265 // sets its random numbers apart
)

// probed runs the search to a verdict that other starts do not contradict.
//
// Error estimate and variance are blind to a search that sits in an excited eigenstate, or that never came near the lowest state. So before a state is
// called converged, a probe looks for a lower one from another start: at a low bond dimension, orthogonal to the state and to those below it, so that it
// cannot fall into the same. By the interlacing of eigenvalues the lowest energy there is that of the next level where the state is the lowest, and
// that of the lowest level where it is not. If the probe comes out below the error bar the search goes on from what it found. The probe grows
// until its own error bar lies above the state, or its share of the operations is spent; a search that leaves a smaller trap than the probe can
// resolve by then stays unnoticed.
func (s *search[T]) probed() (Verdict, string, error) {
	for {
		verdict, reason, err := s.run()
		if err != nil || verdict != Converged || s.opt.Unprobed || len(s.opt.Schedule) > 0 {
			return verdict, reason, err
		}
		a, err := learn(&s.journal, kindProbe, s.escapes, s.look)
		if err != nil {
			return s.ended(err)
		}
		if s.mixing = a.Mixing; a.Clear {
			s.cleared = a.Cleared
		}
		if !a.Moved {
			return verdict, reason, nil
		}
		s.stages, s.mixing = nil, 0
		if s.escapes++; s.escapes > mostEscapes {
			return Suspect, "searches from other starts keep finding lower states; start from a state nearer to the lowest (Options.Start)", nil
		}
	}
}

// excursion is what the schedule learns from a probe or an assist. Where it moved, the state is another now.
type excursion struct {
	Moved   bool    `json:"moved"`
	Mixing  float64 `json:"mixing"` // energy that a mixture would gain
	Clear   bool    `json:"clear"`  // the probe ended above; its lower bound is
	Cleared float64 `json:"cleared"`
}

// look sends a probe and moves where it leads lower.
func (s *search[T]) look() (a excursion, err error) {
	f, err := s.probe()
	if f == nil || err != nil {
		return a, err
	}
	was, next := s.engine.psi, f.states[0]
	if !f.lower {
		if next, a.Mixing, err = s.mix(f); err != nil {
			return a, err
		}
	}
	switch {
	case next == nil:
		s.beyond = append(s.beyond, f.states[0])
		a.Cleared = f.est.limit - f.est.err
		if a.Clear = !math.IsInf(a.Cleared, 0) && !math.IsNaN(a.Cleared); !a.Clear {
			a.Cleared = 0
		}
		return a, nil
	case f.lower:
		s.beyond = append(s.beyond, was)
	}
	a.Moved = true
	s.exchange(next)
	return a, nil
}

// finding is what a probe came to.
type finding[T dense.Scalar] struct {
	states []*mps.Chain[T] // lowest first
	est    estimate        // of the energy of the first
	lower  bool            // than the error bar of the search allows
}

// mix looks for the lowest combination of the state with those that the probe found. What it gains belongs to the error of the energy; where that is more
// than the precision allows, mix returns the combination.
func (s *search[T]) mix(f *finding[T]) (next *mps.Chain[T], gain float64, err error) {
	e := s.engine
	all := append([]*mps.Chain[T]{e.psi}, f.states...)
	sp := spanOf(e.op, all, e.pool)
	values, vectors, err := sp.ritz()
	if err != nil {
		return nil, 0, err
	}
	gain = max(0, dense.Real(sp.energy[0])-values[0])
	if est := s.estimate(); est.above+2*gain <= s.opt.Precision || gain <= est.rounding {
		return nil, gain, nil
	}
	return combination(all, vectors, len(values), 0), gain, nil
}

// exchange replaces the state of the search by another; the environments are to be made.
func (s *search[T]) exchange(to *mps.Chain[T]) {
	e := s.engine
	s.engine = s.anew(to)
	s.engine.sweeps, s.engine.products, s.engine.flops, s.engine.growth = e.sweeps, e.products, e.flops, e.growth
	s.engine.onBond, s.engine.onPause = e.onBond, e.onPause
}

// anew makes an engine like the present one for another state.
func (s *search[T]) anew(psi *mps.Chain[T]) *engine[T] {
	e := newEngine(s.engine.op, psi, s.opt, s.engine.halt)
	e.avoid(s.lower())
	return e
}

// sluggish reports whether a stage ended while sweeping on would still gain what matters, though nothing is truncated: then the bond holds
// too few states for corrections to travel, such as long waves of few particles.
func (s *search[T]) sluggish() bool {
	if s.engine.psi.Len() == 1 || len(s.stages) == 0 || s.opt.Unprobed {
		return false
	}
	st := &s.stages[len(s.stages)-1]
	return s.whole(st) && !s.enough(st) && st.drift() > s.rounding(st)
}

// assist helps a sluggish search; it reports whether the state is a lower one now.
func (s *search[T]) assist() (bool, error) {
	if !s.sluggish() || s.assists == mostAssists {
		return false, nil
	}
	a, err := learn(&s.journal, kindAssist, s.assists, s.join)
	s.assists++
	if a.Moved {
		s.stages = nil
	}
	return a.Moved, err
}

// join lets the state go on in a bundle with others, whose bond holds more, and takes the lowest that comes of it.
func (s *search[T]) join() (a excursion, err error) {
	starts, err := s.otherStarts()
	if err != nil {
		return a, nil // the charges are too many to draw from
	}
	q := s.spare(append([]*mps.Chain[T]{s.engine.psi.Clone()}, starts...), max(probeShare*s.engine.flops, probeBlink))
	q.fresh = false
	if err = q.prepare(); err == nil {
		err = q.stage(max(probeBond, s.engine.psi.MaxBond()))
	}
	if err != nil && !errors.Is(err, errSpent) {
		return a, err
	}
	s.engine.flops += q.flops
	if a.Moved = q.values[0] < s.stages[len(s.stages)-1].energy(); a.Moved {
		s.exchange(q.chain(0))
	}
	return a, nil
}

// errSpent ends a probe at its share of the operations.
var errSpent = errors.New("the share of the probe is spent")

// probe searches from another start, orthogonal to the state found. It returns nil where no state is left, or no start to be had.
func (s *search[T]) probe() (*finding[T], error) {
	psi := s.engine.psi
	if psi.Len() == 1 || !s.from.starter.holds(psi.Charge(), len(s.engine.lower)+2) {
		return nil, nil
	}
	starts, err := s.otherStarts()
	if err != nil {
		return nil, nil // the charges are too many to draw from
	}
	q := s.spare(starts, max(probeShare*s.engine.flops, probeBlink))
	q.avoid([]*mps.Chain[T]{psi})
	f, err := s.compare(q)
	if err == nil {
		s.engine.flops += q.flops
	}
	return f, err
}

// otherStarts are the starts of the next probe.
func (s *search[T]) otherStarts() ([]*mps.Chain[T], error) {
	n := 1
	for n < probeStates && s.from.starter.holds(s.engine.psi.Charge(), len(s.engine.lower)+2+n) {
		n++ // no more than there are
	}
	return otherStarts[T](s.from, s.engine.psi.Charge(), n, uint64(s.escapes+len(s.engine.lower)<<8))
}

// spare is a search for several states, orthogonal to the same lower ones, that ends with errSpent after so many operations.
func (s *search[T]) spare(starts []*mps.Chain[T], budget float64) *bundleSearch[T] {
	var q *bundleSearch[T]
	halt := func() error {
		if q.flops > budget {
			return errSpent
		}
		return s.engine.halt()
	}
	opt := s.opt
	opt.Seed += probeStream
	q = newBundleSearch(s.engine.op, starts, opt, s.scale, halt)
	q.avoid(s.lower())
	return q
}

// compare sends a probe on until it is below the state or above it beyond doubt.
func (s *search[T]) compare(q *bundleSearch[T]) (*finding[T], error) {
	own := s.estimate()
	q.below = own.limit - own.err
	if err := q.prepare(); err != nil {
		return nil, err
	}
	top := max(probeBond, s.engine.psi.MaxBond())
	for bond := min(probeBond, s.opt.Bond); ; bond = min(top, probeGrowth*bond) {
		err := q.stage(bond)
		if err != nil && !errors.Is(err, errSpent) {
			return nil, err
		}
		f := &finding[T]{states: q.chains(), est: q.estimate(0), lower: q.values[0] < q.below}
		if err != nil || f.lower || f.est.limit-f.est.err > own.limit+own.err || bond >= top {
			return f, nil
		}
	}
}

// lower are the states that the search stays orthogonal to.
func (s *search[T]) lower() []*mps.Chain[T] {
	var all []*mps.Chain[T]
	for _, l := range s.engine.lower {
		all = append(all, l.psi)
	}
	return all
}

// otherStarts are up to n random states of a low bond dimension, the first one with the product state of lowest diagonal energy in equal parts. salt
// makes them others.
func otherStarts[T dense.Scalar](p *problem, total block.Charge, n int, salt uint64) (starts []*mps.Chain[T], err error) {
	rng := rand.New(rand.NewPCG(p.opt.Seed, probeStream+salt))
	for range n {
		random, err := mps.Random[T](p.strings.Group, p.strings.Axes, total, mixedBond, rng)
		if err != nil {
			return nil, err
		}
		starts = append(starts, random)
	}
	product, err := productChain[T](p, total)
	if err != nil {
		return nil, err
	}
	one := dense.FromFloat[T](1)
	starts[0] = mps.Add(one, starts[0], one, product)
	return starts, nil
}
