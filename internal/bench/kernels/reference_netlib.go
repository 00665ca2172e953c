//go:build netlib

package main

/*
#cgo LDFLAGS: -lopenblas -llapacke
int LAPACKE_dgesdd_work(int, char, int, int, double *, int, double *, double *, int, double *, int, double *, int, int *);
int LAPACKE_zgesdd_work(int, char, int, int, void *, int, double *, void *, int, void *, int, void *, int, double *, int *);
int LAPACKE_dsyevd_work(int, char, char, int, double *, int, double *, double *, int, int *, int);
int LAPACKE_zheevd_work(int, char, char, int, void *, int, double *, void *, int, double *, int, int *, int);
*/
import "C"

import (
	"errors"
	"fmt"
	"os"
	"slices"
	"syscall"
	"unsafe"

	"golang.org/x/sys/cpu"
	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/netlib/blas/netlib"

	"rundle/internal/dense"
	"rundle/internal/dense/openblas"
)

const haveReference = true

var library netlib.Implementation

var transposes = [...]blas.Transpose{dense.NoTrans: blas.NoTrans, dense.Trans: blas.Trans, dense.ConjTrans: blas.ConjTrans}

func referenceProduct[T dense.Scalar](opA, opB dense.Op, m, n, k int, a []T, lda int, b []T, ldb int, c []T) {
	switch a := any(a).(type) {
	case []float64:
		library.Dgemm(transposes[opA], transposes[opB], m, n, k, 1, a, lda, any(b).([]float64), ldb, 0, any(c).([]float64), n)
	case []complex128:
		library.Zgemm(transposes[opA], transposes[opB], m, n, k, 1, a, lda, any(b).([]complex128), ldb, 0, any(c).([]complex128), n)
	}
}

// columnMajor is LAPACK's own order: the bindings of gonum have matrices by rows, and LAPACKE turns those at a cost. It also copies them
// to memory that ends where they end, and OpenBLAS 0.3.21 reads on (zgemv), now and then into a page that is not there.
const columnMajor = 102

func must(info C.int) {
	if info != 0 {
		panic(fmt.Sprintf("the reference failed: %d", info))
	}
}

func reals(x []float64) *C.double             { return (*C.double)(unsafe.Pointer(&x[0])) }
func complexes(x []complex128) unsafe.Pointer { return unsafe.Pointer(&x[0]) }
func integers(x []int32) *C.int               { return (*C.int)(unsafe.Pointer(&x[0])) }

// beyond is how many numbers of slack follow a matrix.
const beyond = 64

// referenceSVD returns a call of gesdd on a copy of a, which it destroys, with all vectors and memory at hand.
func referenceSVD[T dense.Scalar](n int, a []T) func() {
	size := C.int(n)
	s, iwork := make([]float64, n), make([]int32, 8*n)
	switch a := any(a).(type) {
	case []float64:
		matrix := func() []float64 { return make([]float64, n*n+beyond) }
		input, u, vt, work := matrix(), matrix(), matrix(), make([]float64, 1)
		call := func(lwork C.int) {
			must(C.LAPACKE_dgesdd_work(columnMajor, 'S', size, size, reals(input), size, reals(s), reals(u), size, reals(vt), size,
				reals(work), lwork, integers(iwork)))
		}
		call(-1)
		work = make([]float64, int(work[0]))
		return func() {
			copy(input, a)
			call(C.int(len(work)))
		}
	case []complex128:
		matrix := func() []complex128 { return make([]complex128, n*n+beyond) }
		input, u, vt, work := matrix(), matrix(), matrix(), make([]complex128, 1)
		rwork := make([]float64, n*(7*n+7))
		call := func(lwork C.int) {
			must(C.LAPACKE_zgesdd_work(columnMajor, 'S', size, size, complexes(input), size, reals(s), complexes(u), size, complexes(vt), size,
				complexes(work), lwork, reals(rwork), integers(iwork)))
		}
		call(-1)
		work = make([]complex128, int(real(work[0])))
		return func() {
			copy(input, a)
			call(C.int(len(work)))
		}
	}
	return nil
}

// referenceEigen returns a call of syevd or heevd on a copy of a.
func referenceEigen[T dense.Scalar](n int, a []T) func() {
	size := C.int(n)
	w, iwork := make([]float64, n), make([]int32, 3+5*n)
	switch a := any(a).(type) {
	case []float64:
		v, work := make([]float64, n*n+beyond), make([]float64, 1+6*n+2*n*n+32*n)
		return func() {
			copy(v, a)
			must(C.LAPACKE_dsyevd_work(columnMajor, 'V', 'U', size, reals(v), size, reals(w), reals(work), C.int(len(work)), integers(iwork),
				C.int(len(iwork))))
		}
	case []complex128:
		v, work, rwork := make([]complex128, n*n+beyond), make([]complex128, 2*n+n*n+32*n), make([]float64, 1+5*n+2*n*n)
		return func() {
			copy(v, a)
			must(C.LAPACKE_zheevd_work(columnMajor, 'V', 'U', size, complexes(v), size, reals(w), complexes(work), C.int(len(work)), reals(rwork),
				C.int(len(rwork)), integers(iwork), C.int(len(iwork))))
		}
	}
	return nil
}

// wideReference tells whether the library uses AVX-512.
func wideReference() bool {
	return slices.Contains([]string{"SkylakeX", "Cooperlake", "Sapphirerapids"}, openblas.Core())
}

// coreVariable tells OpenBLAS which processor to serve. It is read before main is.
const coreVariable = "OPENBLAS_CORETYPE"

// prepareReference holds the library to one thread and to the kernels for that processor; if empty, to the best that this one can run,
// whatever the environment says and also if the library is older than the processor.
func prepareReference(want string) error {
	openblas.OneThread()
	have := openblas.Core()
	if have == "" {
		return errors.New("the BLAS is not OpenBLAS: the figures would compare with another library")
	}
	if want == "" {
		want = have
		if cpu.X86.HasAVX512DQ && cpu.X86.HasAVX512VL && !wideReference() {
			want = "SkylakeX"
		}
	}
	if have == want {
		fmt.Fprintf(os.Stderr, "OpenBLAS: kernels for %s, one thread\n", have)
		return nil
	}
	if os.Getenv(coreVariable) == want {
		return fmt.Errorf("OpenBLAS has no kernels for %q: it chose %q", want, have)
	}
	if err := os.Setenv(coreVariable, want); err != nil {
		return err
	}
	path, err := os.Executable()
	if err != nil {
		return err
	}
	return syscall.Exec(path, os.Args, os.Environ())
}
