package solve

import (
	"fmt"
	"time"

	"rundle/internal/modelfile"
	"rundle/internal/runfolder"
)

// Options steer a run. The zero value is the good default; every field's zero is stated beside it.
type Options struct {
	Dir             string         // run folder; "": the default beside the model file
	Fresh           bool           // move an existing run aside and begin anew
	StartDir        string         // run folder whose first state the search starts from; "": a product state
	Threads         int            // workers; 0: GOMAXPROCS
	Memory          int64          // cap on the bytes of state and environments; 0: what the model says
	CheckpointEvery time.Duration  // least time between two checkpoints; 0: 30 s, more where they take long
	Version         string         // of the program, for the result
	OnProgress      func(Progress) // called often, from one goroutine; nil: nothing is told
	OnNote          func(string)   // called with what the user should know, before the work that it is about; nil: nothing is told
}

// Phase says what a run does.
type Phase string

// The phases of a run, in order.
const (
	Preparing Phase = "preparing" // operator, start state, choice among free charges
	Sweeping  Phase = "sweeping"
	Observing Phase = "observing"
)

// Progress tells where a run stands.
type Progress struct {
	Phase       Phase
	Sweep       int // from 1, those of earlier runs included
	Done, Of    int // bond updates of this sweep
	Bond        int // cap on the bond dimension in this sweep
	LargestBond int // reached in the last sweep
	Energy      float64
	Discarded   float64
}

// Outcome is what a run came to.
type Outcome struct {
	Dir      string
	Result   *runfolder.Result // nil if the run was stopped
	Stopped  bool              // by the context, after a checkpoint; the same call goes on
	Returned bool              // the folder held the results already
	Resumed  bool              // the search went on from a checkpoint
	Moved    string            // where Fresh moved the run that was there; "" if none
}

// Limited tells whether the search ended at its cap on time: the same call goes on.
func (o *Outcome) Limited() bool {
	return o.Result != nil && anyVerdict(o.Result, runfolder.TimeCap)
}

func anyVerdict(r *runfolder.Result, v runfolder.Verdict) bool {
	for _, s := range r.States {
		if s.Verdict == v {
			return true
		}
	}
	return false
}

// Refusal is an error that the caller must mend.
type Refusal struct{ Err error }

func (r *Refusal) Error() string { return r.Err.Error() }
func (r *Refusal) Unwrap() error { return r.Err }

func refuse(format string, args ...any) error { return &Refusal{fmt.Errorf(format, args...)} }

// refused makes an error a Refusal; nil stays nil.
func refused(err error) error {
	if err == nil {
		return nil
	}
	return &Refusal{err}
}

// check refuses what this version does not do.
func (o Options) check(m *modelfile.Model) error {
	switch {
	case o.Threads < 0:
		return refuse("threads %d: expected a positive number, or none for all processors", o.Threads)
	case o.CheckpointEvery < 0:
		return refuse("checkpoints every %v: expected a positive time", o.CheckpointEvery)
	case o.Memory < 0:
		return refuse("memory of %d bytes: expected a positive size", o.Memory)
	}
	return nil
}
