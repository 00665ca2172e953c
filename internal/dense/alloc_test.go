//go:build !race

package dense

import (
	"testing"

	"github.com/stretchr/testify/assert"
)

// The race detector allocates on its own account.
func TestFactorsAllocateNothing(t *testing.T) {
	use(t, goKernels) // LAPACK's scratch memory is allocated by call
	const n = 24
	a, x, y := random[complex128](n*n), make([]complex128, n*n), make([]complex128, n*n)
	values := make([]float64, n)
	var f SVD[complex128]
	var h Hermitian[complex128]
	var w Workspace[complex128]
	pivot := make([]int, n)
	assert.Zero(t, testing.AllocsPerRun(20, func() {
		QR(n, n, a, n, x, n, y, n, &w)
		LQ(n, n, a, n, x, n, y, n, &w)
		_ = f.Factor(n, n, a, n)
		f.Vectors(n, x, n, y, n)
		_ = f.Factor(n, 4, a, n)
		f.Vectors(4, x, 4, y, 4)
		_ = f.Factor(4, n, a, n)
		f.Vectors(4, x, 4, y, n)
		_ = Eigen(n, a, n, values, x, n, &w)
		_ = h.Factor(n, a, n)
		h.Largest(3, x, n)
		_, _ = PivotedQR(n, n, a, n, x, n, y, n, pivot, 0, &w)
	}))
}
