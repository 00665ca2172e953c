package task

import "runtime/debug"

// Beside calls aside on a goroutine of its own while the caller runs main, and returns when both are done: for reading and writing files
// while numbers are crunched. A panic of aside is raised in the caller as a *Panic.
func Beside(aside, main func()) {
	var failed *Panic
	done := make(chan struct{})
	go func() {
		over := false
		defer close(done)
		defer func() {
			if !over {
				failed = &Panic{Value: recover(), Stack: debug.Stack()}
			}
		}()
		aside()
		over = true
	}()
	func() {
		defer func() { <-done }() // also when main panics
		main()
	}()
	if failed != nil {
		panic(failed)
	}
}
