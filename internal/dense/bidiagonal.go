package dense

import (
	"gonum.org/v1/gonum/blas"
	lapack "gonum.org/v1/gonum/lapack/gonum"
)

// lapackRef is gonum's pure-Go LAPACK.
var lapackRef lapack.Implementation

// bidiagonalize reduces the m×n matrix a, m >= n, to a real upper bidiagonal B = Q^H A P with diagonal d (n) and off-diagonal e
// (n-1 used). Q = H_0 H_1 ..., P = G_0 G_1 ...; the vectors of H_k stay in column k below the diagonal, those of G_k in row k
// right of the off-diagonal, the leading 1 implied.
func bidiagonalize[T Scalar](m, n int, a []T, lda int, d, e []float64, tauQ, tauP []T, w *Workspace[T]) {
	defer w.release(w.mark())
	v, vc, work := w.elems.take(m), w.elems.take(m), w.elems.take(m)
	for k := range n {
		v, vc := v[:m-k], vc[:m-k]
		readColumn(k, a[k*lda:], lda, v)
		d[k], tauQ[k] = reflector(v)
		writeColumn(k, a[k*lda:], lda, v)
		if k+1 == n {
			break
		}
		Conjugate(vc, v)
		reflectLeft(m-k, n-k-1, Conj(tauQ[k]), v, vc, a[k*lda+k+1:], lda, work)

		// A row r is a column r^H to its reflector: r G = beta e_0^T.
		u := a[k*lda+k+1 : k*lda+n]
		uc := vc[:n-k-1]
		Conjugate(u, u)
		e[k], tauP[k] = reflector(u)
		Conjugate(uc, u)
		if k+1 < m {
			reflectRight(m-k-1, n-k-1, tauP[k], u, uc, a[(k+1)*lda+k+1:], lda, work)
		}
	}
}

// applyLeftReflectors replaces c (m×cols) by Q c for the reflectors that bidiagonalize left in the m×n matrix f.
func applyLeftReflectors[T Scalar](m, n int, f []T, tau []T, cols int, c []T, ldc int, w *Workspace[T]) {
	defer w.release(w.mark())
	v, vc, work := w.elems.take(m), w.elems.take(m), w.elems.take(cols)
	for k := n - 1; k >= 0; k-- {
		v, vc := v[:m-k], vc[:m-k]
		readColumn(k, f[k*n:], n, v)
		v[0] = FromFloat[T](1)
		Conjugate(vc, v)
		reflectLeft(m-k, cols, tau[k], v, vc, c[k*ldc:], ldc, work)
	}
}

// applyRightReflectors replaces c (rows×n) by c P^H for the reflectors that bidiagonalize left in f.
func applyRightReflectors[T Scalar](n int, f []T, tau []T, rows int, c []T, ldc int, w *Workspace[T]) {
	defer w.release(w.mark())
	v, vc, work := w.elems.take(n), w.elems.take(n), w.elems.take(rows)
	for k := n - 2; k >= 0; k-- {
		v, vc := v[:n-k-1], vc[:n-k-1]
		copy(v, f[k*n+k+1:])
		v[0] = FromFloat[T](1)
		Conjugate(vc, v)
		reflectRight(rows, n-k-1, Conj(tau[k]), v, vc, c[k+1:], ldc, work)
	}
}

// bidiagonalSVD overwrites d by the singular values, decreasing, of the bidiagonal (d, e) and left and right (n×n) by the transposed
// singular vectors. e is destroyed. Both factors are asked for in the form that Dbdsqr rotates along rows.
func bidiagonalSVD[T Scalar](d, e, left, right []float64, w *Workspace[T]) bool {
	defer w.release(w.mark())
	n := len(d)
	identity(n, left)
	identity(n, right)
	return lapackRef.Dbdsqr(blas.Upper, n, n, 0, n, d, e, right, n, nil, 1, left, n, w.reals.take(4*n))
}

func identity(n int, a []float64) {
	clear(a)
	for i := range n {
		a[i*n+i] = 1
	}
}
