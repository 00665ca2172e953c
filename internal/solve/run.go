package solve

import (
	"context"
	"errors"
	"fmt"
	"maps"
	"path/filepath"

	"rundle/dmrg"
	"rundle/internal/dense"
	"rundle/internal/modelfile"
	"rundle/internal/runfolder"
	"rundle/mpo/ladder"
	"rundle/mps"
)

// defaultPrecision is the wanted error of the energy where the model does not say.
const defaultPrecision = 1e-8

// Run solves a model in its run folder; see the package's comment for what it finds there and what its errors mean.
func Run(ctx context.Context, m *modelfile.Model, opt Options) (*Outcome, error) {
	if err := opt.check(m); err != nil {
		return nil, err
	}
	if _, err := dense.Kernels(); err != nil {
		return nil, refused(err)
	}
	used := startMeter()
	origin, start, err := originOf(m, opt.StartDir)
	if err != nil {
		return nil, err
	}
	dir := opt.Dir
	if dir == "" {
		dir = runfolder.Default(m.File)
	}
	folder, err := runfolder.Open(dir, origin, runfolder.Options{Fresh: opt.Fresh})
	if err != nil {
		return nil, refused(err)
	}
	defer folder.Close()
	r := &run{model: m, opt: opt, origin: origin, folder: folder, used: used, out: &Outcome{Dir: folder.Dir(), Moved: folder.Moved()}}
	if r.out.Moved != "" {
		r.note("the run that was there is now %s", r.out.Moved)
	}
	if done, err := r.returned(); done || err != nil {
		return r.out, err
	}
	if m.Solve.States > 1 {
		return r.out, r.climb(ctx, start)
	}
	return r.out, r.solve(ctx, start)
}

// run is one call of Run.
type run struct {
	model  *modelfile.Model
	opt    Options
	origin runfolder.Origin
	folder *runfolder.Folder
	used   meter
	out    *Outcome
}

// returned takes the results of a finished run, unless it is to go on.
func (r *run) returned() (bool, error) {
	if r.folder.Standing() != runfolder.Finished {
		return false, nil
	}
	result, err := runfolder.ReadResult(r.folder.Dir())
	if err != nil {
		return false, refused(err)
	}
	if anyVerdict(result, runfolder.TimeCap) {
		return false, nil
	}
	if anyVerdict(result, runfolder.MemoryCap) {
		memory := r.memory()
		c, at, _, err := openCheckpoint(r.folder, r.origin.Hash)
		if err == nil && at != nil && c.Memory > 0 && (memory == 0 || memory > c.Memory) {
			return false, nil
		}
	}
	r.out.Result, r.out.Returned = result, true
	return true, nil
}

func (r *run) note(format string, args ...any) {
	if r.opt.OnNote != nil {
		r.opt.OnNote(fmt.Sprintf(format, args...))
	}
}

// memory is the cap on memory: the caller's, else the model's.
func (r *run) memory() int64 {
	if r.opt.Memory > 0 {
		return r.opt.Memory
	}
	return r.model.Solve.Memory
}

// precision is the wanted error of the energy.
func (r *run) precision() float64 {
	if p := r.model.Solve.Precision; p > 0 {
		return p
	}
	return defaultPrecision
}

// solve searches, observes and writes the results.
func (r *run) solve(parent context.Context, start *mps.State) error {
	ctx, stop := context.WithCancelCause(parent)
	defer stop(nil)
	check, at, notes, err := openCheckpoint(r.folder, r.origin.Hash)
	if err != nil {
		return err
	}
	for _, n := range notes {
		r.note("%s", n)
	}
	if err := errors.Join(check.clean(r.folder), r.folder.KeepLog(check.Sweeps)); err != nil {
		return diskError(r.folder.Dir(), err)
	}
	if at != nil {
		r.out.Resumed = true
		r.note("going on from the checkpoint after %d sweeps", check.Sweeps)
	}
	sector := maps.Clone(r.model.Sector)
	if sector == nil {
		sector = ladder.Sector{}
	}
	if start != nil {
		stay(sector, start)
	}
	check.Memory = r.memory()
	w := newWatch(r.folder, check, at, r.opt.OnProgress, stop)
	w.enter(Preparing)
	if err := w.status(runfolder.Running, ""); err != nil {
		return diskError(r.folder.Dir(), err)
	}
	found, err := dmrg.Ground(ctx, r.model.Hamiltonian, sector, r.options(w, start, at))
	if errors.Is(err, dmrg.ErrDeparted) {
		err = otherVersion(filepath.Join(r.folder.Dir(), runfolder.CheckpointName), err)
	}
	if err != nil {
		return r.interrupted(ctx, w, found, err)
	}
	w.enter(Observing)
	result, err := r.result(ctx, w, found)
	if err != nil {
		return r.interrupted(ctx, w, found, err)
	}
	return r.write(w, found, result)
}

