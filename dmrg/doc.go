// Package dmrg finds the lowest states of a ladder Hamiltonian in a charge sector by the density-matrix renormalization group
// (White 1992, 1993) in the language of matrix-product states (Schollwoeck 2011).
//
// [Ground] is the whole of it for most users: Hamiltonian, sector and wanted precision in; state, energy, error estimate and a
// verdict out. Not converged is a verdict, not an error.
//
// # How it works
//
// The Hamiltonian is brought into its frames (package mpo/ladder): the charges it conserves, and a gauge in which it is real
// where there is one, or modes in which it is, if that costs less. A product state of low diagonal energy in the sector is the
// start. Each update solves the lowest eigenvector of two neighbouring sites between their environments with a few Lanczos
// vectors and cuts it at the middle bond.
//
// While a bond dimension is new, the cut is made by the reduced density matrix with a small part of the states added that
// the Hamiltonian reaches from it (White 2005), charge by charge, so that terms that hop far, move pairs or need a third
// particle do not leave the search in the product state. Then clean sweeps follow, cut by singular values. A stage (one bond
// dimension) ends when sweeping on would gain less than the wish, or much less than the truncation costs; the next has a
// larger bond, until the error estimate is below the wanted precision and two stages agree, or a cap is met. On the way from stage to stage each bond
// dimension gets one sweep, and the energies of these tell, by the power law through the last three, where the next stage should be.
// Options.Schedule puts sweeps of one's own in the place of all that: also of single sites, whose bonds stay as they are or are expanded by what the
// Hamiltonian reaches outside of both sides (Gleis, Li, von Delft 2023).
//
// Between updates an environment stands for each site only on the side away from the centre; slabs are used again. So a search holds
// the state and its environments once, besides the workspace of the widest bond. A cap on memory is kept by forecasting the blocks of the
// next bond dimension.
//
// # Free charges
//
// Charges that the sector leaves open are chosen before the search: short searches, scouts, look at the values of the charges and are sent
// on at larger bonds until their error bars separate. A start state decides them without scouts. What is conserved beyond the charges in
// use (Options.Charges, or more than four) is left to the noise of the first sweeps.
//
// # Error estimate
//
// At a settled bond dimension each update lowers the energy by what the truncations of its neighbours cost. The sum of these gains over
// a half sweep thus measures what truncation costs, without a guess of energies per discarded weight, and the energy lies above the
// exact one by about as much: between one and two gains, where no more than a hundredth is discarded. EnergyLimit
// is taken from the line through energies and gains at two bond dimensions, EnergyError from a fixed part of the distance, what
// further sweeps would gain, what the eigensolver left, and rounding. It is calibrated on models with known energies (TestErrorBars).
// It knows nothing of states that the search never came near, and little at bond dimensions below the square of the local one.
//
// # Other starts
//
// A search may sit in an excited eigenstate, where no error estimate can know better. So before the verdict is Converged a probe looks, from random
// states and another product state, for three states orthogonal to the one found, at a low bond dimension. A lower one is what the search goes on from. The
// lowest mixture of the state with what the probe found goes into the energy and its error, or where that matters is gone on from as well. Probes take a
// quarter of the operations of the search, or a blink.
//
// # Several levels
//
// [Lowest] finds levels one by one, each search orthogonal to the states below: their projections on the two sites at hand, contracted from overlap
// environments, are left out of the Krylov space. Nothing is added to the Hamiltonian, so there is no constant to choose. The probe above a level is where
// the search for the next begins. Levels within each other's error bars form a multiplet, and the last multiplet is completed.
// At last the energies become those of the lowest combinations in the span of all (Rayleigh, Ritz), which bound the exact levels from above one by one.
//
// Where states lie close together they are found as a bundle: several centre tensors on common isometries, cut by the mean of their density matrices
// (White 1993). Probes are bundles too, for it is the distance to the levels beyond the bundle that sets its pace.
//
// [Neighbours] finds the ground states of several sectors, each from the nearest one found, by single-site steps of the charges.
//
// Precision is absolute, in the units of the Hamiltonian; a precision below the rounding error of the energy ends in the verdict Suspect.
//
// # Ownership and hooks
//
// Ground copies the start state and owns nothing of the caller's. Hooks are called from the caller's goroutine, between updates; the state
// that OnStage shows belongs to the search. A context that ends is noticed between two products with the Hamiltonian; the update at hand is
// given up and the state before it returned.
//
// # Determinism
//
// The same Hamiltonian, options and seed give bitwise the same result at any number of threads. Clocks are read for reports and
// for the cap on time alone.
//
// # Papers
//
//   - S. R. White, Phys. Rev. Lett. 69, 2863 (1992); Phys. Rev. B 48, 10345 (1993): the method, two sites at a time.
//   - A. Gleis, J.-W. Li, J. von Delft, Phys. Rev. Lett. 130, 246402 (2023): controlled bond expansion.
//   - N. Halko, P.-G. Martinsson, J. A. Tropp, SIAM Rev. 53, 217 (2011): the random probe of the expansion.
//   - S. R. White, Phys. Rev. B 72, 180403 (2005): the perturbation of the density matrix.
//   - U. Schollwoeck, Ann. Phys. 326, 96 (2011): matrix-product states, environments, the projected Hamiltonian.
package dmrg
