package dense

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
)

func TestMatVec(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, testMatVec[float64], testMatVec[complex128]) })
}

// testMatVec compares with the sum written out; beta == 0 must not read y.
func testMatVec[T Scalar](t *testing.T) {
	for m := range 20 {
		for _, n := range []int{0, 1, 2, 3, 7, 8, 9, 16, 33, 100} {
			for i, beta := range []T{0, 1, FromFloat[T](-0.5)} {
				a := input(m, n, i, 1, random[T](m*n))
				alpha := FromFloat[T](1.5)
				for _, op := range []Op{NoTrans, Trans} {
					rows, cols := m, n
					if op == Trans {
						rows, cols = n, m
					}
					x, y := random[T](cols), random[T](rows)
					want := make([]T, rows)
					for r := range rows {
						want[r] = beta * y[r]
						for c := range cols {
							if op == Trans {
								want[r] += alpha * a.at(c, r) * x[c]
							} else {
								want[r] += alpha * a.at(r, c) * x[c]
							}
						}
						if beta == 0 {
							y[r] = FromFloat[T](math.NaN())
						}
					}
					matVec(op, m, n, alpha, a.a, a.ld, x, beta, y)
					for r := range want {
						assert.InDelta(t, 0, Abs(y[r]-want[r]), 30*eps*float64(cols+1), "%v %d×%d beta %v", op, m, n, beta)
					}
				}
			}
		}
	}
}
