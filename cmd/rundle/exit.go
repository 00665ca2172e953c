package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"runtime/debug"
	"strings"

	"rundle/internal/modelfile"
	"rundle/internal/solve"
)

// Exit codes.
const (
	exitDone         = 0  // done and converged
	exitInternal     = 1  // internal error, also a panic
	exitInput        = 2  // bad input or usage
	exitNotConverged = 3  // finished, but not converged to the wish
	exitStopped      = 75 // stopped by a signal or a limit, after a checkpoint: the same command goes on
)

// usageError is a mistake on the command line.
type usageError struct{ msg, hint string }

func (e *usageError) Error() string { return e.msg }

// stoppedError is the end of a command by a signal where there is nothing to go on from.
var errStopped = errors.New("stopped by a signal; run the same command again")

// codeOf returns the exit code of an error.
func codeOf(err error) int {
	var usage *usageError
	var refusal *solve.Refusal
	switch {
	case err == nil:
		return exitDone
	case errors.Is(err, errStopped), errors.Is(err, context.Canceled):
		return exitStopped
	case errors.As(err, &usage), errors.As(err, &refusal), len(modelfile.Faults(err)) > 0:
		return exitInput
	}
	return exitInternal
}

// guard runs a command and turns a panic into an error and a short report.
func guard(stderr io.Writer, command func() (int, error)) (code int, err error) {
	defer func() {
		if p := recover(); p != nil {
			fmt.Fprintf(stderr, "%s\n", panicReport(p, debug.Stack()))
			code, err = exitInternal, fmt.Errorf("internal error: %s", firstLine(fmt.Sprint(p)))
		}
	}()
	return command()
}

// reportLines is how many lines of the stack a report shows.
const reportLines = 12

// panicReport is what a bug report needs: the message, the program, where it happened.
func panicReport(p any, stack []byte) string {
	lines := strings.Split(strings.TrimSpace(string(stack)), "\n")
	// The frames up to the call of panic are the recovery's own.
	for i, l := range lines {
		if strings.HasPrefix(l, "panic(") && i+2 < len(lines) {
			lines = lines[i+2:]
			break
		}
	}
	if len(lines) > reportLines {
		lines = lines[:reportLines]
	}
	return fmt.Sprintf("rundle: internal error: %s\nThis is a mistake in the program, not in your model. Results on disk are intact. Please report these lines:\n  %s\n  %s",
		firstLine(fmt.Sprint(p)), describeBuild(), strings.Join(lines, "\n  "))
}

func firstLine(s string) string {
	line, _, _ := strings.Cut(s, "\n")
	return line
}
