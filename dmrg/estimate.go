package dmrg

import "math"

// settledStage is what the error estimate knows of a bond dimension: its clean sweeps, in order.
type settledStage struct {
	bond      int
	energies  []float64 // after each clean sweep
	discarded float64   // sum over the bonds of the last clean sweep
	largest   int
	change    float64 // of the last clean sweep, see outcome
}

func (s *settledStage) energy() float64 { return s.energies[len(s.energies)-1] }

// settling is whether a second clean sweep has confirmed the first.
func (s *settledStage) settling() bool { return len(s.energies) >= 2 }

// drift bounds what further sweeps at the same bond dimension would still gain, from the geometric decay of the last gains.
func (s *settledStage) drift() float64 {
	n := len(s.energies)
	if n < 2 {
		return math.Inf(1)
	}
	last := math.Abs(s.energies[n-1] - s.energies[n-2])
	ratio := 0.5
	if n >= 3 {
		if before := math.Abs(s.energies[n-2] - s.energies[n-3]); before > 0 {
			ratio = min(0.95, max(ratio, last/before))
		}
	}
	return last * ratio / (1 - ratio)
}

// estimate extrapolates the energy linearly in the discarded weight (White, Huse 1993; Legeza, Faeth 1996) and states its error, of which
// rounding is a part.
type estimate struct{ limit, err, rounding float64 }

// unknown is the estimate where no stage has settled.
var unknown = estimate{limit: math.NaN(), err: math.Inf(1)}

// Figures of the error estimate.
const (
	unknownSlope = 4     // couplings a unit of discarded weight, where no earlier stage tells: found on the models of the tests
	apart        = 0.8   // ratio of discarded weights below which two stages tell a slope
	roundingUnit = 4e-16 // relative error of an energy, and error for each coupling that a bond sees
)

// estimateError judges the stages that have settled. scale is the size of the Hamiltonian's terms, bonds the number of bonds.
//
// The error adds up three parts: the whole extrapolated distance (the linear law is itself only a trend), what sweeping on
// would gain, and rounding.
func estimateError(stages []settledStage, scale float64, bonds int) estimate {
	for len(stages) > 0 && !stages[len(stages)-1].settling() {
		stages = stages[:len(stages)-1]
	}
	if len(stages) == 0 {
		return unknown
	}
	last := &stages[len(stages)-1]
	rounding := roundingUnit * (math.Abs(last.energy()) + scale*math.Sqrt(float64(bonds)))
	shift, limit := unknownSlope*scale*last.discarded, last.energy()
	if n := len(stages); n >= 2 && last.discarded < apart*stages[n-2].discarded {
		before := &stages[n-2]
		if slope := (before.energy() - last.energy()) / (before.discarded - last.discarded); slope > 0 {
			shift = slope * last.discarded
			limit -= shift
		}
	}
	return estimate{limit: limit, err: shift + last.drift() + rounding, rounding: rounding}
}
