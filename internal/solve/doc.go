// Package solve takes one model to its results: model, operator, ground state, observations with error bars, entanglement, all
// kept in a run folder. The driver and surveys call it; it prints nothing.
//
// [Run] solves a model in its run folder: it resumes an unfinished run, returns a finished one as it is, and begins anew
// otherwise. [Read] observes the states that a run saved. [Explain] says what a model means and what it will cost, without
// solving it.
//
// # Errors
//
// What the caller must mend (a bad option, a folder in use or of another model, a full disk) is a [*Refusal]. Any other error
// is a failure of the program or of its numerics. A search that did not reach the wish is neither: its result says so in its verdict.
//
// # Checkpoints
//
// Every 30 s, between the updates of two bonds, where the search stands goes to the checkpoint folder (dmrg.Waypoint): to save it takes what
// writing the site tensors takes. So it does when the context ends, which a search heeds within a second, and at the caps on time and
// memory. The next [Run] of the same model goes on at that very bond and ends with the same bits as an undisturbed run, whatever
// the number of threads. Two checkpoints are kept: should the newer one be damaged, a note tells so and the older one serves. One of another
// format or model is a Refusal.
//
// A process that is killed loses what it did since its last checkpoint. Sweeps that are then done again are dropped from log.jsonl first, so that it
// tells each sweep once; a sweep that was interrupted in the middle is told when it is whole, its seconds those of all its parts.
// While values of free charges are being chosen nothing is saved: that phase begins anew.
//
// A run that met its cap on time leaves results and checkpoint: running it again goes on. One that met its cap on memory goes on when
// it is given more.
//
// # Several states
//
// Where the model asks for several states, each is saved and observed, and multiplets state means. The checkpoint then holds the states that searches came to;
// a run that goes on begins from these and settles each again, in a few sweeps.
//
// # Error bars of observations
//
// An expectation value is judged by how it changed since the bond dimension settled before, by how far the energy may lie above the exact one
// and by what the eigensolver left, the last two over the gap that the search saw; one that reaches further than the next rung also by the root of the
// discarded weight. Entropies are judged likewise; see internal/errorbar. Where there is no second bond dimension, the error
// is 2 |A| (sqrt(w) + sqrt(e/J) + r/J) with |A| a bound on the norm of the formula, w the discarded weight, e the error of the energy, r the residual
// and J the largest coupling: a state that lies e above the ground state, which is alone below a gap of J, differs from it by sqrt(e/J) at
// most (Eckart 1930).
package solve
