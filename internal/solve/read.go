package solve

import (
	"context"
	"fmt"
	"path/filepath"

	"rundle/internal/errorbar"
	"rundle/internal/modelfile"
	"rundle/internal/runfolder"
	"rundle/mps"
)

// ReadOptions steer Read. The zero value is the good default.
type ReadOptions struct {
	Model   *modelfile.Model // whose observations are taken; nil: the run's own model
	Threads int              // workers; 0: GOMAXPROCS
	Version string           // of the program
}

// Read observes the states that a finished run saved: the result of the run with observations and entanglement taken anew, and notes
// that the caller should be told. Formulas mean what they mean in the model that asks. As one bond dimension is all there is,
// the error bars are those of the package's last rule.
func Read(ctx context.Context, dir string, opt ReadOptions) (*runfolder.Result, []string, error) {
	used := startMeter()
	result, err := runfolder.ReadResult(dir)
	if err != nil {
		return nil, nil, refused(err)
	}
	m := opt.Model
	if m == nil {
		if m, err = modelOf(dir); err != nil {
			return nil, nil, err
		}
	}
	var notes []string
	for k := range result.States {
		path := runfolder.StatePath(dir, k)
		psi, err := mps.Load(path)
		if err != nil {
			return nil, nil, refused(err)
		}
		if !m.Ladder.Equal(psi.Scope().Ladder()) {
			return nil, nil, refuse("%s: its ladder is another than that of %s; name a model of the same legs, sites and rungs", m.File, path)
		}
		if k == 0 {
			notes = differing(m, psi.Scope())
		}
		if psi, err = rebound(psi, psi.Frames(), m.Scope); err != nil {
			return nil, nil, err
		}
		if err := reread(ctx, &result.States[k], psi, m); err != nil {
			return nil, nil, err
		}
	}
	result.Resources = used.resources(opt.Threads, opt.Version)
	return result, notes, nil
}

// modelOf reads the model of a run folder; its faults are those of modelfile.
func modelOf(dir string) (*modelfile.Model, error) {
	text, err := runfolder.ReadModel(dir)
	if err != nil {
		return nil, refused(err)
	}
	return modelfile.Parse(filepath.Join(dir, runfolder.ModelFile), text)
}

// reread puts the observations of a saved state in place of those in its result.
func reread(ctx context.Context, s *runfolder.State, psi *mps.State, m *modelfile.Model) error {
	all, err := measure(ctx, psi, m.Observe)
	if err != nil {
		if ctx.Err() != nil {
			return err
		}
		return refused(fmt.Errorf("%s: %w", m.File, err))
	}
	if s.Entanglement, err = entangled(psi, m.Observe); err != nil {
		return err
	}
	lone(s, all, errorbar.Quality{Weight: s.DiscardedWeight, Energy: s.EnergyError / largestCoefficient(m.Hamiltonian.Poly)})
	return nil
}
