// Command rundle takes a ladder Hamiltonian from a model file to its ground state: it checks and explains the model, solves it in a run
// folder that can be interrupted and resumed, and reads observations out of saved states.
//
//	rundle check FILE        what the model means and what it will cost
//	rundle solve FILE        ground state, observations, entanglement
//	rundle read DIR [FILE]   observe the states of a run again
//	rundle version
//
// Results go to standard output, all else to standard error; with --json standard output holds one JSON document. Exit codes are those of
// exit.go: a script can trust them.
package main

import (
	"os"
)

func main() {
	os.Exit(run(os.Args[1:], os.Stdout, os.Stderr))
}