// stay names the charges of a start state that the sector leaves free.
func stay(sector ladder.Sector, start *mps.State) {
	for name, v := range start.Charges() {
		if _, named := sector[name]; !named {
			sector[name] = v
		}
	}
}

func (r *run) options(w *watch, start *mps.State, at *dmrg.Waypoint) dmrg.Options {
	s := r.model.Solve
	o := dmrg.Options{
		Precision: r.precision(), ObservablePrecision: s.ObservablePrecision, Bond: s.Bond, Sweeps: s.Sweeps, Time: s.Time,
		Memory: r.memory(), Threads: r.opt.Threads, Seed: s.Seed, Charges: s.Charges, Start: start,
		From: at, WaypointEvery: r.opt.CheckpointEvery, Scratch: r.folder.ScratchPath(),
	}
	w.hook(&o)
	return o
}

// interrupted ends a run whose context ended, with a checkpoint, or passes on why it failed.
func (r *run) interrupted(ctx context.Context, w *watch, found *dmrg.Result, err error) error {
	if ended(ctx, err) {
		if found != nil && found.Waypoint != nil {
			w.check.Sector = found.Sector
			if err := w.save(found.Waypoint); err != nil {
				return diskError(r.folder.Dir(), err)
			}
		}
		r.out.Stopped = true
		if err := w.status(runfolder.Stopped, "run the same command again to go on"); err != nil {
			return diskError(r.folder.Dir(), err)
		}
		return nil
	}
	if cause := context.Cause(ctx); cause != nil && ctx.Err() != nil {
		err = cause
	}
	if !isRefusal(err) {
		err = classify(err)
	}
	// The status is a courtesy: the error itself goes to the caller.
	_ = w.status(runfolder.Failed, err.Error())
	return err
}

// classify tells what the user can mend from failures of the numerics.
func classify(err error) error {
	var numerical *dense.NumericalError
	if errors.As(err, &numerical) {
		return err
	}
	return &Refusal{err}
}

func isRefusal(err error) bool {
	var r *Refusal
	return errors.As(err, &r)
}

// write puts states and results into the folder, in the order in which a reader can trust them.
func (r *run) write(w *watch, found *dmrg.Result, result *runfolder.Result) error {
	steps := []func() error{
		func() error { return found.State.Save(r.folder.StatePath(0)) },
		func() error { return r.folder.WriteResult(result) },
		func() error {
			if goesOn(result) && found.Waypoint != nil {
				return w.save(found.Waypoint)
			}
			return r.folder.DropCheckpoint()
		},
		func() error { return w.status(runfolder.Done, string(result.States[0].Verdict)) },
	}
	return r.take(steps, result)
}

// take does the steps that end in a result.
func (r *run) take(steps []func() error, result *runfolder.Result) error {
	for _, step := range steps {
		err := step()
		var notFinite *runfolder.NotFiniteError
		if errors.As(err, &notFinite) {
			return fmt.Errorf("the results hold a number that is not finite: %w", err)
		}
		if err != nil {
			return diskError(r.folder.Dir(), err)
		}
	}
	r.out.Result = result
	return nil
}

// goesOn tells whether a later call may improve the results.
func goesOn(r *runfolder.Result) bool {
	return anyVerdict(r, runfolder.TimeCap) || anyVerdict(r, runfolder.MemoryCap)
}
