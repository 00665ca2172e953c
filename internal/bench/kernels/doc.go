// Command kernels compares the dense kernels with OpenBLAS, in one binary:
//
//	go run -tags netlib ./internal/bench/kernels
//
// Each row is one product or decomposition, in Gflop/s. The contestants take turns in slices of about two milliseconds; a figure is the median over the rounds, in
// CPU time of the one thread that runs, so that other work on the machine costs precision but not fairness. A ratio above one means that
// Rundle's kernels are the faster ones. At the end of each group stand the smallest ratio and the geometric mean.
//
// The rows "list, two threads" are lists of products, as a sweep has them, on two threads against one. They compare wall time, of the
// quarter of rounds that took least, as other work on the machine never makes a round shorter; where it never leaves both cores alone,
// their ratio says nothing. "--only 'two threads'" measures them alone.
//
// The end says of each figure that is to be reached whether it was met, from the rows measured. AVX2's are judged if OpenBLAS is held to
// AVX2 too. "--check" makes a figure missed code 3.
//
// OpenBLAS takes a processor that it does not know for a lesser one. If that, or the environment, keeps it from AVX-512 on a machine
// that has it, the command starts itself anew with the variable that puts it right; "--core Haswell --kernels avx2" compares the two at
// AVX2.
package main
