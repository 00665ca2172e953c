//go:build !netlib

package main

var (
	referenceReal    gemm[float64]
	referenceComplex gemm[complex128]
)

// prepareReference has nothing to do: without the tag netlib there is no reference and the ratios stay empty.
func prepareReference(core string) error { return nil }
