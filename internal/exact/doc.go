// Package exact holds the oracles that the tests of this module check
// against. It is imported by test files alone and imports no other package of
// the module: what it says is found by other means than the code it judges.
//
// # Exact diagonalization
//
// A [Basis] lists the states of a list of sites that carry given values of
// given conserved numbers. A [Term] is a complex coefficient times an ordered
// product of elementary site operators, written as on the blackboard: the
// rightmost acts first. Local states are counted as follows.
//
//	fermion   |0>, |1>
//	electron  |0>, |up>, |down>, |up,down> = c_up^+ c_down^+ |0>
//	boson     n = 0 .. max
//	spin      m = s, s-1, .. , -s
//	clock     m = 0 .. q-1
//
// Fermion modes are ordered by site, up before down within a site, and a
// fermion operator collects (-1) for every occupied mode before its own,
// whatever other kinds of sites lie between.
//
// Products mean the untruncated algebra: a boson may pass through any
// occupation, and an electron site without double occupation may pass through
// |up,down>, between the first operator and the last; only the result is cut
// to the states of the basis. For bosons this is the same as normal ordering
// first and cutting then, because a normal-ordered product lowers before it
// raises.
//
// Matrices are sparse. Small ones are solved densely, larger ones by a
// Lanczos iteration with full reorthogonalization and thick restarts (Wu,
// Simon 2000); states are found one by one, each orthogonal to those before,
// so that multiplets are complete.
//
// # Free fermions
//
// A [Quadratic] is a quadratic Hamiltonian with or without pairing; a
// [Gaussian] is its ground state, read by Wick's theorem (Pfaffians) and by
// the spectrum of its correlation matrix (Peschel 2003).
//
// # Bethe ansatz and closed forms
//
// The logarithmic Bethe equations of the periodic (Bethe 1931) and the open
// (Alcaraz, Barber, Batchelor, Baxter, Quispel 1987) Heisenberg chain and of
// the open Hubbard chain (Schulz 1985) are solved by Newton's method.
// The closed forms each name their source.
//
// Misuse (an unknown operator name, an index out of range) is an error where
// an error is returned and a panic elsewhere: the only callers are tests.
package exact
