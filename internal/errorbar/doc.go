// Package errorbar turns the values that an observation takes at two settled bond dimensions into errors.
//
// Between settled bond dimensions the discarded weight w falls, and an expectation value approaches its limit about linearly in the
// truncation error of the state, sqrt(w), in general, and linearly in w where the Hamiltonian's symmetry or a variational principle forbids the first order. With
// the values v0 and v1 at the weights w0 and w1 a fit in sqrt(w) puts the limit |v1 - v0| r/(1 - r) away, r = sqrt(w1/w0), a fit in w
// puts it |v1 - v0| r²/(1 - r²) away. The first is the larger one at every r < 1 and is quoted.
//
// Where both bond dimensions are nearly the same, as at a cap, the spread tells nothing; then the energy does, and what the eigensolver left: see [Values],
// [Correlations] and [Entropies].
//
// All numbers are in units in which the largest coupling is one; it stands for the gap. Plain numbers go in and out: the package knows no states.
package errorbar
