package solve

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"

	"rundle/dmrg"
	"rundle/internal/runfolder"
	"rundle/mpo/ladder"
	"rundle/mps"
)

// levelName names a state near a level that was looked for, in the checkpoint folder, by the order in which they came.
const levelName = "level-%d.npz"

// ascent follows the search for several levels: each as watch does, with the states found kept in the checkpoint folder, and those at settled bond
// dimensions in memory, for the error bars of observations.
type ascent struct {
	*watch
	earlier int // sweeps of the levels found
	saved   int // levels in the checkpoint folder
	marks   []mark
	before  map[*dmrg.Result]mark // of each level found
	sweeps  map[*dmrg.Result]int
}

// mark is a state at a settled bond dimension.
type mark struct {
	state     *mps.State
	discarded float64
	sweep     int // of its level
}

func newAscent(w *watch) *ascent {
	return &ascent{watch: w, before: map[*dmrg.Result]mark{}, sweeps: map[*dmrg.Result]int{}}
}

func (a *ascent) hook(o *dmrg.Options) {
	a.watch.hook(o)
	o.OnBond = func(p dmrg.Position) {
		p.Sweep += a.earlier
		a.onBond(p)
	}
	o.OnSweep = func(s dmrg.Sweep) {
		s.Number += a.earlier
		a.onSweep(s)
	}
	o.OnStage, o.OnWaypoint, o.OnLevel = a.onStage, nil, a.onLevel
}

func (a *ascent) onStage(s dmrg.Stage) {
	a.stages++
	a.check.Sector = s.State.Charges()
	a.marks = append(a.marks[max(0, len(a.marks)-1):], mark{s.State.Clone(), s.Discarded, a.check.Sweeps - a.earlier})
}

// onLevel keeps a level that was found.
func (a *ascent) onLevel(r *dmrg.Result) {
	if n := len(a.marks); n > 0 && a.marks[n-1].sweep == len(r.Sweeps) {
		a.marks = a.marks[:n-1] // the state found itself
	}
	if n := len(a.marks); n > 0 {
		a.before[r] = a.marks[n-1]
	}
	a.sweeps[r], a.marks = len(r.Sweeps), nil
	a.earlier += len(r.Sweeps)
	a.level++
	a.fail(a.keep(r.State))
}

// keep saves a state to begin from when the run goes on.
func (a *ascent) keep(s *mps.State) error {
	if err := a.check.make(a.folder); err != nil {
		return err
	}
	err := s.Save(a.check.path(levelName, a.saved))
	a.saved++
	return err
}

// keptLevels loads what an earlier run found; a damaged file is told in a note and left aside.
func keptLevels(f *runfolder.Folder) (states []*mps.State, notes []string, err error) {
	dir := filepath.Join(f.Dir(), runfolder.CheckpointName)
	numbers, err := numbered(dir, levelName)
	for _, n := range numbers {
		s, bad := mps.Load(filepath.Join(dir, fmt.Sprintf(levelName, n)))
		if bad != nil && !os.IsNotExist(bad) {
			notes = append(notes, bad.Error()+"; that level is searched for anew")
			continue
		}
		states = append(states, s)
	}
	return states, notes, err
}

// climb searches for several levels, observes them and writes the results. Where an earlier run was stopped it begins from the states that this one
// came to: they settle in a few sweeps.
func (r *run) climb(parent context.Context, start *mps.State) error {
	ctx, stop := context.WithCancelCause(parent)
	defer stop(nil)
	states, notes, err := keptLevels(r.folder)
	if err != nil {
		return diskError(r.folder.Dir(), err)
	}
	for _, n := range notes {
		r.note("%s", n)
	}
	if len(states) > 0 {
		r.out.Resumed = true
		r.note("going on from %d states of the checkpoint", len(states))
	}
	if err := r.folder.KeepLog(0); err != nil {
		return diskError(r.folder.Dir(), err)
	}
	sector := ladder.Sector{}
	for name, v := range r.model.Sector {
		sector[name] = v
	}
	if start != nil {
		stay(sector, start)
	}
	check := &checkpoint{progress: progress{Memory: r.memory()}}
	a := newAscent(newWatch(r.folder, check, nil, r.opt.OnProgress, stop))
	a.enter(Preparing)
	if err := a.status(runfolder.Running, ""); err != nil {
		return diskError(r.folder.Dir(), err)
	}
	opt := r.options(a.watch, start, nil)
	a.hook(&opt)
	if opt.Levels = states; len(states) > 0 {
		opt.Start = nil
	}
	found, err := dmrg.Lowest(ctx, r.model.Hamiltonian, sector, r.model.Solve.States, opt)
	if err != nil {
		return r.brokenOff(ctx, a, found, err)
	}
	a.enter(Observing)
	result, err := r.levels(ctx, a, found)
	if err != nil {
		return r.brokenOff(ctx, a, nil, err)
	}
	return r.writeLevels(a, found, result)
}

