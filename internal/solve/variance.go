package solve

import (
	"fmt"
	"slices"

	"rundle/dmrg"
	"rundle/internal/dense"
	"rundle/internal/runfolder"
	"rundle/internal/task"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
)

// variance returns <(H - E)^2> of the state found; nil, with a line in the log, where it would cost more than the search did.
func (r *run) variance(w *watch, found *dmrg.Result) (*float64, error) {
	if tooDear(found, r.model.Ladder) {
		note := fmt.Sprintf("the variance is left out: with operator bonds up to %d it would cost more than the search", slices.Max(found.OperatorBonds))
		err := r.folder.Log(runfolder.Sweep{Stage: w.stages, Sweep: w.check.Sweeps, Energy: found.Energy, DiscardedWeight: found.DiscardedWeight,
			LargestBond: found.LargestBond, Note: note})
		if err != nil {
			return nil, diskError(r.folder.Dir(), err)
		}
		return nil, nil
	}
	strings, err := found.State.Frames().Strings(r.model.Hamiltonian.Poly)
	if err != nil {
		return nil, err
	}
	pool := task.New(r.opt.Threads)
	var v float64
	if c, ok := found.State.Real(); ok {
		v, err = varianceOf(c, strings, pool)
	} else {
		c, _ := found.State.Complex()
		v, err = varianceOf(c, strings, pool)
	}
	return &v, err
}

func varianceOf[T dense.Scalar](c *mps.Chain[T], s *ladder.Strings, pool *task.Pool) (float64, error) {
	op, err := mpo.Build[T](s, mpo.Options{})
	if err != nil {
		return 0, err
	}
	v, _ := mpo.Variance(c, op, pool)
	return v, nil
}

// updateProducts is about how many products with the effective Hamiltonian a bond update takes, environments included.
const updateProducts = 7

// tooDear compares the leading costs at bond dimension chi and operator bond D a site: 2 chi^3 D^2 for the variance, and 2 chi^3 D d for
// each product with the effective Hamiltonian in the sweeps (right and left) that were made.
func tooDear(found *dmrg.Result, lad *ladder.Ladder) bool {
	var mean, square float64
	for _, d := range found.OperatorBonds {
		mean += float64(d)
		square += float64(d) * float64(d)
	}
	var local float64
	for i := range lad.Sites() {
		local += float64(lad.Site(i).Dim()) / float64(lad.Sites())
	}
	cube := func(n int) float64 { return float64(n) * float64(n) * float64(n) }
	var search float64
	for _, s := range found.Sweeps {
		search += cube(s.LargestBond) * mean * local * 2 * updateProducts
	}
	return cube(found.LargestBond)*square > search
}
