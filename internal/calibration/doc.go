// Package calibration holds the models on which the error bars of searches are set and judged, and the counting. It prints nothing; the
// command internal/bench/calibrate does.
//
// A [Model] is a Hamiltonian with a ground state that is known by means outside the program: free fermions, Bethe ansatz, closed
// forms, exact diagonalization (internal/exact), and, where nothing else reaches, a search at a tenfold bond dimension. It is written once, as
// the oracle's list of operator products, and spelt out from there in the formulas of mpo/ladder.
//
// A model is searched at many stops, wishes from coarse to fine and caps on the bond, and what the search quotes is compared with what
// it misses: energies, values at every site, entropies at every cut. Coverage and the ratio of quoted to true are taken for each
// model first, so that no model counts for more than another by being stopped more often or having more sites.
//
// The models fall into halves by a hash of their names ([Model.Half]). The constants of the estimates (dmrg/estimate.go, internal/errorbar) are set on the
// tuning half; the figures that count are those of the test half, and of the models held back until the constants stood.
package calibration
