//go:build netlib

package main

// #cgo LDFLAGS: -lopenblas -llapacke
import "C"

import (
	"errors"
	"fmt"
	"os"
	"slices"
	"syscall"

	"golang.org/x/sys/cpu"
	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/netlib/blas/netlib"

	"rundle/internal/dense"
	"rundle/internal/dense/openblas"
)

var library netlib.Implementation

func transpose(op dense.Op) blas.Transpose {
	return map[dense.Op]blas.Transpose{dense.NoTrans: blas.NoTrans, dense.Trans: blas.Trans, dense.ConjTrans: blas.ConjTrans}[op]
}

func referenceReal(opA, opB dense.Op, m, n, k int, alpha float64, a []float64, lda int, b []float64, ldb int, beta float64, c []float64, ldc int) {
	library.Dgemm(transpose(opA), transpose(opB), m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
}

func referenceComplex(opA, opB dense.Op, m, n, k int, alpha complex128, a []complex128, lda int, b []complex128, ldb int, beta complex128, c []complex128, ldc int) {
	library.Zgemm(transpose(opA), transpose(opB), m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
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
		if cpu.X86.HasAVX512DQ && cpu.X86.HasAVX512VL && !slices.Contains([]string{"SkylakeX", "Cooperlake", "Sapphirerapids"}, have) {
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
