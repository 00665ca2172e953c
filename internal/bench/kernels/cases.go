package main

import (
	"fmt"
	"strings"

	"rundle/internal/dense"
)

// A group is a set of rows that is summed up together.
type group string

const (
	square  group = "square"
	skinny  group = "odd and skinny"
	tiny    group = "tiny"
	factors group = "half of the vectors"
	eigen   group = "all vectors"
	workers group = "two threads"
)

// A task is one row of the table.
type task struct {
	group   group
	routine string // as LAPACK calls it
	op      string // of a product, one letter for each factor
	m, n, k int    // k: summed over, or vectors wanted
	flops   float64
	// prepare returns functions that run the task once, ours and the reference's; the latter is nil where there is none.
	prepare func() (ours, theirs func())
}

func (t task) name() string {
	return fmt.Sprintf("%s %d,%d,%d", t.title(), t.m, t.n, t.k)
}

// title is the routine and, of a product, the operations.
func (t task) title() string {
	return strings.TrimSuffix(t.routine+" "+t.op, " ")
}

func tasks(quick bool) []task {
	var out []task
	out = append(out, products[float64]("dgemm", dense.Trans, 1, quick)...)
	out = append(out, products[complex128]("zgemm", dense.ConjTrans, 4, quick)...)
	out = append(out, decompositions[float64]("dgesdd", "dsyevd", 1, quick)...)
	return append(out, decompositions[complex128]("zgesdd", "zheevd", 4, quick)...)
}

// products returns the rows of one type, whose multiplication costs so many real ones.
func products[T dense.Scalar](routine string, t dense.Op, cost float64, quick bool) []task {
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
	var out []task
	add := func(g group, opA, opB dense.Op, m, n, k int) {
		flops := 2 * cost * float64(m) * float64(n) * float64(k)
		out = append(out, task{g, routine, opA.String() + opB.String(), m, n, k, flops, func() (ours, theirs func()) {
			return product[T](opA, opB, m, n, k)
		}})
	}
	for _, ops := range [][2]dense.Op{{dense.NoTrans, dense.NoTrans}, {t, dense.NoTrans}, {dense.NoTrans, t}, {t, t}} {
		for _, n := range sizes {
			add(square, ops[0], ops[1], n, n, n)
		}
	}
	for _, s := range odd {
		add(skinny, dense.NoTrans, dense.NoTrans, s[0], s[1], s[2])
	}
	for _, n := range small {
		add(tiny, dense.NoTrans, dense.NoTrans, n, n, n)
	}
	return out
}

// decompositions returns singular values with half of the vectors, against a routine that finds all, and Hermitian eigenvectors. The
// flops are those of the reduction and of the way back, without what happens to the reduced matrix.
func decompositions[T dense.Scalar](singular, hermitian string, cost float64, quick bool) []task {
	sizes := []int{32, 64, 128, 256, 512}
	if quick {
		sizes = sizes[:4]
	}
	var out []task
	for _, n := range sizes {
		cube := cost * float64(n) * float64(n) * float64(n)
		out = append(out, task{factors, singular, "", n, n, n / 2, cube * (8./3 + 2), func() (ours, theirs func()) { return svd[T](n, n/2) }})
	}
	for _, n := range sizes {
		cube := cost * float64(n) * float64(n) * float64(n)
		out = append(out, task{eigen, hermitian, "", n, n, n, cube * (4./3 + 2), func() (ours, theirs func()) { return eigenvectors[T](n) }})
	}
	return out
}
