// Package arch holds the layers of the module in one table and checks the
// sources against it. Its test fails when a package imports sideways or
// upward, when an oracle of the tests leaks into the program, when a core
// package takes on a dependency, when the numeric core starts a goroutine
// outside internal/task, and when the top level gathers what does not belong
// there.
//
// Sources are read with go/parser, every build tag included, so that a file
// left out of this machine's build is checked too.
package arch
