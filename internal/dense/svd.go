package dense

import "fmt"

const svdRoutine = "singular value decomposition"

// tallRatio is m/n from which a QR factorization first, then the square factor, is cheaper than working on the whole matrix
// (Chan 1982; the flop counts cross near 1.6).
const tallRatio = 1.6

// SVD holds a factorization A = U diag(s) V^H. The zero value is ready; one object serves many matrices, one after the other, and
// keeps its memory. It is not for concurrent use.
//
// The way: for a wide A work on A^H; QR first for a tall one; Householder reduction to a real upper bidiagonal B = Q^H A P, also
// for complex A; the implicit QR iteration on B (Golub, Kahan 1965; Demmel, Kahan 1990) by gonum's Dbdsqr; Q and P are applied
// only to the vectors that are asked for.
type SVD[T Scalar] struct {
	m, n   int  // A
	wide   bool // m < n: the fields below are those of A^H
	tall   bool // QR came first
	rows   int  // of the matrix that was made bidiagonal
	cols   int  // min(m, n)
	direct bool // netlib: u and vh hold the vectors themselves, U cols wide

	values     []float64
	left       []float64 // transposed left singular vectors of B, cols×cols
	right      []float64 // transposed right ones
	f          []T       // reflectors, rows×cols
	tauQ, tauP []T
	q          []T // of the QR factorization, max(m,n)×cols
	u, vh      []T
	w          Workspace[T]
}

// Factor decomposes the m×n matrix A, which is not modified. The error is a *NumericalError: A holds NaN or Inf, or the iteration
// does not converge (never seen).
func (f *SVD[T]) Factor(m, n int, a []T, lda int) error {
	matrix("A", m, n, lda, len(a))
	f.m, f.n = m, n
	f.wide = m < n
	f.cols = min(m, n)
	f.values = resize(f.values, f.cols)
	if f.cols == 0 {
		return nil
	}
	top := largest(m, n, a, lda)
	if err := checkFinite(svdRoutine, m, n, top); err != nil {
		f.m, f.n, f.cols, f.values = 0, 0, 0, f.values[:0]
		return err
	}
	s := safeScale(top)
	f.direct = useNetlib() && f.factorNetlib(s, a, lda)
	if !f.direct && !f.factorGo(s, a, lda) {
		f.m, f.n, f.cols, f.values = 0, 0, 0, f.values[:0]
		return &NumericalError{svdRoutine, m, n, "the iteration did not converge"}
	}
	if s != 1 {
		for i := range f.values {
			f.values[i] /= s
		}
	}
	return nil
}

func (f *SVD[T]) factorNetlib(s float64, a []T, lda int) bool {
	f.f = resize(f.f, f.m*f.n)
	copyMatrix(f.m, f.n, s, a, lda, f.f, f.n)
	f.u, f.vh = resize(f.u, f.m*f.cols), resize(f.vh, f.cols*f.n)
	return netlibSVD(f.m, f.n, f.f, f.values, f.u, f.vh)
}

func (f *SVD[T]) factorGo(s float64, a []T, lda int) bool {
	rows, cols := max(f.m, f.n), f.cols
	defer f.w.release(f.w.mark())
	f.tall = float64(rows) > tallRatio*float64(cols)
	f.rows = rows
	if f.tall {
		f.rows = cols
	}
	f.f = resize(f.f, f.rows*cols)
	whole := f.f
	if f.tall {
		whole = f.w.elems.take(rows * cols)
	}
	if f.wide {
		adjoint(f.m, f.n, a, lda, whole, cols)
		copyMatrix(rows, cols, s, whole, cols, whole, cols)
	} else {
		copyMatrix(rows, cols, s, a, lda, whole, cols)
	}
	if f.tall {
		f.q = resize(f.q, rows*cols)
		QR(rows, cols, whole, cols, f.q, cols, f.f, cols, &f.w)
	}
	f.tauQ, f.tauP = resize(f.tauQ, cols), resize(f.tauP, cols)
	off := f.w.reals.take(cols)
	bidiagonalize(f.rows, cols, f.f, cols, f.values, off, f.tauQ, f.tauP, &f.w)
	f.left, f.right = resize(f.left, cols*cols), resize(f.right, cols*cols)
	return bidiagonalSVD(f.values, off[:cols-1], f.left, f.right, &f.w)
}

// Values returns the min(m, n) singular values, decreasing. The slice belongs to f and is valid until the next Factor.
func (f *SVD[T]) Values() []float64 { return f.values }

// Vectors writes the first keep columns of U to u (m×keep) and the first keep rows of V^H to vh (keep×n).
func (f *SVD[T]) Vectors(keep int, u []T, ldu int, vh []T, ldvh int) {
	if keep < 0 || keep > f.cols {
		panic(fmt.Sprintf("dense: %d singular vectors asked of a %d×%d matrix", keep, f.m, f.n))
	}
	matrix("U", f.m, keep, ldu, len(u))
	matrix("V^H", keep, f.n, ldvh, len(vh))
	if keep == 0 {
		return
	}
	switch {
	case f.direct:
		copyMatrix(f.m, keep, 1, f.u, f.cols, u, ldu)
		copyMatrix(keep, f.n, 1, f.vh, f.n, vh, ldvh)
	case f.wide:
		defer f.w.release(f.w.mark())
		left, right := f.w.elems.take(f.n*keep), f.w.elems.take(keep*f.m)
		f.leftVectors(keep, left, keep)
		f.rightVectors(keep, right, f.m)
		adjoint(f.n, keep, left, keep, vh, ldvh)
		adjoint(keep, f.m, right, f.m, u, ldu)
	default:
		f.leftVectors(keep, u, ldu)
		f.rightVectors(keep, vh, ldvh)
	}
}

// leftVectors writes the first keep left singular vectors of the tall form of A.
func (f *SVD[T]) leftVectors(keep int, u []T, ldu int) {
	defer f.w.release(f.w.mark())
	rows := max(f.m, f.n)
	inner, ldi := u, ldu
	if f.tall {
		inner, ldi = f.w.elems.take(f.rows*keep), keep
	}
	for i := range f.rows {
		row := inner[i*ldi : i*ldi+keep]
		if i >= f.cols {
			clear(row)
			continue
		}
		widenColumn(row, f.left[i:], f.cols)
	}
	applyLeftReflectors(f.rows, f.cols, f.f, f.tauQ, keep, inner, ldi, &f.w)
	if f.tall {
		Gemm(NoTrans, NoTrans, rows, keep, f.cols, FromFloat[T](1), f.q, f.cols, inner, keep, 0, u, ldu)
	}
}

// rightVectors writes the conjugate transposes of the first keep right singular vectors of the tall form of A.
func (f *SVD[T]) rightVectors(keep int, vh []T, ldvh int) {
	for i := range keep {
		widenColumn(vh[i*ldvh:i*ldvh+f.cols], f.right[i*f.cols:], 1)
	}
	applyRightReflectors(f.cols, f.f, f.tauP, keep, vh, ldvh, &f.w)
}

// widenColumn sets dst[i] = src[i*step].
func widenColumn[T Scalar](dst []T, src []float64, step int) {
	switch dst := any(dst).(type) {
	case []float64:
		for i := range dst {
			dst[i] = src[i*step]
		}
	case []complex128:
		for i := range dst {
			dst[i] = complex(src[i*step], 0)
		}
	}
}

// resize returns a slice of length n, s itself if it is long enough.
func resize[E any](s []E, n int) []E {
	if cap(s) < n {
		return make([]E, n)
	}
	return s[:n]
}
