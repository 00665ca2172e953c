package dmrg

import (
	"math"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mpo"
)

// refine compares the states found with each other. The stationary energies in their span are upper bounds of the exact levels, one by one, which those of
// the single states are not: each of them is orthogonal to states that are only nearly exact. The difference goes into limit and error. States that lie
// close together and mix are then settled once more, as a bundle.
func (l *levels[T]) refine() error {
	op, pool := l.op, task.New(l.from.opt.Threads)
	l.sort()
	s := spanOf(op, l.chains(), pool)
	values, vectors, err := s.ritz()
	if err != nil {
		return err
	}
	n := len(values)
	if n < len(l.found) {
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
	for from := 0; from < n; {
		to := from + 1
		for to < n && together(l.found[to-1].result, l.found[to].result) {
			to++
		}
		if to-from > 1 && mixed(vectors, n, from, to) && values[to-1]-values[from] > roundingOf(values[from], l.from.scale, len(op.Sites)) {
			if err := l.bundle(from, to); err != nil {
				return err
			}
		}
		from = to
	}
	return nil
}

const (
	leftByLower = 0.1  // part of the errors of the lower states that is added to those above, for what their span does not hold
	mixes       = 1e-3 // weight that the best combination takes from other states, from where on it is another state
	bundleGrown = 1.6  // growth of a bundle's bond
	bundleTries = 4    // bond dimensions of a bundle
)

// mixed reports whether one of the states from..to-1 is, at its best, a mixture.
func mixed[T dense.Scalar](vectors []T, n, from, to int) bool {
	for k := from; k < to; k++ {
		own := dense.Abs(vectors[k*n+k])
		if own*own < 1-mixes {
			return true
		}
	}
	return false
}

// bundle settles the states from..to-1 on common isometries, orthogonal to those below, and takes what comes of it where its error bars are no
// worse than the wish or than before.
func (l *levels[T]) bundle(from, to int) error {
	p, group := l.from, l.found[from:to]
	if p.opt.Memory > 0 || len(l.op.Sites) == 1 {
		return nil // the cap was counted for one state; the energies are those of the best combinations anyway
	}
	all := l.chains()
	q := newBundleSearch(l.op, all[from:to], p.opt, p.scale, p.halt)
	q.avoid(all[:from])
	if err := q.prepare(); err != nil {
		return err
	}
	bond, precise := 1, false
	for _, c := range all[from:to] {
		bond = max(bond, c.MaxBond())
	}
	for try := 0; try < bundleTries && !precise; try++ {
		set := setting{bond: min(bond, p.opt.Bond), weight: p.opt.weight, vectors: vectorsLate, tolerance: q.tolerance()}
		if err := q.settle(set); err != nil {
			return err
		}
		precise = try > 0
		for k := range group {
			precise = precise && q.estimate(k).above <= p.opt.Precision
		}
		bond = int(bundleGrown*float64(bond)) + 1
	}
	for k, f := range group {
		if est := q.estimate(k); !(est.err <= max(p.opt.Precision, f.result.EnergyError)) {
			return nil
		}
	}
	for k, f := range group {
		if err := l.replace(f, q, k); err != nil {
			return err
		}
	}
	return nil
}

// replace puts state k of a bundle in the place of one that was found.
func (l *levels[T]) replace(f *found[T], q *bundleSearch[T], k int) error {
	c, est, r := q.chain(k), q.estimate(k), f.result
	state, err := l.wrap(c)
	if err != nil {
		return err
	}
	f.chain, f.est = c, est
	r.State, r.LargestBond, r.Waypoint = state, state.MaxBond(), nil
	r.Energy = dense.Real(mpo.Expectation(c, l.op, q.pool))
	r.EnergyLimit, r.EnergyError = est.limit, est.err
	r.DiscardedWeight = q.stages[k][len(q.stages[k])-1].discarded
	if !math.IsNaN(r.Variance) {
		r.Variance, r.VarianceRounding = mpo.Variance(c, l.op, q.pool)
	}
	return nil
}

// sort puts the states in order of their energies.
func (l *levels[T]) sort() {
	for i := range l.found {
		for j := i; j > 0 && l.found[j].result.EnergyLimit < l.found[j-1].result.EnergyLimit; j-- {
			l.found[j], l.found[j-1] = l.found[j-1], l.found[j]
		}
	}
}
