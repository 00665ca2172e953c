package dense

import (
	"fmt"
	"os"
	"sync"
)

// kernelSet names the code that does the work.
type kernelSet string

const (
	goKernels     kernelSet = "go"
	netlibKernels kernelSet = "netlib"
)

// kernels is chosen once, at the first use; only serial tests put another choice in its place.
var kernels = sync.OnceValues(func() (kernelSet, error) { return chooseKernels(os.Getenv("RUNDLE_KERNELS")) })

// chooseKernels turns the user's wish into a set. On error it still returns the default set, so that work can go on.
func chooseKernels(wish string) (kernelSet, error) {
	choice, names := goKernels, `"go"`
	if haveNetlib {
		choice, names = netlibKernels, `"go" or "netlib"`
	}
	switch {
	case wish == "", wish == string(choice), wish == string(goKernels):
		if wish == "" {
			return choice, nil
		}
		return kernelSet(wish), nil
	case wish == string(netlibKernels):
		return choice, fmt.Errorf("RUNDLE_KERNELS: %q needs a program built with the tag netlib; this one has %s (unset the variable for the default, %q)", wish, names, choice)
	}
	return choice, fmt.Errorf("RUNDLE_KERNELS: unknown kernels %q; expected %s (unset the variable for the default, %q)", wish, names, choice)
}

// Kernels names the kernels in use: what RUNDLE_KERNELS asks for, else the best of this build. The error tells of a value that is
// not known or not built in; the default is then in use.
func Kernels() (string, error) {
	k, err := kernels()
	return string(k), err
}

func useNetlib() bool {
	if !haveNetlib {
		return false
	}
	k, _ := kernels()
	return k == netlibKernels
}

func gemmReal(opA, opB Op, m, n, k int, alpha float64, a []float64, lda int, b []float64, ldb int, beta float64, c []float64, ldc int) {
	if useNetlib() {
		netlibReal(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
		return
	}
	tiledReal(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
}

func gemmComplex(opA, opB Op, m, n, k int, alpha complex128, a []complex128, lda int, b []complex128, ldb int, beta complex128, c []complex128, ldc int) {
	if useNetlib() {
		netlibComplex(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
		return
	}
	tiledComplex(opA, opB, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
}
