package main

import (
	"math/rand/v2"

	"rundle/internal/dense"
)

func random[T dense.Scalar](n int) []T {
	x := make([]T, n)
	dense.Random(rand.New(rand.NewPCG(1, 2)), x)
	return x
}

func product[T dense.Scalar](opA, opB dense.Op, m, n, k int) (ours, theirs func()) {
	a, b, c := random[T](m*k), random[T](k*n), make([]T, m*n)
	lda, ldb := k, n
	if opA == dense.Trans || opA == dense.ConjTrans {
		lda = m
	}
	if opB == dense.Trans || opB == dense.ConjTrans {
		ldb = k
	}
	ours = func() { dense.Gemm(opA, opB, m, n, k, 1, a, lda, b, ldb, 0, c, n) }
	if haveReference {
		theirs = func() { referenceProduct(opA, opB, m, n, k, a, lda, b, ldb, c) }
	}
	return ours, theirs
}

// svd decomposes an n×n matrix; ours keeps so many vectors, the reference has all.
func svd[T dense.Scalar](n, keep int) (ours, theirs func()) {
	a, u, vh := random[T](n*n), make([]T, n*keep), make([]T, keep*n)
	var f dense.SVD[T]
	ours = func() {
		if err := f.Factor(n, n, a, n); err != nil {
			panic(err)
		}
		f.Vectors(keep, u, keep, vh, n)
	}
	if haveReference {
		theirs = referenceSVD(n, a)
	}
	return ours, theirs
}

// eigenvectors diagonalizes an n×n Hermitian matrix.
func eigenvectors[T dense.Scalar](n int) (ours, theirs func()) {
	a, v, values := random[T](n*n), make([]T, n*n), make([]float64, n)
	for i := range n {
		for j := range i {
			a[i*n+j] = dense.Conj(a[j*n+i])
		}
		a[i*n+i] = dense.FromFloat[T](dense.Real(a[i*n+i]))
	}
	var w dense.Workspace[T]
	ours = func() {
		if err := dense.Eigen(n, a, n, values, v, n, &w); err != nil {
			panic(err)
		}
	}
	if haveReference {
		theirs = referenceEigen(n, a)
	}
	return ours, theirs
}
