package main

import (
	"fmt"
	"math/rand/v2"

	"rundle/internal/dense"
)

// A group is a set of rows that is summed up together.
type group string

const (
	square group = "square"
	skinny group = "odd and skinny"
	tiny   group = "tiny"
)

// product is one row of the table.
type product struct {
	group    group
	complex  bool
	opA, opB dense.Op
	m, n, k  int
}

func (p product) routine() string {
	if p.complex {
		return "zgemm"
	}
	return "dgemm"
}

func (p product) ops() string { return p.opA.String() + p.opB.String() }

func (p product) name() string {
	return fmt.Sprintf("%s %s %d,%d,%d", p.routine(), p.ops(), p.m, p.n, p.k)
}

func (p product) flops() float64 {
	f := 2 * float64(p.m) * float64(p.n) * float64(p.k)
	if p.complex {
		f *= 4
	}
	return f
}

func cases(quick bool) []product {
	sizes := []int{16, 24, 32, 48, 64, 96, 100, 128, 200, 256, 300, 512, 600, 1024}
	odd := [][3]int{
		{64, 64, 512}, {512, 64, 64}, {64, 512, 64}, {512, 16, 512}, {512, 512, 16}, {16, 512, 512}, {37, 53, 41}, {100, 7, 100},
		{512, 4, 512}, {512, 1, 512}, {1, 512, 512}, {4, 512, 512},
	}
	small := []int{1, 2, 3, 4, 5, 6, 7, 8, 10, 12}
	if quick {
		sizes = []int{16, 32, 64, 100, 128, 256, 512}
		odd = odd[:8]
		small = []int{1, 4, 8}
	}
	var out []product
	for _, z := range []bool{false, true} {
		t := dense.Trans
		if z {
			t = dense.ConjTrans
		}
		for _, ops := range [][2]dense.Op{{dense.NoTrans, dense.NoTrans}, {t, dense.NoTrans}, {dense.NoTrans, t}, {t, t}} {
			for _, n := range sizes {
				if quick && n > 256 && ops != [2]dense.Op{} {
					continue
				}
				out = append(out, product{square, z, ops[0], ops[1], n, n, n})
			}
		}
		for _, s := range odd {
			out = append(out, product{skinny, z, dense.NoTrans, dense.NoTrans, s[0], s[1], s[2]})
		}
		for _, n := range small {
			out = append(out, product{tiny, z, dense.NoTrans, dense.NoTrans, n, n, n})
		}
	}
	return out
}

// call returns functions that run the product once, ours and the reference's.
func (p product) call() (ours, reference func()) {
	if p.complex {
		return calls[complex128](p, referenceComplex)
	}
	return calls[float64](p, referenceReal)
}

type gemm[T dense.Scalar] func(opA, opB dense.Op, m, n, k int, alpha T, a []T, lda int, b []T, ldb int, beta T, c []T, ldc int)

func calls[T dense.Scalar](p product, reference gemm[T]) (ours, theirs func()) {
	rng := rand.New(rand.NewPCG(1, 2))
	a, b, c := make([]T, p.m*p.k), make([]T, p.k*p.n), make([]T, p.m*p.n)
	dense.Random(rng, a)
	dense.Random(rng, b)
	lda, ldb := p.k, p.n
	if p.opA == dense.Trans || p.opA == dense.ConjTrans {
		lda = p.m
	}
	if p.opB == dense.Trans || p.opB == dense.ConjTrans {
		ldb = p.k
	}
	ours = func() { dense.Gemm(p.opA, p.opB, p.m, p.n, p.k, 1, a, lda, b, ldb, 0, c, p.n) }
	if reference != nil {
		theirs = func() { reference(p.opA, p.opB, p.m, p.n, p.k, 1, a, lda, b, ldb, 0, c, p.n) }
	}
	return ours, theirs
}
