package dmrg

import (
	"math"

	"rundle/internal/dense"
	"rundle/internal/task"
)

// refine compares the states found with each other. The stationary energies in their span are upper bounds of the exact levels, one by one, which those of
// the single states are not: each of them is orthogonal to states that are only nearly exact. The difference goes into limit and error.
func (l *levels[T]) refine() error {
	op, pool := l.op, task.New(l.from.opt.Threads)
	l.sort()
	s := spanOf(op, l.chains(), pool)
	values, _, err := s.ritz()
	if err != nil {
		return err
	}
	if len(values) < len(l.found) {
		return nil // two searches came upon one state; the error bars tell
	}
	var below float64
	for k, f := range l.found {
		r := f.result
		shift := values[k] - dense.Real(s.energy[k*s.n+k])
		if math.IsNaN(shift) || math.IsInf(r.EnergyError, 1) {
			continue
		}
		r.EnergyLimit += shift
		r.EnergyError += math.Abs(shift) + leftByLower*below
		below += max(0, f.est.above)
	}
	return nil
}

// leftByLower is the part of the errors of the lower states that is added to those above, for what their span does not hold.
const leftByLower = 0.1

// sort puts the states in order of their energies.
func (l *levels[T]) sort() {
	for i := range l.found {
		for j := i; j > 0 && l.found[j].result.EnergyLimit < l.found[j-1].result.EnergyLimit; j-- {
			l.found[j], l.found[j-1] = l.found[j-1], l.found[j]
		}
	}
}
