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

func (s settledStage) energy() float64 { return s.energies[len(s.energies)-1] }

// drift bounds what further sweeps at the same bond dimension would still gain, from the geometric decay of the last gains.
func (s settledStage) drift() float64 {
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

// estimate extrapolates the energy linearly in the discarded weight (White, Huse 1993; Legeza, Faeth 1996) and states its error.
type estimate struct{ limit, err float64 }

// estimateError judges the stages so far. scale is the size of the Hamiltonian's terms, bonds the number of bonds.
//
// The error adds up three parts: the whole extrapolated distance (the linear law is itself only a trend), what sweeping on
// would gain, and rounding.
func estimateError(stages []settledStage, scale float64, bonds int) estimate {
	last := stages[len(stages)-1]
	rounding := 4e-16 * (math.Abs(last.energy()) + scale*math.Sqrt(float64(bonds)))
	slope := scale // energy a unit of discarded weight, when no second stage tells
	known := false
	if n := len(stages); n >= 2 {
		before := stages[n-2]
		if dw := before.discarded - last.discarded; dw > 0 && last.discarded < 0.8*before.discarded {
			if k := (before.energy() - last.energy()) / dw; k > 0 {
				slope, known = k, true
			}
		}
	}
	shift := slope * last.discarded
	limit := last.energy()
	if known {
		limit -= shift
	} else {
		shift *= 4
	}
	return estimate{limit: limit, err: shift + last.drift() + rounding}
}
