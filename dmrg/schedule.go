package dmrg

import (
	"context"
	"fmt"
	"math"
	"time"

	"rundle/internal/dense"
	"rundle/mps"
)

// Figures of the automatic schedule. They set the pace, not the answer: a stage ends by the energies it reached.
const (
	firstBond     = 24
	bondGrowth    = 1.6  // factor between stages
	maxCleanStage = 12   // clean sweeps of a stage whose bond is full
	maxCleanWhole = 60   // clean sweeps of a stage that truncates next to nothing: only sweeping gains more
	firstMixing   = 1e-3 // weight of the perturbation in the first sweep of a stage
	checkMixing   = 1e-6 // the same, where the stage before left the bond unfilled: to see that no sector was missed
	mixingDecay   = 0.1
	stateRounding = 1e-12 // change of a tensor that is rounding
	vectorsEarly  = 10
	vectorsLate   = 5
	vectorsWhole  = 16 // where nothing is truncated the middle bonds hold the whole problem
)

// search is one run of the engine to a verdict.
type search[T dense.Scalar] struct {
	engine *engine[T]
	opt    settled
	scale  float64
	wrap   func(*mps.Chain[T]) *mps.State

	stages  []settledStage
	sweeps  []Sweep
	reports []Stage
	start   time.Time
}

// run sweeps until the error estimate is below the wanted precision or a cap is met. A cancelled context ends it with its error;
// the chain then holds the last state.
func (s *search[T]) run(ctx context.Context) (Verdict, string, estimate, error) {
	s.start = time.Now()
	bond := min(firstBond, s.opt.Bond)
	if d := s.engine.psi.MaxBond(); d > bond {
		bond = min(d, s.opt.Bond)
	}
	for {
		verdict, reason, err := s.stage(ctx, bond)
		if err != nil {
			return verdict, reason, estimate{limit: math.NaN(), err: math.Inf(1)}, err
		}
		est := s.estimate()
		if verdict != unfinished {
			if len(s.stages) > 0 && s.precise(est) {
				return Converged, "", est, nil
			}
			return verdict, reason, est, nil
		}
		if s.precise(est) && s.settledTwice() {
			return Converged, "", est, nil
		}
		last := s.stages[len(s.stages)-1]
		if last.largest >= bond || len(s.stages) < 2 {
			if bond == s.opt.Bond && len(s.stages) >= 2 && last.largest >= bond {
				return BondCap, fmt.Sprintf("bond dimension %d reached with an error of %.1e; allow a larger bond", bond, est.err), est, nil
			}
			next := min(s.opt.Bond, max(bond+8, int(bondGrowth*float64(bond))))
			if need := s.bytesAt(next); s.opt.Memory > 0 && need > s.opt.Memory && next > bond {
				return MemoryCap, fmt.Sprintf("bond dimension %d would need about %d MiB", next, need>>20), est, nil
			}
			bond = next
			continue
		}
		// The truncation is limited by the weight, not by the bond: keep more.
		if s.opt.weight <= 1e-26 || len(s.stages) > 40 {
			return Suspect, fmt.Sprintf("the energy still drifts by %.1e a sweep at full accuracy; the wanted precision is below the rounding error of this Hamiltonian", last.drift()), est, nil
		}
		s.opt.weight = max(1e-26, s.opt.weight*1e-2)
	}
}

// estimate is the error estimate after the last stage.
func (s *search[T]) estimate() estimate {
	if len(s.stages) == 0 || len(s.stages[len(s.stages)-1].energies) == 0 {
		return estimate{limit: math.NaN(), err: math.Inf(1)}
	}
	return estimateError(s.stages, s.scale, s.engine.psi.Len())
}

// settledTwice asks that two stages, each with fresh mixing, agree: one stage alone may sit in a product state.
func (s *search[T]) settledTwice() bool {
	n := len(s.stages)
	if n < 2 {
		return false
	}
	a, b := s.stages[n-2], s.stages[n-1]
	return math.Abs(a.energy()-b.energy()) <= math.Max(s.opt.Precision, 2*math.Abs(a.discarded)*s.scale*10)
}

