package solve

import (
	"math"

	"rundle/dmrg"
	"rundle/internal/runfolder"
)

// variance returns <(H - E)^2> of the state found; nil, with a line in the log, where the search left it out.
func (r *run) variance(w *watch, found *dmrg.Result) (*float64, error) {
	if v := found.Variance; !math.IsNaN(v) && !math.IsInf(v, 0) {
		return &v, nil
	}
	err := r.folder.Log(runfolder.Sweep{Stage: w.stages, Sweep: w.check.Sweeps, Energy: found.Energy, DiscardedWeight: found.DiscardedWeight,
		LargestBond: found.LargestBond, Note: "the variance is left out: it would have cost too much beside the search, or is too large for a number"})
	if err != nil {
		return nil, diskError(r.folder.Dir(), err)
	}
	return nil, nil
}
