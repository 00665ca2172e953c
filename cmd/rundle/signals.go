package main

import (
	"context"
	"fmt"
	"io"
	"os"
	"os/signal"
)

// untilSignal returns a context that ends at the first signal that asks the process to stop; a second one ends the process. Call
// release when the command is over.
func untilSignal(parent context.Context, stderr io.Writer) (ctx context.Context, release func()) {
	ctx, cancel := context.WithCancel(parent)
	caught := make(chan os.Signal, 1)
	signal.Notify(caught, stopSignals()...)
	ignoreFileSizeSignal()
	over := make(chan struct{})
	done := make(chan struct{})
	go func() {
		defer close(done)
		select {
		case s := <-caught:
			signal.Stop(caught) // the next one has its usual effect
			fmt.Fprintf(stderr, "%v: stopping; once more to end at once\n", s)
			cancel()
		case <-over:
		}
	}()
	return ctx, func() {
		signal.Stop(caught)
		close(over)
		<-done
		cancel()
	}
}
