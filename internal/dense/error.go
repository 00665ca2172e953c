package dense

import (
	"errors"
	"fmt"
	"math"
)

// ErrStopped tells that a factorization ended early because Stop of its workspace said so.
var ErrStopped = errors.New("the factorization was stopped")

// NumericalError tells that a factorization has no result. Callers wrap it with the place (which bond, which block).
type NumericalError struct {
	Routine string // "singular value decomposition", "Hermitian eigenvalues", ...
	M, N    int    // the matrix
	Reason  string
}

func (e *NumericalError) Error() string {
	return fmt.Sprintf("%s of a %d×%d matrix: %s", e.Routine, e.M, e.N, e.Reason)
}

// checkFinite returns an error unless top, the largest entry of an m×n matrix, is a finite number.
func checkFinite(routine string, m, n int, top float64) error {
	switch {
	case math.IsNaN(top):
		return &NumericalError{routine, m, n, "it holds NaN"}
	case math.IsInf(top, 0):
		return &NumericalError{routine, m, n, "it holds an infinite entry"}
	}
	return nil
}
