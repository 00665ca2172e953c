// Package dmrg finds the lowest states of a ladder Hamiltonian in a charge sector by the density-matrix renormalization group
// (White 1992, 1993) in the language of matrix-product states (Schollwoeck 2011).
//
// [Ground] is the whole of it for most users: Hamiltonian, sector and wanted precision in; state, energy, error estimate and a
// verdict out. Not converged is a verdict, not an error.
//
// # How it works
//
// The Hamiltonian is brought into its frames (package mpo/ladder): the charges it conserves, and a gauge in which it is real
// where there is one. A product state of low diagonal energy in the sector is the start. Each update solves the lowest
// eigenvector of two neighbouring sites between their environments with a few Lanczos vectors and cuts it at the middle bond.
//
// While a bond dimension is new, the cut is made by the reduced density matrix with a small part of the states mixed in that
// the Hamiltonian reaches from it (White 2005), charge by charge, so that terms that hop far, move pairs or need a third
// particle do not leave the search in the product state. Then clean sweeps follow, cut by singular values. A stage (one bond
// dimension) ends when sweeping on would gain less than the wish, or much less than the truncation costs; the next has a
// larger bond, until the error estimate is below the wanted precision or a cap is met.
//
// # Error estimate
//
// EnergyLimit extrapolates linearly in the discarded weight between the last two stages. EnergyError is the whole distance
// extrapolated, plus what further sweeps would gain, plus rounding.
//
// # Determinism
//
// The same Hamiltonian, options and seed give bitwise the same result at any number of threads. Clocks are read for reports and
// for the cap on time alone.
package dmrg
