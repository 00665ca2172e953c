package dmrg

import "math"

// Figures of the growth of the bond. Of the models that the comparison with a NumPy solver searches, doubling the bond brings the gain down by 30
// to 100 in spin chains, ladders and the Hubbard chain.
const (
	wantedGain     = 0.3 // of the precision, where the next stage should come out
	guessedDecay   = 5.0 // power of the bond dimension by which the gain falls, where no earlier stage tells
	slowestDecay   = 2.0
	smallestFactor = 1.25 // between the bond dimensions of stages, so that they make a line
	unknownFactor  = 1.6  // where the last stage told nothing
	largestFactor  = 32.0
	walkFactor     = 2.0 // between the sweeps on the way, where what does not grow with the bond dimension takes most of a sweep
	shortFactor    = 1.5 // the same, where the cube of the bond dimension tells
	shortFrom      = 128 // is there
	reach          = 1.3 // times the next step: so near the end of a way is gone to at once
	fastestDecay   = 10.0
	passingGain    = 3e-3 // of the gain of the sweep before, for all bonds: Krylov vectors on the way that gain less are the last
	overCut        = 1e3  // perturbation in units of the largest weight that the sweep before has cut
	warmSweeps     = 2    // that open the first stage of a start near the state looked for
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

// opening lists the perturbed sweeps before the clean ones of a stage at a given bond dimension: from the start, of decreasing weight with noise; from
// the stage before, one at each bond dimension on the way, at least one, so that no sector is missed. The clean sweeps of the stage then fill the rest of the bond.
func (s *search[T]) opening(bond int) (sweeps []setting) {
	if s.unopened() {
		return nil
	}
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
	from, to := float64(last.bond), float64(bond)
	steps := max(1, math.Ceil(math.Log(to/from)/math.Log(walkFactor)-1e-9)-1)
	for k := 1.0; k <= steps; k++ {
		sweeps = append(sweeps, s.passing(int(math.Round(from*math.Pow(to/from, k/(steps+1))))))
	}
	return sweeps
}

// unopened is whether no sweep is perturbed.
func (s *search[T]) unopened() bool { return s.opt.Opening == Unperturbed || s.engine.psi.Len() == 1 }

// passing is the setting of a sweep on the way. Its perturbation outweighs what was cut before, so that states of other sectors find room.
func (s *search[T]) passing(bond int) setting {
	set := s.clean(bond)
	set.perturbation, set.passing = laterPerturbation, true
	set.least = s.share(passingGain * max(0, s.gained))
	if n := len(s.sweeps); n > 0 {
		set.perturbation = max(checkPerturbation, min(laterPerturbation, overCut*s.sweeps[n-1].Discarded))
	}
	return set
}

// point is an energy at a bond dimension.
type point struct {
	bond   int
	energy float64
}

// walk leads from the last stage to the next: perturbed sweeps, each at a larger bond dimension. Their energies tell where the stage should be,
// which sets bond; given is what the last stage told.
func (s *search[T]) walk(bond *int) (Verdict, string, error) {
	s.narrow = 0
	last := &s.stages[len(s.stages)-1]
	way := []point{{last.bond, last.energy()}}
	for at, end := last.bond, *bond; ; {
		step := stride(at)
		if len(way) > 1 {
			end = s.affordableEnd(at, wayEnd(way, wantedGain*s.opt.Precision, largestFactor*float64(last.bond)))
		}
		switch near := float64(end) <= reach*float64(step); {
		case s.unopened(), last.largest < last.bond, near && len(way) == 1:
			*bond = end
			for _, set := range s.opening(end) {
				if v, r, err := s.sweep(set); v != unfinished || err != nil {
					return v, r, err
				}
			}
			return unfinished, "", nil
		case near:
			*bond = end
			return unfinished, "", nil
		}
		at = step
		set := s.passing(at)
		if len(way) > 1 && at > shortFrom {
			set.perturbation = 0
		}
		if v, r, err := s.sweep(set); v != unfinished || err != nil {
			return v, r, err
		}
		way = append(way, point{at, s.sweeps[len(s.sweeps)-1].Energy})
	}
}

// stride is the bond dimension of the next sweep on a way.
func stride(bond int) int {
	if bond < shortFrom {
		return int(walkFactor * float64(bond))
	}
	return int(shortFactor * float64(bond))
}

// affordableEnd keeps the end of a way within the caps.
func (s *search[T]) affordableEnd(at, end int) int {
	end = min(end, s.opt.Bond)
	if end <= at {
		return at
	}
	return max(at, s.journal.look("bond", func() int { return s.affordable(at, end) }))
}

// wayEnd is where what is missing of the energy should have come down to aim, by the power law through the last energies, from where the way stands to most.
func wayEnd(way []point, aim, most float64) int {
	n := len(way) - 1
	here, before := way[n], way[n-1]
	gained := before.energy - here.energy
	if !(gained > 0) {
		return here.bond
	}
	decay := guessedDecay
	if n >= 2 {
		if first := way[n-2]; first.energy > before.energy {
			// Energies by the logarithm of the bond dimension, at points halfway.
			near, far := math.Log(float64(here.bond)/float64(before.bond)), math.Log(float64(before.bond)/float64(first.bond))
			fall := math.Log((first.energy - before.energy) / far / (gained / near))
			decay = max(slowestDecay, min(fastestDecay, fall/(0.5*(near+far))))
		}
	}
	missing := gained / (math.Pow(float64(here.bond)/float64(before.bond), decay) - 1)
	end := float64(here.bond) * math.Pow(missing/aim, 1/decay)
	return int(math.Ceil(max(float64(here.bond), min(most, end))))
}
