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

func TestTwoProducts(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, testTwoProducts[float64], testTwoProducts[complex128]) })
}

// testTwoProducts compares with the sums written out, between guard words.
func testTwoProducts[T Scalar](t *testing.T) {
	for m := range 36 {
		for _, n := range []int{0, 1, 2, 3, 4, 5, 7, 8, 9, 15, 16, 17, 33, 100} {
			a := input(m, n, m%3, n%2, random[T](m*n))
			v, x := input(1, n, 0, 1, random[T](n)), input(1, m, 0, 3, random[T](m))
			dots, y := input(1, m, 0, 1, random[T](m)), input(1, n, 0, 5, random[T](n))
			wantDots, wantY := dots.compact(), y.compact()
			for i := range m {
				for j := range n {
					wantDots[i] += a.at(i, j) * v.a[j]
					wantY[j] += a.at(i, j) * x.a[i]
				}
			}
			twoProducts(m, n, a.a, a.ld, v.a, x.a, dots.a, y.a)
			for i, want := range wantDots {
				assert.InDelta(t, 0, Abs(dots.a[i]-want), 30*eps*float64(n+1), "%d×%d: dot product %d", m, n, i)
			}
			for j, want := range wantY {
				assert.InDelta(t, 0, Abs(y.a[j]-want), 30*eps*float64(m+1), "%d×%d: element %d of the sum", m, n, j)
			}
			for _, p := range []*padded[T]{a, v, x, dots, y} {
				p.checkGuards(t, "two products")
			}
		}
	}
}

func TestAdjoint(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, testAdjoint[float64], testAdjoint[complex128]) })
}

func testAdjoint[T Scalar](t *testing.T) {
	sizes := []int{0, 1, 2, 3, 4, 5, 7, 8, 9, 12, 16, 17, 31, 33, 40, 100, 520}
	for _, m := range sizes {
		for _, n := range sizes {
			if m*n > 100*520 {
				continue
			}
			a, b := input(m, n, m%3, n%2, random[T](m*n)), newPadded[T](n, m, n%3, m%5, math.NaN())
			adjoint(m, n, a.a, a.ld, b.a, b.ld)
			for i := range m {
				for j := range n {
					if b.at(j, i) != Conj(a.at(i, j)) {
						t.Fatalf("%d×%d: element (%d, %d) is %v, not the conjugate of %v", m, n, j, i, b.at(j, i), a.at(i, j))
					}
				}
			}
			b.checkGuards(t, "adjoint")
		}
	}
}
