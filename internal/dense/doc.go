// Package dense is the dense linear algebra below everything else: matrix products, QR and LQ, singular values, Hermitian eigenvalues,
// for float64 and complex128.
//
// Storage. A matrix is a slice and a stride: element (i, j) of a is a[i*lda+j], row-major, lda at least the number of columns.
// Elements between the rows are never read or written. Vectors are whole slices.
//
// Memory. Inputs are not modified and outputs are written in full; the two must not overlap unless a function says so. Scratch
// memory comes from a Workspace or from the factorization object; both are ready as zero values, grow to the largest size met and
// serve one goroutine at a time. No function keeps a slice it was given.
//
// Threads. Nothing here starts a goroutine, but for the pool that a BatchRunner is given. Under the tag netlib the library is told to use
// one thread. Results depend on the input and the kernels alone.
//
// Failure. A shape that does not fit panics with the shapes: it is the programmer's error. Input that is not finite, or an iteration
// that does not converge, is a *NumericalError where a result could not be trusted (SVD, Eigen); products and QR hand such numbers
// on instead. Matrices of extreme magnitude (1e160, 1e-160) are scaled by powers of two inside.
//
// Stopping. A factorization asks the Stop of its workspace, a question instead of a flag so that nobody has to watch the clock
// or a context elsewhere, between panels, merges and blocks of reflections: every 50 ms or more often at n = 2000, every 100 ms if complex
// (BenchmarkStop). It then ends in ErrStopped.
//
// Kernels. The plain Go loop in the comment of Gemm is the contract. On amd64 products run on assembly for AVX-512 or AVX2, whichever
// the processor has; elsewhere, and under the tag purego, on blocked Go. The tag netlib adds a C BLAS and LAPACK through gonum's bindings
// and prefers them:
//
//	CGO_LDFLAGS="-lopenblas -llapacke" go build -tags netlib ./...
//
// The environment variable RUNDLE_KERNELS ("avx512", "avx2", "go", "netlib") overrides the choice; Kernels tells what is in use.
//
// The assembly is written by the program in _asm; "go generate" runs it. A kernel holds a tile of C in registers, vectors along its rows,
// and reads A by broadcast at any strides, so that A is never copied and B only if it is transposed or large (the loops follow Goto, van
// de Geijn, ACM TOMS 34, 12 (2008), and Van Zee, van de Geijn, ACM TOMS 41, 14 (2015)). Complex tiles keep two sums, for the real and for
// the imaginary part of A, and combine them at the end. Edges are masked: nothing outside of a matrix is touched, not even read.
//
// JacobiSVD and JacobiEigen are slow, short and another method: the oracle that tests compare with.
//
// Factorizations work on rows: a reflection is a row of an array, a singular or eigenvector is a row until it is written out, so that
// vectors are contiguous and blocks of them enter products as they lie. QR is the LQ of the adjoint. SVD and Hermitian split the work:
// Factor finds all values, and the vectors are multiplied out for as many as are kept.
//
// Papers: Businger, Golub, Numer. Math. 7, 269 (1965); Golub, Kahan, SIAM J. Numer. Anal. B 2, 205 (1965); Cuppen, Numer. Math. 36,
// 177 (1981); Chan, ACM TOMS 8, 72 (1982); Dongarra, Sorensen, Hammarling, J. Comput. Appl. Math. 27, 215 (1989); Schreiber, Van
// Loan, SIAM J. Sci. Stat. Comput. 10, 53 (1989); Demmel, Veselic, SIAM J. Matrix Anal. Appl. 13, 1204 (1992); Li, LAPACK Working
// Note 89 (1993); Gu, Eisenstat, SIAM J. Matrix Anal. Appl. 16, 79 (1995); Lehoucq, ACM TOMS 22, 393 (1996); Quintana-Orti, Sun,
// Bischof, SIAM J. Sci. Comput. 19, 1486 (1998); Elmroth, Gustavson, IBM J. Res. Dev. 44, 605 (2000); Drmac, Bujanovic, ACM TOMS 35,
// 12 (2008).
package dense
