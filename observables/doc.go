// Package observables reads expectation values out of a matrix-product state: any operator formula at all its places, and the
// two-point functions of any two operators over all pairs of places.
//
// A formula means what it means in a Hamiltonian: the state carries its ladder, constants and profiles. Formulas pass through
// the state's frames symbolically, so that a state in a real gauge or a rotated basis answers in the user's basis; what is not
// real there is split into two real parts. An operator that changes a conserved charge has the expectation value zero.
//
// # One pass
//
// All operator strings of a call are evaluated in one pass from left to right with the orthogonality centre (Schollwoeck 2011, section
// 4.2). Strings that begin alike share their steps: a node of a forest is an operator on a site with all that stands to its left. To
// go on costs two products of matrices of the bond dimension; to end costs a dot product with a matrix that is made once for each site and
// operator. So all pairs of a two-point function on L sites cost about L²/2 steps an operator, however long the strings of signs between.
//
// # Results and errors
//
// States need not be normalized and do not change. A Hermitian formula gives real values (Field.Imag is nil), judged by the formula, not by
// the numbers. Formulas that the ladder cannot read are a *ladder.Error; a state of norm zero is an error; a context that ends is noticed
// within a step. Values are bitwise the same at any number of threads (GOMAXPROCS).
package observables
