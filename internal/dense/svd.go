package dense

import "fmt"

const svdRoutine = "singular value decomposition"

// tallRatio is m/n from which a QR factorization first, then the square factor, is cheaper than working on the whole matrix
// (Chan 1982; the flop counts cross near 1.6).
const tallRatio = 1.6

// SVD holds a factorization A = U diag(s) V^H. The zero value is ready; one object serves many matrices, one after the other, and
// keeps its memory. It is not for concurrent use.
//
// The way: for a wide A work on A^H; QR first for a tall one; blocked Householder reduction to a real upper bidiagonal B = Q^H A P,
// also for complex A (Dongarra, Sorensen, Hammarling 1989); divide and conquer on B; Q and P are applied only to the vectors that are
// asked for.
type SVD[T Scalar] struct {
	Work *Workspace[T] // scratch memory, which objects that take turns may share, and its Stop; nil: some of its own

	m, n   int  // A
	wide   bool // m < n: the fields below are those of A^H
	tall   bool // QR came first
	rows   int  // of the matrix that was made bidiagonal
	cols   int  // min(m, n)
	direct bool // netlib: u and vh hold the vectors themselves, U cols wide

	values      []float64
	b           bidiagonalSVD
	outer       reflectors[T] // of the QR factorization
	left, right reflectors[T] // Q and P
	f           []T           // netlib's copy of A
	u, vh       []T
}

// Factor decomposes the m×n matrix A, which is not modified. The error is a *NumericalError, A holds NaN or Inf, or the iteration
// does not converge (never seen), or ErrStopped.
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
	f.Work = orNew(f.Work)
	f.direct = useNetlib() && !f.Work.stopped() && f.factorNetlib(s, a, lda)
	if !f.direct {
		if err := f.factorGo(s, a, lda); err != nil {
			f.m, f.n, f.cols, f.values = 0, 0, 0, f.values[:0]
			return err
		}
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

func (f *SVD[T]) factorGo(s float64, a []T, lda int) error {
	rows, cols := max(f.m, f.n), f.cols
	defer f.Work.release(f.Work.mark())
	f.tall = float64(rows) > tallRatio*float64(cols)
	x := f.Work.elems.take(rows * cols)
	if f.wide != f.tall {
		adjoint(f.m, f.n, a, lda, x, f.m)
	} else {
		copyMatrix(f.m, f.n, 1, a, lda, x, f.n)
	}
	if s != 1 {
		copyMatrix(1, rows*cols, s, x, rows*cols, x, rows*cols)
	}
	f.rows = rows
	if f.tall {
		// x is the adjoint, cols×rows: its L is the adjoint of R.
		l := f.Work.elems.take(cols * cols)
		if !f.outer.factor(cols, rows, x, l, cols, f.Work) {
			return ErrStopped
		}
		f.rows, x = cols, x[:cols*cols]
		adjoint(cols, cols, l, cols, x, cols)
	}
	d, e := f.Work.reals.take(cols), f.Work.reals.take(cols)
	if !bidiagonalize(f.rows, cols, x, d, e, &f.left, &f.right, f.Work) {
		return ErrStopped
	}
	if !f.b.factor(d, e, f.Work.Stop) {
		if f.b.m.halted {
			return ErrStopped
		}
		return &NumericalError{svdRoutine, f.m, f.n, "the iteration did not converge"}
	}
	f.b.sorted(f.values)
	return nil
}

// Values returns the min(m, n) singular values, decreasing. The slice belongs to f and is valid until the next Factor.
func (f *SVD[T]) Values() []float64 { return f.values }

// Vectors writes the first keep columns of U to u (m×keep) and the first keep rows of V^H to vh (keep×n). The error is ErrStopped;
// without a Stop there is none.
func (f *SVD[T]) Vectors(keep int, u []T, ldu int, vh []T, ldvh int) error {
	if keep < 0 || keep > f.cols {
		panic(fmt.Sprintf("dense: %d singular vectors asked of a %d×%d matrix", keep, f.m, f.n))
	}
	matrix("U", f.m, keep, ldu, len(u))
	matrix("V^H", keep, f.n, ldvh, len(vh))
	if keep == 0 {
		return nil
	}
	f.b.m.stop, f.b.m.halted = f.Work.Stop, false
	done := true
	switch {
	case f.direct:
		copyMatrix(f.m, keep, 1, f.u, f.cols, u, ldu)
		copyMatrix(keep, f.n, 1, f.vh, f.n, vh, ldvh)
	case f.wide:
		done = f.leftVectors(keep, vh, ldvh) && f.rightVectors(keep, u, ldu, true)
	default:
		defer f.Work.release(f.Work.mark())
		uh := f.Work.elems.take(keep * f.m)
		if done = f.leftVectors(keep, uh, f.m); done {
			adjoint(keep, f.m, uh, f.m, u, ldu)
			done = f.rightVectors(keep, vh, ldvh, false)
		}
	}
	if !done {
		return ErrStopped
	}
	return nil
}

// leftVectors writes the conjugate transposes of the first keep left singular vectors of the tall form of A. It reports false if it was
// stopped, as rightVectors does.
func (f *SVD[T]) leftVectors(keep int, uh []T, ldu int) bool {
	if !f.widen(keep, true, uh, ldu) {
		return false
	}
	rows := max(f.m, f.n)
	for i := range keep {
		clear(uh[i*ldu+f.cols : i*ldu+rows])
	}
	return f.left.applyAdjoint(keep, uh, ldu, f.Work) && (!f.tall || f.outer.applyAdjoint(keep, uh, ldu, f.Work))
}

// rightVectors writes the conjugate transposes of the first keep right singular vectors of the tall form of A, or the vectors.
func (f *SVD[T]) rightVectors(keep int, v []T, ldv int, columns bool) bool {
	vh, ldvh := v, ldv
	if columns {
		defer f.Work.release(f.Work.mark())
		vh, ldvh = f.Work.elems.take(keep*f.cols), f.cols
	}
	if !f.widen(keep, false, vh, ldvh) || !f.right.applyAdjoint(keep, vh, ldvh, f.Work) {
		return false
	}
	if columns {
		adjoint(keep, f.cols, vh, ldvh, v, ldv)
	}
	return true
}

// widen writes the first keep singular vectors of B to the rows of x. It reports false if it was stopped.
func (f *SVD[T]) widen(keep int, left bool, x []T, ldx int) bool {
	defer f.Work.release(f.Work.mark())
	y := f.Work.reals.take(keep * f.cols)
	if !f.b.vectors(keep, left, y) {
		return false
	}
	for i := range keep {
		widenColumn(x[i*ldx:i*ldx+f.cols], y[i*f.cols:], 1)
	}
	return true
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
