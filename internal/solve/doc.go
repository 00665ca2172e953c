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
// At every settled bond dimension the state goes to the checkpoint folder, and when the context ends the last state as well.
// The next [Run] of the same model starts from there, in the sector found before. A run that met its cap on time leaves results and
// checkpoint: running it again goes on. One that met its cap on memory goes on when it is given more.
//
// # Error bars of observations
//
// Between the settled bond dimensions the discarded weight w falls, and an expectation value v approaches its limit about linearly
// in the truncation error of the state, sqrt(w). With the values v0 and v1 at the last two settled bond dimensions the distance
// to the limit is then |v1 - v0| r/(1 - r) with r = sqrt(w1/w0). The error quoted is this distance, with r kept within [1/2, 19/20]
// and |v1 - v0| at least 0.3 of its root mean square over all places of the formula, so that no place gains from an accident; plus what the
// eigensolver left undone, |A| r/(2 J), with |A| a bound on the norm of the formula, r the largest residual of the last sweep and J the largest
// coupling, which stands for the gap; plus rounding.
//
// Where there is no second bond dimension, the error is 2 |A| (sqrt(w) + sqrt(e/J) + r/J) with e the error of the energy: a state that lies e above
// the ground state, which is alone below a gap of J, differs from it by sqrt(e/J) at most (Eckart 1930).
package solve
