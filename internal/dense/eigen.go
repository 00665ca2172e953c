package dense

import (
	"fmt"

	"gonum.org/v1/gonum/lapack"
	gonumlapack "gonum.org/v1/gonum/lapack/gonum"
)

// lapackRef is gonum's pure-Go LAPACK.
var lapackRef gonumlapack.Implementation

const eigenRoutine = "Hermitian eigenvalues"

// Eigen computes the eigenvalues, ascending, of the n×n Hermitian matrix A and writes the eigenvectors to the columns of v. It reads
// the upper triangle of A (of the diagonal the real part) and does not modify A; v must not overlap it. The error is a
// *NumericalError. The way: Householder reduction to a real tridiagonal, then implicit QL/QR iteration by gonum's Dsteqr.
func Eigen[T Scalar](n int, a []T, lda int, values []float64, v []T, ldv int, w *Workspace[T]) error {
	matrix("A", n, n, lda, len(a))
	matrix("V", n, n, ldv, len(v))
	if len(values) != n {
		panic(fmt.Sprintf("dense: room for %d eigenvalues of a %d×%d matrix", len(values), n, n))
	}
	if n == 0 {
		return nil
	}
	w = orNew(w)
	defer w.release(w.mark())
	s := w.elems.take(n * n)
	hermitian(n, a, lda, s)
	top := largest(n, n, s, n)
	if err := checkFinite(eigenRoutine, n, n, top); err != nil {
		return err
	}
	scale := safeScale(top)
	copyMatrix(n, n, scale, s, n, s, n)

	ldz := n + 1 // Dsteqr runs down columns: a stride that is a power of two would map them onto one cache line
	e, tau, z := w.reals.take(n), w.elems.take(n), w.reals.take(n*ldz)
	tridiagonalize(n, s, values, e, tau, w)
	clear(z)
	for i := range n {
		z[i*ldz+i] = 1
	}
	if !lapackRef.Dsteqr(lapack.EVOrig, n, values, e[:n-1], z, ldz, w.reals.take(max(1, 2*n-2))) {
		return &NumericalError{eigenRoutine, n, n, "the iteration did not converge"}
	}
	for i := range n {
		widenColumn(v[i*ldv:i*ldv+n], z[i*ldz:], 1)
	}
	applyTridiagonalReflectors(n, s, tau, v, ldv, w)
	if scale != 1 {
		for i := range values {
			values[i] /= scale
		}
	}
	return nil
}

// hermitian fills s (n×n) with the Hermitian matrix whose upper triangle a holds.
func hermitian[T Scalar](n int, a []T, lda int, s []T) {
	for i := range n {
		s[i*n+i] = FromFloat[T](Real(a[i*lda+i]))
		row := s[i*n+i+1 : i*n+n]
		Conjugate(row, a[i*lda+i+1:i*lda+n])
		for j, x := range row {
			s[(i+1+j)*n+i] = x
		}
		copy(row, a[i*lda+i+1:i*lda+n])
	}
}

// tridiagonalize reduces the full Hermitian s to a real tridiagonal Q^H S Q, diagonal d (n), off-diagonal e (n-1 used). The vector of
// reflector k stays in row k right of the diagonal, leading 1 included.
func tridiagonalize[T Scalar](n int, s []T, d, e []float64, tau []T, w *Workspace[T]) {
	defer w.release(w.mark())
	vc, p := w.elems.take(n), w.elems.take(n)
	minusOne := FromFloat[T](-1)
	for k := range n {
		d[k] = Real(s[k*n+k])
		if k+1 == n {
			break
		}
		size := n - k - 1
		v, vc, p := s[k*n+k+1:k*n+n], vc[:size], p[:size]
		Conjugate(v, v) // column k of a Hermitian matrix
		e[k], tau[k] = reflector(v)
		if tau[k] == 0 {
			continue
		}
		// With p = tau S v: H^H S H = S - q v^H - v q^H, q = p - (conj(tau)/2) (v^H p) v.
		rest := s[(k+1)*n+k+1:]
		matVec(NoTrans, size, size, rest, n, v, p)
		Scale(tau[k], p)
		Axpy(-Conj(tau[k])*Dot(v, p)/FromFloat[T](2), v, p)
		Conjugate(vc, v)
		rankOne(size, size, minusOne, p, vc, rest, n)
		Conjugate(p, p)
		rankOne(size, size, minusOne, v, p, rest, n)
	}
}

// applyTridiagonalReflectors replaces the n×n matrix v by Q v for the reflectors that tridiagonalize left in s.
func applyTridiagonalReflectors[T Scalar](n int, s, tau []T, v []T, ldv int, w *Workspace[T]) {
	defer w.release(w.mark())
	uc, work := w.elems.take(n), w.elems.take(n)
	for k := n - 2; k >= 0; k-- {
		u, uc := s[k*n+k+1:k*n+n], uc[:n-k-1]
		Conjugate(uc, u)
		reflectLeft(n-k-1, n, tau[k], u, uc, v[(k+1)*ldv:], ldv, work)
	}
}

// TridiagonalEigen computes the eigenvalues, ascending, of the real symmetric tridiagonal matrix with diagonal d (n) and off-diagonal
// e (n-1), and its eigenvectors as the columns of v (n×n, no padding). d and e are not modified. The error is a *NumericalError.
func TridiagonalEigen(d, e []float64, values, v []float64) error {
	n := len(d)
	if n == 0 {
		return nil
	}
	if len(e) != n-1 || len(values) != n || len(v) != n*n {
		panic(fmt.Sprintf("dense: tridiagonal matrix of size %d with %d off-diagonal elements, room for %d eigenvalues and %d vector elements", n, len(e), len(values), len(v)))
	}
	top := largest(1, n, d, n)
	if err := checkFinite(eigenRoutine, n, n, max(top, largest(1, n-1, e, n))); err != nil {
		return err
	}
	copy(values, d)
	var small [4 * 64]float64
	scratch := small[:]
	if 3*n > len(scratch) {
		scratch = make([]float64, 3*n)
	}
	copy(scratch, e)
	identity(n, v)
	if !lapackRef.Dsteqr(lapack.EVOrig, n, values, scratch[:n-1], v, n, scratch[n:]) {
		return &NumericalError{eigenRoutine, n, n, "the iteration did not converge"}
	}
	return nil
}
