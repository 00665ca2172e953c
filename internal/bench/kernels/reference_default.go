//go:build !netlib

package main

import "rundle/internal/dense"

// Without the tag netlib there is no reference, and the ratios stay empty.
const haveReference = false

func wideReference() bool { return true }

func prepareReference(core string) error { return nil }

func referenceProduct[T dense.Scalar](opA, opB dense.Op, m, n, k int, a []T, lda int, b []T, ldb int, c []T) {
}

func referenceSVD[T dense.Scalar](n int, a []T) func() { return nil }

func referenceEigen[T dense.Scalar](n int, a []T) func() { return nil }
