// Package rundle is the front page of Rundle, which takes a ladder Hamiltonian from the blackboard to its ground state: an energy
// with an error estimate, local values, currents, correlations and entanglement. A ladder has legs and rungs; on each site lives a
// fermion, a two-component fermion, a boson, a spin of any length or a clock. Matrix-product states and the density-matrix
// renormalization group do the work; the user writes formulas.
//
// The package itself is empty. Rundle is used in two ways: as the program cmd/rundle on a model file (see README.md), and as the
// packages below in a program of your own.
//
// # A program
//
// Bosons on a two-leg ladder in a magnetic flux of 0.8 pi a plaquette:
//
//	ctx := context.Background()
//	lad, err := ladder.New(4, ladder.Open, ladder.Leg("a", ladder.Boson(3)), ladder.Leg("b", ladder.Boson(3)))
//	check(err)
//	h, err := lad.Hamiltonian(ladder.Constants{"J": 1, "K": 1.3, "U": 4, "phi": 0.8 * math.Pi},
//		ladder.Term{Formula: "-J*exp(i*phi/2) b^+[a,j+1] b[a,j] + h.c."},
//		ladder.Term{Formula: "-J*exp(-i*phi/2) b^+[b,j+1] b[b,j] + h.c."},
//		ladder.Term{Formula: "-K b^+[a,j] b[b,j] + h.c."},
//		ladder.Term{Formula: "U/2 n[l,j] (n[l,j]-1)", Each: ladder.Each{"l": "legs"}})
//	check(err)
//	res, err := dmrg.Ground(ctx, h, ladder.Sector{"N": 4}, dmrg.Options{Precision: 1e-8})
//	check(err)
//	fmt.Println(res.Energy, "±", res.EnergyError, res.Verdict) // not converged is a verdict, not an error
//	den, err := observables.Everywhere(ctx, res.State, "n[l,j]", ladder.Each{"l": "legs"})
//	check(err)
//	fmt.Println(den.Values, entanglement.Cuts(res.State).Entropy)
//
// The program needs context, fmt and math, and rundle/dmrg, rundle/entanglement, rundle/mpo/ladder and rundle/observables. In a
// module beside a checkout of Rundle:
//
//	go mod edit -require rundle@v0.0.0 -replace rundle=../rundle && go mod tidy
//
// # Where to look
//
//   - [rundle/mpo/ladder]: ladders, formulas, charges, sectors
//   - [rundle/dmrg]: the search for the ground state, its options, its error estimate
//   - [rundle/observables], [rundle/entanglement]: what is read out of a state
//   - [rundle/mps]: states, their sums and overlaps, their files
//   - [rundle/mpo]: matrix-product operators: expectation values, matrix elements, variance
//   - [rundle/mps/block]: tensors with charges, for those who build something new
//
// # What is decided for you
//
// The conserved charges are found from the terms, and the local axes turned where that makes a parity or clock charge visible. If a
// change of phases makes the Hamiltonian real, the whole calculation runs in real arithmetic; results come back in the basis that
// the formulas were written in. The start state, the bond dimensions and the number of sweeps follow from the precision asked for.
// Results are the same bit for bit for the same input and seed on the same kind of processor, at any number of threads.
//
// # Conventions
//
// hbar = 1 and energies are in the user's units. Entropies are in nats. Rungs count from 0; sites are numbered rung by rung, legs in
// the order given, and fermion strings follow that order. Eigenvalues of S^z are m. A cut b lies after site b.
//
// Functions that may take more than a second take a context. Options come last, by value, and their zero value is the good default.
// What a user can get wrong (a formula, a sector, a file) is an error that names the place; shapes that do not fit inside the
// library are mistakes of a program and panic. A search that did not reach its precision is neither: its verdict says so.
package rundle
