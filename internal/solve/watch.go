package solve

import (
	"context"
	"errors"
	"fmt"
	"time"

	"rundle/dmrg"
	"rundle/internal/runfolder"
)

// watch follows a search: log, status, checkpoint, progress. Its hooks are called from the search's own goroutine.
type watch struct {
	folder *runfolder.Folder
	check  *checkpoint
	report func(Progress)
	stop   context.CancelCauseFunc

	before float64 // seconds spent by earlier runs
	begin  time.Time
	now    Progress
	level  int // searched for, in the order of the search
	stages int
	told   time.Time
}

// statusEvery spares the disk: status.json serves eyes.
const statusEvery = time.Second

// newWatch follows a search that goes on from a waypoint, or begins where that is nil.
func newWatch(f *runfolder.Folder, c *checkpoint, at *dmrg.Waypoint, report func(Progress), stop context.CancelCauseFunc) *watch {
	w := &watch{folder: f, check: c, report: report, stop: stop, before: c.Seconds, begin: time.Now()}
	w.now = Progress{Phase: Preparing, Sweep: c.Sweeps}
	if at != nil {
		w.stages = at.Stages
	}
	return w
}

func (w *watch) hook(o *dmrg.Options) {
	o.OnBond, o.OnSweep, o.OnStage, o.OnWaypoint = w.onBond, w.onSweep, w.onStage, w.onWaypoint
}

// enter reports a phase.
func (w *watch) enter(p Phase) {
	w.now.Phase, w.now.Done, w.now.Of = p, 0, 0
	w.tell()
}

func (w *watch) tell() {
	if w.report != nil {
		w.report(w.now)
	}
}

func (w *watch) onBond(p dmrg.Position) {
	w.now.Phase, w.now.Sweep, w.now.Of = Sweeping, p.Sweep, 2*p.Bonds
	w.now.Done = p.Done
	w.now.Energy = p.Energy
	w.tell()
}

func (w *watch) onSweep(s dmrg.Sweep) {
	w.check.Sweeps = s.Number
	w.now.Energy, w.now.Bond, w.now.LargestBond, w.now.Discarded = s.Energy, s.Bond, s.LargestBond, s.Discarded
	w.fail(w.folder.Log(runfolder.Sweep{State: w.level, Stage: w.stages, Sweep: s.Number, Energy: s.Energy, DiscardedWeight: s.Discarded,
		LargestBond: s.LargestBond, Seconds: s.Seconds}))
	if time.Since(w.told) >= statusEvery {
		w.told = time.Now()
		w.fail(w.status(runfolder.Running, ""))
	}
}

func (w *watch) onStage(s dmrg.Stage) {
	w.stages++
	w.check.SettledAt = w.check.Sweeps
	w.check.Sector = s.State.Charges()
	w.fail(w.check.settle(w.folder, s.State, settled{Stage: w.stages, Bond: s.Bond, Discarded: s.Discarded}))
}

func (w *watch) onWaypoint(at *dmrg.Waypoint) { w.fail(w.save(at)) }

// save keeps where the search stands.
func (w *watch) save(at *dmrg.Waypoint) error {
	w.check.Seconds = w.seconds()
	return w.check.save(w.folder, at)
}

// fail ends the search at the next bond when the folder cannot be written.
func (w *watch) fail(err error) {
	if err != nil {
		w.stop(diskError(w.folder.Dir(), err))
	}
}

// diskError words a failure to write.
func diskError(dir string, err error) error {
	return &Refusal{fmt.Errorf("run folder %s: %w; what was saved before is intact: make room, or choose another folder with --out, then run the same command again", dir, err)}
}

func (w *watch) status(p runfolder.Phase, message string) error {
	s := runfolder.Status{Phase: p, Sector: w.check.Sector, Sweep: w.check.Sweeps, LargestBond: w.now.LargestBond, Message: message}
	if w.now.Sweep > 0 {
		energy := w.now.Energy
		s.Energy = &energy
	}
	return w.folder.SetStatus(s)
}

// seconds is the time that the search took, earlier runs included.
func (w *watch) seconds() float64 { return w.before + time.Since(w.begin).Seconds() }

// ended tells whether err is that of a context that ended, and not of a failure that ended it.
func ended(ctx context.Context, err error) bool {
	if err == nil || !errors.Is(err, context.Canceled) && !errors.Is(err, context.DeadlineExceeded) {
		return false
	}
	var r *Refusal
	return !errors.As(context.Cause(ctx), &r)
}
