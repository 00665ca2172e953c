package dmrg

import (
	"errors"
	"fmt"
	"math"
	"time"

	"rundle/internal/dense"
	"rundle/mps"
)

// Figures of the automatic schedule. They set the pace, not the answer: a stage ends by the energies it reached.
const (
	firstBond         = 24
	leastGrowth       = 8    // states that a stage has more than the one before, at the least
	maxCleanStage     = 12   // clean sweeps of a stage whose bond is full
	maxCleanWhole     = 60   // clean sweeps of a stage that truncates next to nothing: only sweeping gains more
	maxStages         = 40   // of a search whose bond is not full
	firstPerturbation = 1e-3 // weight of the perturbation in the first sweep
	laterPerturbation = 1e-4 // the same, on the way to a larger bond
	checkPerturbation = 1e-6 // the same, where the stage before left the bond unfilled: to see that no sector was missed
	perturbationDecay = 0.1
	farOff            = 10    // gain in units of the precision, of a stage that another one follows
	passingDrift      = 0.3   // in units of the gain, of the same
	stateRounding     = 1e-12 // change of a tensor that is rounding
	firstSweeps       = 2
	vectorsEarly      = 6 // of the first sweeps
	vectorsLate       = 5
	vectorsWhole      = 16 // where nothing is truncated the middle bonds hold the whole problem
)

// search is one run of the engine to a verdict.
type search[T dense.Scalar] struct {
	engine *engine[T]
	from   *problem
	opt    settled
	scale  float64
	wrap   func(*mps.Chain[T]) (*mps.State, error)

	journal      journal // what follows, and what the schedule does next, is a function of it
	nextPause    time.Time
	fresh        bool    // the last sweep was done, not read in the journal
	stagesBefore int     // settled when the waypoint to go on from was saved
	gained       float64 // by the updates of the last half sweep
	narrow       float64 // largest inverse gap since the bond dimension was last raised
	stages       []settledStage
	sweeps       []Sweep
	reports      []Stage

	beyond  []*mps.Chain[T] // states of other starts, or left for lower ones
	limit   float64         // a search that can end only above it ends at once; +Inf: none
	warm    bool            // the start is near the state looked for
	assists int             // helps that a slow search got
	escapes int             // lower states found from other starts
	mixing  float64         // energy that a mixture with them would gain
	cleared float64         // below this no other start led, where a probe ended above; else -Inf
}

// newSearch is a search that lacks its engine.
func newSearch[T dense.Scalar](p *problem) *search[T] {
	return &search[T]{from: p, opt: p.opt, scale: p.scale, limit: math.Inf(1), cleared: math.Inf(-1)}
}

// errTime stops a search at its cap on time.
var errTime = errors.New("the time is up")

// run sweeps until the error estimate is below the wanted precision or a cap is met. An error of the context or the numerics ends it; the
// chain then holds the last state.
func (s *search[T]) run() (Verdict, string, error) {
	if c := s.engine.psi.Center; !s.engine.envs.stand(c, c) {
		if err := s.engine.prepare(); err != nil {
			return s.ended(err)
		}
	}
	s.schedulePause(0)
	s.engine.onPause = s.pause
	if len(s.opt.Schedule) > 0 {
		verdict, reason, err := s.follow()
		if err != nil {
			return s.ended(err)
		}
		return verdict, reason, nil
	}
	bond := s.journal.look("first bond", func() int {
		return s.affordable(1, min(s.opt.Bond, max(firstBond, s.engine.psi.MaxBond())))
	})
	for forward := false; ; {
		verdict, reason, err := s.next(&bond, forward)
		if forward = false; err != nil {
			if verdict, reason, err = s.ended(err); err != nil {
				return unfinished, "", err
			}
		}
		est := s.estimate()
		if s.settledTwice() && s.precise(est) {
			return Converged, "", nil
		}
		if verdict != unfinished {
			return verdict, reason, nil
		}
		if s.settledTwice() && est.limit-est.err > s.limit {
			return Suspect, "the level lies above those asked for: it was not searched for to the end", nil
		}
		if est.rounding > s.opt.Precision && est.above < 4*est.rounding && s.settledTwice() {
			return Suspect, fmt.Sprintf("the wanted precision %.1e is below the rounding error %.1e of an energy of this size; ask for less", s.opt.Precision, est.rounding), nil
		}
		if helped, err := s.assist(); err != nil {
			return s.ended(err)
		} else if helped {
			return s.run()
		}
		last := &s.stages[len(s.stages)-1]
		if last.largest < bond && len(s.stages) >= 2 {
			// The truncation is limited by the weight, not by the bond: keep more.
			if s.opt.weight <= leastWeight || len(s.stages) > maxStages {
				return Suspect, fmt.Sprintf("the energy still drifts by %.1e a sweep at full accuracy: rounding errors, or a state that sweeping does not settle", last.drift()), nil
			}
			s.opt.weight = max(leastWeight, s.opt.weight*1e-2)
			continue
		}
		if verdict, reason = s.grow(&bond, est); verdict != unfinished {
			return verdict, reason, nil
		}
		forward = true
	}
}