// brokenOff ends a climb whose context ended, with the state under way kept, or passes on why it failed.
func (r *run) brokenOff(ctx context.Context, a *ascent, found *dmrg.Spectrum, err error) error {
	if ended(ctx, err) && found != nil {
		for _, l := range found.Levels {
			if l.Verdict == "" {
				if err := a.keep(l.State); err != nil {
					return diskError(r.folder.Dir(), err)
				}
			}
		}
	}
	return r.interrupted(ctx, a.watch, nil, err)
}

// levels observes the levels found and puts the document together.
func (r *run) levels(ctx context.Context, a *ascent, found *dmrg.Spectrum) (*runfolder.Result, error) {
	if len(found.Levels) == 0 {
		return nil, errors.New("the search for several levels found none")
	}
	result := &runfolder.Result{Model: describe(r.model, found.Levels[0].Result), Resources: r.used.resources(r.opt.Threads, r.opt.Version)}
	result.Model.Hash = r.origin.Hash
	result.Resources.GemmFlops = &found.Flops
	seen := map[string]int{}
	for _, l := range found.Levels {
		s, err := r.bare(a.watch, l.Result)
		if err != nil {
			return nil, err
		}
		place := fmt.Sprint(l.Sector)
		s.Index, s.Multiplet, s.Sweeps = seen[place], l.Multiplet, a.sweeps[l.Result]
		seen[place]++
		gap, gapError := l.Gap, l.GapError
		s.Gap, s.GapError = &gap, &gapError
		before := a.before[l.Result]
		if err := r.observations(ctx, &s, l.Result, before.state, before.discarded); err != nil {
			return nil, err
		}
		if err := judgeCutoff(ctx, &s, l.Result.State, r.precision()); err != nil {
			return nil, err
		}
		result.States = append(result.States, s)
	}
	for _, m := range found.Multiplets {
		result.Multiplets = append(result.Multiplets, runfolder.Multiplet{First: m.First, Count: m.Count, Energy: m.Energy, EnergyError: m.EnergyError,
			Splitting: m.Splitting, SplittingBound: m.SplittingBound, Observations: averages(result.States[m.First : m.First+m.Count])})
	}
	return result, nil
}

// averages are the observations in the mean over the states of a multiplet; nil where it is one state.
func averages(states []runfolder.State) map[string][]runfolder.Observation {
	if len(states) < 2 {
		return nil
	}
	out := map[string][]runfolder.Observation{}
	for name, first := range states[0].Observations {
		mean := make([]runfolder.Observation, len(first))
		for i, o := range first {
			mean[i] = runfolder.Observation{At: o.At, Value: runfolder.Value{Complex: o.Value.Complex}}
			for _, s := range states {
				x := s.Observations[name][i]
				mean[i].Value.Re += x.Value.Re / float64(len(states))
				mean[i].Value.Im += x.Value.Im / float64(len(states))
				mean[i].Error += x.Error / float64(len(states))
			}
		}
		out[name] = mean
	}
	return out
}

// writeLevels puts states and results into the folder.
func (r *run) writeLevels(a *ascent, found *dmrg.Spectrum, result *runfolder.Result) error {
	var steps []func() error
	for k, l := range found.Levels {
		steps = append(steps, func() error { return l.State.Save(r.folder.StatePath(k)) })
	}
	steps = append(steps, func() error { return r.folder.WriteResult(result) })
	if !anyVerdict(result, runfolder.TimeCap) {
		steps = append(steps, r.folder.DropCheckpoint)
	}
	return r.take(append(steps, func() error { return a.status(runfolder.Done, string(result.States[0].Verdict)) }), result)
}
