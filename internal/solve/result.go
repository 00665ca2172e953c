package solve

import (
	"context"
	"math"

	"rundle/dmrg"
	"rundle/entanglement"
	"rundle/internal/errorbar"
	"rundle/internal/modelfile"
	"rundle/internal/runfolder"
	"rundle/mpo/ladder"
	"rundle/mps"
)

// result observes the state found and puts the document together.
func (r *run) result(ctx context.Context, w *watch, found *dmrg.Result) (*runfolder.Result, error) {
	state, err := r.state(ctx, w, found)
	if err != nil {
		return nil, err
	}
	model := describe(r.model, found)
	model.Hash = r.origin.Hash
	used := r.used.resources(r.opt.Threads, r.opt.Version)
	used.GemmFlops = &found.Flops
	return &runfolder.Result{Model: model, States: []runfolder.State{state}, Resources: used}, nil
}

// describe says what was solved.
func describe(m *modelfile.Model, found *dmrg.Result) runfolder.Model {
	model := runfolder.Model{Title: m.Title, Sites: m.Ladder.Sites(), Charges: chargesOf(m.Frames), Arithmetic: runfolder.Complex, MPOBonds: found.OperatorBonds}
	if found.Real {
		model.Arithmetic = runfolder.Real
	}
	return model
}

func chargesOf(f *ladder.Frames) []runfolder.Charge {
	var all []runfolder.Charge
	for _, c := range f.Charges {
		all = append(all, runfolder.Charge{Name: c.Name, Modulus: c.Modulus, Meaning: c.Description})
	}
	return all
}

// state describes the state found with all that is read out of it.
func (r *run) state(ctx context.Context, w *watch, found *dmrg.Result) (runfolder.State, error) {
	s, err := r.bare(w, found)
	if err != nil {
		return s, err
	}
	if err := ctx.Err(); err != nil {
		return s, err
	}
	if err := r.observe(ctx, w, &s, found); err != nil {
		return s, err
	}
	return s, judgeCutoff(ctx, &s, found.State, r.precision())
}

// bare describes a state with what the search knows of it.
func (r *run) bare(w *watch, found *dmrg.Result) (runfolder.State, error) {
	s := runfolder.State{
		Sector: found.Sector, Energy: found.Energy, EnergyLimit: found.EnergyLimit, EnergyError: found.EnergyError,
		DiscardedWeight: found.DiscardedWeight, LargestBond: found.LargestBond, Sweeps: w.check.Sweeps,
		Verdict: runfolder.Verdict(found.Verdict), Reason: found.Reason, Seconds: w.seconds(),
	}
	if math.IsNaN(s.EnergyLimit) || math.IsInf(s.EnergyLimit, 0) {
		s.EnergyLimit = s.Energy
	}
	if math.IsNaN(s.EnergyError) || math.IsInf(s.EnergyError, 0) {
		bound, err := looseBound(r.model.Hamiltonian, r.model.Frames, s.Energy)
		if err != nil {
			return s, err
		}
		s.EnergyError = bound
	}
	var err error
	s.Variance, err = r.variance(w, found)
	return s, err
}

// observe measures the state found and, for the error bars, the one at the settled bond dimension before it.
func (r *run) observe(ctx context.Context, w *watch, s *runfolder.State, found *dmrg.Result) error {
	back := 0
	if w.check.SettledAt == w.check.Sweeps {
		back = 1 // the state found is the last settled one
	}
	before, mark, err := w.check.earlier(back)
	if err != nil {
		return err
	}
	return r.observations(ctx, s, found, before, mark.Discarded)
}

// observations measures observables and entanglement of a state and, for the error bars, of the one at the settled bond dimension before it, where there is one, that
// discarded so much.
func (r *run) observations(ctx context.Context, s *runfolder.State, found *dmrg.Result, before *mps.State, discarded float64) error {
	now, err := measure(ctx, found.State, r.model.Observe)
	if err != nil {
		return err
	}
	if s.Entanglement, err = entangled(found.State, r.model.Observe); err != nil {
		return err
	}
	q := r.quality(found, s.EnergyError)
	if before == nil {
		lone(s, now, q)
		return nil
	}
	// Frames from a file know no ladder: those of the state found spare them learning it at every place.
	if before, err = rebound(before, found.State.Frames(), r.model.Scope); err != nil {
		return err
	}
	earlier, err := measure(ctx, before, r.model.Observe)
	if err != nil {
		return err
	}
	bars := make([][]float64, len(now))
	for i := range now {
		bars[i] = now[i].spread(&earlier[i], q, discarded)
	}
	s.Observations = observations(now, bars)
	var past []complex128
	for _, e := range entanglement.Cuts(before).Entropy {
		past = append(past, complex(e, 0))
	}
	quote(s.Entanglement, errorbar.Entropies.Spread(entropiesOf(s.Entanglement), past, ones(len(past)), q, discarded))
	return nil
}

// quality is what the search knows of the state that it found, in units of the largest coupling.
func (r *run) quality(found *dmrg.Result, energyError float64) errorbar.Quality {
	scale := largestCoefficient(r.model.Hamiltonian.Poly)
	q := errorbar.Quality{Sites: r.model.Ladder.Sites(), Weight: found.DiscardedWeight, Energy: (energyError + max(0, found.Energy-found.EnergyLimit)) / scale, Gap: found.Gap / scale}
	if n := len(found.Sweeps); n > 0 {
		q.Residual = found.Sweeps[n-1].Residual / scale
	}
	return q
}

// lone quotes the errors of a state with nothing to compare it to.
func lone(s *runfolder.State, now []series, q errorbar.Quality) {
	bars := make([][]float64, len(now))
	for i := range now {
		bars[i] = errorbar.Lone(now[i].norms, q)
	}
	s.Observations = observations(now, bars)
	quote(s.Entanglement, errorbar.Lone(ones(len(s.Entanglement.Cuts)), q))
}

// spread quotes the errors of a series by an earlier one.
func (s *series) spread(earlier *series, q errorbar.Quality, discarded float64) []float64 {
	bars := errorbar.Values.Spread(s.values, earlier.values, s.norms, q, discarded)
	for i, bar := range errorbar.Correlations.Spread(s.values, earlier.values, s.norms, q, discarded) {
		if s.far[i] {
			bars[i] = bar
		}
	}
	return bars
}