// next settles a bond dimension; forward: one at about the larger bond dimension given, which it sets.
func (s *search[T]) next(bond *int, forward bool) (Verdict, string, error) {
	if !forward {
		return s.stage(*bond)
	}
	if v, r, err := s.walk(bond); v != unfinished || err != nil {
		return v, r, err
	}
	return s.settle(*bond)
}

// ended makes a verdict of the cap on time; other errors pass.
func (s *search[T]) ended(err error) (Verdict, string, error) {
	if errors.Is(err, errTime) {
		return TimeCap, fmt.Sprintf("%v have passed; allow more time, or start from the saved state", s.opt.Time), nil
	}
	return unfinished, "", err
}

// grow raises the bond dimension within the caps; where none is left it says which, after a second stage.
func (s *search[T]) grow(bond *int, est estimate) (Verdict, string) {
	next := s.nextBond(*bond)
	able := s.journal.look("bond", func() int { return s.affordable(*bond, next) })
	// A little more is not worth a stage, unless the cap allows no more.
	if able < next && able < *bond+min(leastGrowth, next-*bond) {
		able = *bond
	}
	if able > *bond || len(s.stages) < 2 {
		*bond = able
		return unfinished, ""
	}
	if next == *bond {
		return BondCap, fmt.Sprintf("bond dimension %d reached with an error of %.1e; allow a larger bond", *bond, est.err)
	}
	return MemoryCap, fmt.Sprintf("bond dimension %d fits the memory with an error of %.1e; %d would need about %.3g MiB", *bond, est.err, next, s.expected(next).least()/(1<<20))
}

// estimate is the error estimate after the last stage.
func (s *search[T]) estimate() estimate {
	return estimateError(s.stages, s.scale, s.engine.psi.Len())
}

// settledTwice asks that two stages, each with fresh perturbation, agree: one stage alone may sit in a product state.
func (s *search[T]) settledTwice() bool {
	n := len(s.stages)
	if n < 2 || !s.stages[n-1].settling() {
		return false
	}
	a, b := &s.stages[n-2], &s.stages[n-1]
	return math.Abs(a.energy()-b.energy()) <= max(s.opt.Precision, 3*a.gain, s.rounding(b))
}

// stage settles one bond dimension: sweeps with decreasing perturbation, then clean sweeps.
func (s *search[T]) stage(bond int) (Verdict, string, error) {
	s.narrow = 0
	for _, set := range s.opening(bond) {
		if v, r, err := s.sweep(set); v != unfinished || err != nil {
			return v, r, err
		}
	}
	return s.settle(bond)
}

// settle does clean sweeps until one more would not matter.
func (s *search[T]) settle(bond int) (Verdict, string, error) {
	set := s.clean(bond)
	s.stages = append(s.stages, settledStage{bond: bond})
	st := &s.stages[len(s.stages)-1]
	for k := 0; k < maxCleanStage || (k < maxCleanWhole && s.whole(st)); k++ {
		if s.whole(st) {
			set.vectors = vectorsWhole
		}
		v, r, err := s.sweep(set)
		if len(st.energies) == 0 {
			s.stages = s.stages[:len(s.stages)-1]
		}
		if v != unfinished || err != nil {
			return v, r, err
		}
		if st.settling() && s.enough(st) {
			break
		}
	}
	return unfinished, "", s.report(bond)
}

// clean is the setting of a clean sweep.
func (s *search[T]) clean(bond int) setting {
	return setting{bond: bond, weight: s.opt.weight, vectors: vectorsLate, tolerance: s.tolerance()}
}

