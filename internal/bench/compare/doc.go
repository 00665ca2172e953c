// Command compare runs Rundle and a NumPy solver in turns and prints what one does in units of the other:
//
//	go run ./internal/bench/compare --baseline ../shared/baseline
//
// The folder holds the solver: bench.py, started as bench.py MODEL RUNGS BONDS with python3 and OpenBLAS, prints one JSON object. Its five models
// are written here as Rundle writes them (models.go), and a test holds their energies to exact ones.
//
// Every measurement is a process of its own. Of one thread the processor time counts, which other work on the machine does not touch much; of two the time on
// the wall, the least of the rounds. A ratio above one means that Rundle is the faster, except for memory. The rows:
//
//   - sweep: seconds a clean sweep at equal bond dimension, of both the least of the last two of three. Both ramp up by the same passes, keep all
//     states that the bond dimension allows and multiply four Krylov vectors at each bond; the products counted stand in the row.
//   - energy: seconds from a product state to the baseline's final energy within 1e-9. Of the baseline its sweeps up to the first that is that
//     near, without loading and setting up; of Rundle everything from the start of the process.
//     The note tells the ratio to the whole run of the baseline, which does not know beforehand when it is done.
//   - memory: peaks of resident memory of the same ramp with one clean sweep.
//   - exponent: slope of log(seconds a clean sweep) against log(bond dimension), between neighbours and over all.
//   - threads: seconds a clean sweep with one thread over that with two.
//   - gemm: share of the clean sweeps inside matrix products, from a CPU profile; and their rate there, in units of that of one large product
//     in the same process.
//
// --quick takes small bond dimensions, to see that all works; its figures are not those of the table in README.md beside this file.
package main