// stage settles one bond dimension: sweeps with decreasing mixing, then clean sweeps.
func (s *search[T]) stage(ctx context.Context, bond int) (Verdict, string, error) {
	first := len(s.stages) == 0
	set := setting{bond: bond, weight: s.opt.weight, vectors: vectorsLate, tolerance: s.tolerance()}
	if s.opt.Opening != Unperturbed && s.engine.psi.Len() > 1 {
		count := 2
		set.mixing = firstMixing
		switch {
		case first:
			count = 4
		case s.stages[len(s.stages)-1].largest < s.stages[len(s.stages)-1].bond:
			count, set.mixing = 1, checkMixing
		}
		for k := 0; k < count; k++ {
			set.noise, set.vectors = 0, vectorsLate
			if first {
				set.vectors = vectorsEarly
				set.noise = 0.1 * math.Sqrt(set.mixing)
			}
			if v, r, err := s.sweep(ctx, set); v != unfinished || err != nil {
				return v, r, err
			}
			set.mixing *= mixingDecay
		}
	}
	set.mixing, set.noise = 0, 0
	s.stages = append(s.stages, settledStage{bond: bond})
	st := &s.stages[len(s.stages)-1]
	for k := 0; k < maxCleanStage || (k < maxCleanWhole && s.whole(st)); k++ {
		if s.whole(st) {
			set.vectors = vectorsWhole
		}
		v, r, err := s.sweep(ctx, set)
		if err != nil || (v != unfinished && len(st.energies) == 0) {
			s.stages = s.stages[:len(s.stages)-1]
			return v, r, err
		}
		if v != unfinished {
			return v, r, nil
		}
		if len(st.energies) >= 2 && s.enough(st) {
			break
		}
	}
	report := Stage{Bond: bond, Energy: st.energy(), Discarded: s.sweeps[len(s.sweeps)-1].Discarded}
	s.reports = append(s.reports, report)
	if s.opt.OnStage != nil {
		report.State = s.wrap(s.engine.psi)
		s.opt.OnStage(report)
	}
	return unfinished, "", nil
}

// enough ends a stage when further sweeps would gain less than the precision, or much less than the truncation costs.
func (s *search[T]) enough(st *settledStage) bool {
	d := st.drift()
	return (d <= 0.1*s.opt.Precision || d <= 0.05*s.scale*st.discarded) && s.stateSettled(st)
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

// precise reports whether the last stage meets both wishes: the energy's by its estimate, the observables' (where the user named
// it) by the change of the last sweep and the root of the discarded weight.
func (s *search[T]) precise(est estimate) bool {
	last := &s.stages[len(s.stages)-1]
	if est.err > s.opt.Precision || !s.stateSettled(last) {
		return false
	}
	return !s.opt.strict || math.Sqrt(last.discarded) <= s.opt.ObservablePrecision
}

// sweep runs one sweep, records it, and checks the caps.
func (s *search[T]) sweep(ctx context.Context, set setting) (Verdict, string, error) {
	begin := time.Now()
	if len(s.sweeps) >= s.opt.Sweeps {
		return SweepCap, fmt.Sprintf("%d sweeps done; allow more sweeps", len(s.sweeps)), nil
	}
	out, err := s.engine.sweep(ctx, set)
	if err != nil {
		return unfinished, "", err
	}
	if n := len(s.stages); n > 0 && set.mixing == 0 {
		st := &s.stages[n-1]
		st.energies, st.discarded, st.largest, st.change = append(st.energies, out.energy), out.total, out.largest, out.change
	}
	w := Sweep{Number: len(s.sweeps) + 1, Bond: set.bond, Mixing: set.mixing, Energy: out.energy, Discarded: out.discarded,
		Residual: out.residual, LargestBond: out.largest, Seconds: since(begin)}
	s.sweeps = append(s.sweeps, w)
	if s.opt.OnSweep != nil {
		s.opt.OnSweep(w)
	}
	if s.opt.Time > 0 && time.Since(s.start) >= s.opt.Time {
		return TimeCap, fmt.Sprintf("%v have passed; allow more time, or start from the saved state", s.opt.Time), nil
	}
	return unfinished, "", nil
}

// tolerance is the residual to which the eigenvector of a bond is solved: energies err as its square, observables linearly.
func (s *search[T]) tolerance() float64 {
	t := 0.1 * min(math.Sqrt(s.opt.Precision*s.scale), s.opt.ObservablePrecision*s.scale)
	return max(t, 1e-14*s.scale)
}

// bytesAt estimates the memory of state, environments and workspace at a bond dimension, scaled from the present one.
func (s *search[T]) bytesAt(bond int) int64 {
	var bytes int64
	e := s.engine
	size := int64(8)
	if dense.IsComplex[T]() {
		size = 16
	}
	for i, a := range e.psi.Sites {
		bytes += size * int64(len(a.Data))
		if e.left[i] != nil {
			bytes += size * int64(len(e.left[i].Data))
		}
		if e.right[i] != nil {
			bytes += size * int64(len(e.right[i].Data))
		}
	}
	ratio := float64(bond) / float64(max(1, e.psi.MaxBond()))
	return int64(float64(bytes) * ratio * ratio)
}
