package main

import (
	"cmp"
	"context"
	"path/filepath"
	"runtime/debug"

	"rundle/internal/modelfile"
	"rundle/internal/runfolder"
	"rundle/internal/solve"
)

// collectorLeast is the memory of the program beside what a cap speaks of.
const collectorLeast = 64 << 20

type solveCommand struct {
	File   string `arg:"" help:"Model file (TOML)."`
	Out    string `name:"out" placeholder:"DIR" help:"Run folder; default: the model file's name beside it, with .run."`
	Fresh  bool   `name:"fresh" help:"Move the run that is there aside and begin anew."`
	Start  string `name:"start" placeholder:"DIR" help:"Begin from the state of another run."`
	Every  string `name:"checkpoint-every" placeholder:"TIME" help:"Least time between two checkpoints, such as \"10m\"; default: 30 s, more where they take long."`
	Memory string `name:"memory" placeholder:"SIZE" help:"Cap on the memory of state and environments, such as \"8 GiB\"."`
}

func (k solveCommand) run(c *console) (int, error) {
	opt := solve.Options{Dir: k.Out, Fresh: k.Fresh, StartDir: k.Start, Threads: c.threads, Version: release}
	var err error
	if k.Memory != "" {
		if opt.Memory, err = modelfile.Size(k.Memory); err != nil {
			return 0, &usageError{"--memory: " + err.Error(), ""}
		}
	}
	if k.Every != "" {
		if opt.CheckpointEvery, err = modelfile.Duration(k.Every); err != nil {
			return 0, &usageError{"--checkpoint-every: " + err.Error(), ""}
		}
	}
	m, err := load(k.File)
	if err != nil {
		return 0, err
	}
	for _, w := range m.Hamiltonian.Warnings() {
		c.say("warning: %s", w)
	}
	if cap := cmp.Or(opt.Memory, m.Solve.Memory); cap > 0 {
		// The collector has to keep up: what is free already must not stand in the way of the cap.
		debug.SetMemoryLimit(cap + cap/10 + collectorLeast)
	}
	ctx, release := untilSignal(context.Background(), c.stderr)
	defer release()
	show := newDisplay(c.stderr)
	opt.OnProgress = show.update
	opt.OnNote = func(note string) { c.say("%s", note) }
	out, err := solve.Run(ctx, m, opt)
	show.close()
	if err != nil {
		return 0, err
	}
	return c.report(out)
}

// report prints what a run came to and returns its exit code.
func (c *console) report(out *solve.Outcome) (int, error) {
	if out.Stopped {
		c.say("stopped; the same command goes on from %s", filepath.Join(out.Dir, runfolder.CheckpointName))
		if c.json {
			return exitStopped, c.document(stoppedDocument{"rundle-stopped/1", exitStopped, out.Dir})
		}
		return exitStopped, nil
	}
	if out.Returned {
		c.say("%s holds these results already", out.Dir)
	}
	if err := c.results(out.Result, "run folder: "+out.Dir); err != nil {
		return 0, err
	}
	switch {
	case out.Limited() && !out.Returned:
		c.say("the time is up; the same command goes on")
		return exitStopped, nil
	case !out.Result.Converged():
		return exitNotConverged, nil
	}
	return exitDone, nil
}

type stoppedDocument struct {
	Format string `json:"format"`
	Exit   int    `json:"exit"`
	Folder string `json:"folder"`
}
