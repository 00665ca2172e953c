package solve

import (
	"context"
	"math"

	"rundle/dmrg"
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
	if s.Observations, err = r.observe(ctx, w, found, s.EnergyError); err != nil {
		return s, err
	}
	return s, r.finish(ctx, &s, found)
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

// finish adds entanglement and the judgement of the boson cutoff.
func (r *run) finish(ctx context.Context, s *runfolder.State, found *dmrg.Result) (err error) {
	if s.Entanglement, err = entangled(found.State, r.model.Observe); err != nil {
		return err
	}
	return judgeCutoff(ctx, s, found.State, r.precision())
}

// observe measures the state found and, for the error bars, the one at the settled bond dimension before it.
func (r *run) observe(ctx context.Context, w *watch, found *dmrg.Result, energyError float64) (map[string][]runfolder.Observation, error) {
	back := 0
	if w.check.SettledAt == w.check.Sweeps {
		back = 1 // the state found is the last settled one
	}
	before, mark, err := w.check.earlier(back)
	if err != nil {
		return nil, err
	}
	return r.observations(ctx, found, before, mark.Discarded, energyError)
}

// observations measures a state and, for the error bars, the one at the settled bond dimension before it, where there is one, that discarded so much.
func (r *run) observations(ctx context.Context, found *dmrg.Result, before *mps.State, discarded, energyError float64) (map[string][]runfolder.Observation, error) {
	now, err := measure(ctx, found.State, r.model.Observe)
	if err != nil {
		return nil, err
	}
	scale := largestCoefficient(r.model.Hamiltonian.Poly)
	q := errorbar.Quality{Weight: found.DiscardedWeight, Energy: (energyError + max(0, found.Energy-found.EnergyLimit)) / scale, Gap: found.Gap / scale}
	if n := len(found.Sweeps); n > 0 {
		q.Residual = found.Sweeps[n-1].Residual / scale
	}
	bars := make([][]float64, len(now))
	if before == nil {
		for i := range now {
			bars[i] = errorbar.Lone(now[i].norms, q)
		}
		return observations(now, bars), nil
	}
	// Frames from a file know no ladder: those of the state found spare them learning it at every place.
	if before, err = rebound(before, found.State.Frames(), r.model.Scope); err != nil {
		return nil, err
	}
	earlier, err := measure(ctx, before, r.model.Observe)
	if err != nil {
		return nil, err
	}
	for i := range now {
		bars[i] = errorbar.Values.Spread(now[i].values, earlier[i].values, now[i].norms, q, discarded)
	}
	return observations(now, bars), nil
}
