package dmrg

import "math"

// Figures of the growth of the bond. Of the models that the comparison with a NumPy solver searches, doubling the bond brings the gain down by 30
// to 100 in spin chains, ladders and the Hubbard chain.
const (
	wantedGain     = 0.5 // of the precision, where the next stage should come out
	guessedDecay   = 5.0 // power of the bond dimension by which the gain falls, where no earlier stage tells
	slowestDecay   = 2.0
	smallestFactor = 1.25 // between the bond dimensions of stages, so that they make a line
	unknownFactor  = 1.6  // where the last stage told nothing
	largestFactor  = 4.0
	walkFactor     = 2.0 // between the sweeps on the way
	warmSweeps     = 2   // that open the first stage of a start near the state looked for
)

// nextBond is the bond dimension at which the gain should come down to the precision, by the power law through the last two stages, within bounds.
func (s *search[T]) nextBond(bond int) int {
	factor := unknownFactor
	last := &s.stages[len(s.stages)-1]
	if last.settling() && last.gain > 0 {
		decay := guessedDecay
		if n := len(s.stages); n >= 2 {
			before := &s.stages[n-2]
			if before.gain > 0 && before.bond < last.bond {
				decay = max(slowestDecay, math.Log(before.gain/last.gain)/math.Log(float64(last.bond)/float64(before.bond)))
			}
		}
		factor = math.Pow(last.gain/(wantedGain*s.opt.Precision), 1/decay)
		factor = max(smallestFactor, min(largestFactor, factor))
	}
	return min(s.opt.Bond, max(bond+leastGrowth, int(factor*float64(bond))))
}

// opening lists the sweeps that lead to a stage at a bond dimension: from the start, perturbed ones of decreasing weight with noise; from
// the stage before, one perturbed sweep at each bond dimension on the way, at least one, so that no sector is missed. The clean sweeps of the
// stage then fill the rest of the bond.
func (s *search[T]) opening(bond int) (sweeps []setting) {
	set := s.clean(bond)
	if len(s.stages) == 0 {
		set.vectors, set.perturbation = vectorsEarly, firstPerturbation
		count, noise := firstSweeps, 0.1
		if s.warm {
			count, noise = warmSweeps, 0
		}
		for range count {
			set.noise = noise * math.Sqrt(set.perturbation)
			sweeps = append(sweeps, set)
			set.perturbation *= perturbationDecay
		}
		return sweeps
	}
	last := &s.stages[len(s.stages)-1]
	if last.largest < last.bond {
		set.perturbation = checkPerturbation
		return []setting{set}
	}
	set.vectors, set.perturbation = vectorsOpening, laterPerturbation
	from, to := float64(last.bond), float64(bond)
	steps := max(1, math.Ceil(math.Log(to/from)/math.Log(walkFactor)-1e-9)-1)
	for k := 1.0; k <= steps; k++ {
		set.bond = int(math.Round(from * math.Pow(to/from, k/(steps+1))))
		sweeps = append(sweeps, set)
	}
	return sweeps
}
