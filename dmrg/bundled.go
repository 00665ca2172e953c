package dmrg

import (
	"math"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mps"
)

// bundleSearch strings the sweeps of a bundle into stages, as search does for one state.
type bundleSearch[T dense.Scalar] struct {
	*bundle[T]
	opt    settled
	scale  float64
	stages [][]settledStage // of each state
	fresh  bool             // before the first stage
	below  float64          // the search is over once the lowest energy is below this
}

func newBundleSearch[T dense.Scalar](op *mpo.Operator[T], states []*mps.Chain[T], opt settled, scale float64, halt func() error) *bundleSearch[T] {
	return &bundleSearch[T]{bundle: newBundle(op, states, opt, halt), opt: opt, scale: scale, stages: make([][]settledStage, len(states)), fresh: true, below: math.Inf(-1)}
}

// Sweeps of a stage of a bundle.
const (
	bundleOpening = 4  // perturbed ones of the first stage; two of the others
	bundleClean   = 12 // clean ones at most
)

// stage settles one bond dimension, or ends where the lowest energy is as low as it need be.
func (q *bundleSearch[T]) stage(bond int) error {
	set := setting{bond: bond, weight: q.opt.weight, vectors: vectorsLate, tolerance: q.tolerance(), perturbation: firstPerturbation}
	count := 2
	if q.fresh {
		count, set.vectors = bundleOpening, vectorsEarly
	}
	for range count {
		if q.fresh {
			set.noise = 0.1 * math.Sqrt(set.perturbation)
		}
		if _, err := q.sweep(set); err != nil {
			return err
		}
		set.perturbation *= perturbationDecay
	}
	set.perturbation, set.noise, set.vectors = 0, 0, vectorsLate
	q.fresh = false
	return q.settle(set)
}

// settle does the clean sweeps of a stage.
func (q *bundleSearch[T]) settle(set setting) error {
	for n := range bundleClean {
		out, err := q.sweep(set)
		if err != nil {
			return err
		}
		enough := n > 0
		for k, e := range out.energies {
			if n == 0 {
				q.stages[k] = append(q.stages[k], settledStage{bond: set.bond})
			}
			st := &q.stages[k][len(q.stages[k])-1]
			st.energies = append(st.energies, e)
			st.discarded, st.largest, st.rest, st.gain = out.total, out.largest, out.rest, out.gains[k]
			enough = enough && st.drift() <= max(0.1*q.opt.Precision, 0.02*st.gain, roundingOf(e, q.scale, q.psi.Len()))
		}
		if enough || out.energies[0] < q.below {
			return nil
		}
	}
	return nil
}

// tolerance is that of search.tolerance for energies alone.
func (q *bundleSearch[T]) tolerance() float64 {
	return max(0.03*math.Sqrt(q.opt.Precision*q.scale), 1e-14*q.scale)
}

// estimate judges the energy of state k.
func (q *bundleSearch[T]) estimate(k int) estimate {
	return estimateError(q.stages[k], q.scale, q.psi.Len())
}
