// Package observables reads expectation values out of a matrix-product state: any operator formula at all its places, and the
// two-point functions of any two operators over all pairs of places.
//
// A formula means what it means in a Hamiltonian: the state carries its ladder, constants and profiles. Formulas pass through
// the state's frames symbolically, so that a state in a real gauge or a rotated basis answers in the user's basis; what is not
// real there is split into two real parts. An operator that changes a conserved charge has the expectation value zero.
//
// All operator strings of a call are evaluated in one pass from left to right with the orthogonality centre: strings that begin
// alike share their transfer steps, so all pairs of a two-point function on L sites cost L^2/2 steps.
package observables
