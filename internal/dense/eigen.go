package dense

import (
	"fmt"
	"sync"
)

const eigenRoutine = "Hermitian eigenvalues"

// Hermitian holds the spectral decomposition A = V diag(x) V^H of a Hermitian matrix. The zero value is ready; one object serves many
// matrices, one after the other, and keeps its memory. It is not for concurrent use.
//
// The way: blocked Householder reduction to a real tridiagonal, also for complex A (Dongarra, Sorensen, Hammarling 1989); divide and
// conquer on that; the reflections are applied only to the vectors that are asked for.
type Hermitian[T Scalar] struct {
	Work *Workspace[T] // as that of an SVD

	hermitian[T]
}

// hermitian is a Hermitian whose scratch memory is somebody else's.
type hermitian[T Scalar] struct {
	n      int
	values []float64
	t      tridiagonalEigen
	q      reflectors[T]
}

// Factor decomposes the n×n matrix whose upper triangle a holds (of the diagonal the real part counts). a is not modified. The error
// is a *NumericalError, A holds NaN or Inf, or the iteration does not converge (never seen), or ErrStopped.
func (f *Hermitian[T]) Factor(n int, a []T, lda int) error {
	f.Work = orNew(f.Work)
	return f.factor(n, a, lda, f.Work)
}

// Values returns the eigenvalues, ascending. The slice belongs to f and is valid until the next Factor.
func (f *Hermitian[T]) Values() []float64 { return f.values }

// Largest writes the eigenvectors of the keep largest eigenvalues, the largest first, to the columns of v (n×keep). The
// error is ErrStopped; without a Stop there is none.
func (f *Hermitian[T]) Largest(keep int, v []T, ldv int) error {
	if keep < 0 || keep > f.n {
		panic(fmt.Sprintf("dense: %d eigenvectors asked of a %d×%d matrix", keep, f.n, f.n))
	}
	matrix("V", f.n, keep, ldv, len(v))
	f.Work = orNew(f.Work)
	return f.vectors(f.n-1, -1, keep, v, ldv, f.Work)
}

// Eigen computes the eigenvalues, ascending, of the n×n Hermitian matrix A and writes the eigenvectors to the columns of v. It reads
// the upper triangle of A (of the diagonal the real part) and does not modify A; v must not overlap it. The error is a
// *NumericalError or ErrStopped. A Hermitian object serves who needs only some of the vectors.
func Eigen[T Scalar](n int, a []T, lda int, values []float64, v []T, ldv int, w *Workspace[T]) error {
	matrix("V", n, n, ldv, len(v))
	if len(values) != n {
		panic(fmt.Sprintf("dense: room for %d eigenvalues of a %d×%d matrix", len(values), n, n))
	}
	w = orNew(w)
	if err := w.eigen.factor(n, a, lda, w); err != nil {
		return err
	}
	copy(values, w.eigen.values)
	return w.eigen.vectors(0, 1, n, v, ldv, w)
}

func (f *hermitian[T]) factor(n int, a []T, lda int, w *Workspace[T]) error {
	matrix("A", n, n, lda, len(a))
	f.n, f.values = 0, f.values[:0]
	if n == 0 {
		return nil
	}
	defer w.release(w.mark())
	s := w.elems.take(n * n)
	top := fillStrips(n, a, lda, s)
	if err := checkFinite(eigenRoutine, n, n, top); err != nil {
		return err
	}
	scale := safeScale(top)
	if scale != 1 {
		for i := range n {
			Scale(FromFloat[T](scale), s[i*n+stripStart(i):(i+1)*n])
		}
	}
	d, e := w.reals.take(n), w.reals.take(n)
	if !tridiagonalize(n, s, d, e, &f.q, w) {
		return ErrStopped
	}
	if !f.t.factor(d, e, w.Stop) {
		if f.t.m.halted {
			return ErrStopped
		}
		return &NumericalError{eigenRoutine, n, n, "the iteration did not converge"}
	}
	f.n, f.values = n, resize(f.values, n)
	f.t.sorted(f.values)
	if scale != 1 {
		for i := range f.values {
			f.values[i] /= scale
		}
	}
	return nil
}

// vectors writes eigenvectors first, first+step, ... to the keep columns of v.
func (f *hermitian[T]) vectors(first, step, keep int, v []T, ldv int, w *Workspace[T]) error {
	if keep == 0 {
		return nil
	}
	defer w.release(w.mark())
	n := f.n
	x, vh := w.reals.take(keep*n), w.elems.take(keep*n)
	f.t.m.stop, f.t.m.halted = w.Stop, false
	if !f.t.vectors(first, step, keep, x) {
		return ErrStopped
	}
	widenColumn(vh, x, 1)
	if !f.q.applyAdjoint(keep, vh, n, w) {
		return ErrStopped
	}
	adjoint(keep, n, vh, n, v, ldv)
	return nil
}

// fillStrips copies what tridiagonalize reads of the Hermitian matrix whose upper triangle a holds, and returns the largest entry.
func fillStrips[T Scalar](n int, a []T, lda int, s []T) (top float64) {
	for i := range n {
		row := s[i*n+i : i*n+n]
		copy(row, a[i*lda+i:i*lda+n])
		row[0] = FromFloat[T](Real(row[0]))
		if x := largest(1, n-i, row, n-i); !(x <= top) && top == top {
			top = x
		}
		for j := i + 1; j < n && stripStart(j) <= i; j++ {
			s[j*n+i] = Conj(row[j-i])
		}
	}
	return top
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
	b := tridiagonalPool.Get().(*tridiagonalEigen)
	defer tridiagonalPool.Put(b)
	if !b.factor(d, e, nil) {
		return &NumericalError{eigenRoutine, n, n, "the iteration did not converge"}
	}
	b.sorted(values)
	b.y = resize(b.y, n*n)
	b.vectors(0, 1, n, b.y)
	adjoint(n, n, b.y, n, v, n)
	return nil
}

// tridiagonalPool keeps the memory of TridiagonalEigen, which is called with a matrix one larger each time.
var tridiagonalPool = sync.Pool{New: func() any { return new(tridiagonalEigen) }}
