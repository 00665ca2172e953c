package main

import (
	"context"
	"errors"

	"rundle/internal/solve"
)

type readCommand struct {
	Dir  string `arg:"" help:"Run folder."`
	File string `arg:"" optional:"" help:"Model file whose observations are taken; default: the run's own."`
}

func (k readCommand) run(c *console) (int, error) {
	opt := solve.ReadOptions{Threads: c.threads, Version: release}
	if k.File != "" {
		m, err := load(k.File)
		if err != nil {
			return 0, err
		}
		opt.Model = m
	}
	ctx, release := untilSignal(context.Background(), c.stderr)
	defer release()
	result, notes, err := solve.Read(ctx, k.Dir, opt)
	if ctx.Err() != nil && err != nil {
		return 0, errors.Join(errStopped, err)
	}
	if err != nil {
		return 0, err
	}
	for _, note := range notes {
		c.say("note: %s", note)
	}
	if err := c.results(result, "states of "+k.Dir); err != nil {
		return 0, err
	}
	if !result.Converged() {
		return exitNotConverged, nil
	}
	return exitDone, nil
}
