package dense

import (
	"fmt"
	"os"
	"strings"
)

// kernelSet names the code that does the work.
type kernelSet byte

const (
	goKernels kernelSet = iota
	avx2Kernels
	avx512Kernels
	netlibKernels
)

var kernelNames = [...]string{"go", "avx2", "avx512", "netlib"}

func (k kernelSet) String() string { return kernelNames[k] }

// available tells whether this build on this machine has the set.
func (k kernelSet) available() bool {
	switch k {
	case goKernels:
		return true
	case avx2Kernels:
		return haveAVX2
	case avx512Kernels:
		return haveAVX512
	case netlibKernels:
		return haveNetlib
	}
	return false
}

// kernels is the set in use; only serial tests put another choice in its place.
var kernels, kernelsErr = chooseKernels(os.Getenv("RUNDLE_KERNELS"))

// chooseKernels turns the user's wish into a set. On error it still returns the default set, so that work can go on.
func chooseKernels(wish string) (kernelSet, error) {
	best, quoted := goKernels, make([]string, 0, len(kernelNames))
	for k := range kernelSet(len(kernelNames)) {
		if k.available() {
			best = k
			quoted = append(quoted, fmt.Sprintf("%q", k))
		}
	}
	if wish == "" {
		return best, nil
	}
	names := strings.Join(quoted, ", ")
	for k := range kernelSet(len(kernelNames)) {
		if k.String() != wish {
			continue
		}
		if k.available() {
			return k, nil
		}
		reason := "needs a processor that has it and a build without the tag purego"
		if k == netlibKernels {
			reason = "needs a program built with the tag netlib"
		}
		return best, fmt.Errorf("RUNDLE_KERNELS: %q %s; here are %s (unset the variable for the default, %q)", wish, reason, names, best)
	}
	return best, fmt.Errorf("RUNDLE_KERNELS: unknown kernels %q; expected one of %s (unset the variable for the default, %q)", wish, names, best)
}

// Kernels names the kernels in use: what RUNDLE_KERNELS asks for, else the best of this build on this machine. The error tells of a
// value that is not known or not to be had; the default is then in use.
func Kernels() (string, error) { return kernels.String(), kernelsErr }

// UseKernels switches to the kernels of that name. It is for serial tests and benchmarks: nothing else may run meanwhile.
func UseKernels(name string) error {
	set, err := chooseKernels(name)
	if err == nil {
		kernels = set
	}
	return err
}

// useTiles tells whether the assembly kernels are in use.
func useTiles() bool { return haveTiles && (kernels == avx512Kernels || kernels == avx2Kernels) }

func useNetlib() bool { return haveNetlib && kernels == netlibKernels }