// share is that of a bond in an energy.
func (s *search[T]) share(energy float64) float64 { return energy / float64(s.engine.psi.Len()) }

// report tells of a settled stage.
func (s *search[T]) report(bond int) error {
	last := &s.stages[len(s.stages)-1]
	report := Stage{Bond: bond, Energy: last.energy(), Discarded: s.sweeps[len(s.sweeps)-1].Discarded}
	s.reports = append(s.reports, report)
	if s.opt.OnStage == nil || !s.fresh {
		return nil
	}
	var err error
	if report.State, err = s.wrap(s.engine.psi); err != nil {
		return err
	}
	s.opt.OnStage(report)
	return nil
}

// enough ends a stage when further sweeps would gain less than the precision or rounding, or much less than the truncation costs.
// A stage far from the wish, which a larger bond follows, is left as soon as truncation costs more than sweeping on would gain.
func (s *search[T]) enough(st *settledStage) bool {
	if passing := st.bond < s.opt.Bond && st.gain > farOff*s.opt.Precision; passing && st.drift() < passingDrift*st.gain {
		return true
	}
	return st.drift() <= max(0.1*s.opt.Precision, 0.02*st.gain, s.rounding(st)) && s.stateSettled(st)
}

func (s *search[T]) rounding(st *settledStage) float64 {
	return roundingOf(st.energy(), s.scale, s.engine.psi.Len())
}

// whole reports whether the last clean sweep truncated no more than the precision allows at every bond.
func (s *search[T]) whole(st *settledStage) bool {
	return len(st.energies) > 0 && st.discarded <= s.opt.weight*float64(s.engine.psi.Len())
}

// stateSettled reports whether the last sweep changed the state by less than observables may err, or no more than truncation itself
// does, which changes a tensor by the root of its discarded weight at every visit. The energy alone cannot tell: it errs as the square.
func (s *search[T]) stateSettled(st *settledStage) bool {
	return st.change <= max(0.3*s.opt.ObservablePrecision, 2*math.Sqrt(st.discarded), stateRounding)
}

// precise reports whether the last stage meets both wishes: the energy's by its estimate, for the limit and the state itself, the observables' (where
// the user named it) by the change of the last sweep and the root of the discarded weight.
func (s *search[T]) precise(est estimate) bool {
	last := &s.stages[len(s.stages)-1]
	if est.above > s.opt.Precision || !s.stateSettled(last) {
		return false
	}
	return !s.opt.strict || math.Sqrt(last.discarded) <= s.opt.ObservablePrecision
}

// sweep runs one sweep, records it, and checks the caps.
func (s *search[T]) sweep(set setting) (Verdict, string, error) {
	if len(s.sweeps) >= s.opt.Sweeps {
		return SweepCap, fmt.Sprintf("%d sweeps done; allow more sweeps", len(s.sweeps)), nil
	}
	s.fresh = s.journal.live()
	out, err := learn(&s.journal, kindSweep, set, func() (outcome, error) { return s.engine.sweep(set) })
	if err != nil {
		return unfinished, "", err
	}
	s.narrow, s.gained = max(s.narrow, out.narrow), out.gain
	if n := len(s.stages); n > 0 && set.clean() {
		st := &s.stages[n-1]
		st.energies = append(st.energies, out.energy)
		st.discarded, st.largest, st.rest, st.gain, st.change = out.total, out.largest, out.rest, out.gain, out.change
		st.narrow = s.narrow
	}
	w := Sweep{Number: len(s.sweeps) + 1, Bond: set.bond, Perturbation: set.perturbation, Energy: out.energy, Discarded: out.discarded,
		Residual: out.residual, LargestBond: out.largest, Products: out.products, Flops: out.flops, Seconds: out.seconds}
	s.sweeps = append(s.sweeps, w)
	if s.fresh && s.opt.OnSweep != nil {
		s.opt.OnSweep(w)
	}
	return unfinished, "", nil
}

// tolerance is the residual to which the eigenvector of a bond is solved: energies err as its square, observables linearly.
func (s *search[T]) tolerance() float64 {
	t := 0.03 * min(math.Sqrt(s.opt.Precision*s.scale), s.opt.ObservablePrecision*s.scale)
	return max(t, 1e-14*s.scale)
}
