package dense

// tridiagonalPanel is the number of columns that are reduced before the rest of the matrix is updated, stripRows the height of the
// strips in which the upper half of the matrix is read and updated: low enough that little is wasted on the squares on the diagonal,
// which are read whole. BenchmarkEigen sets them anew.
const (
	tridiagonalPanel = 8
	stripRows        = 32
)

// stripStart returns the first row of the strip that holds row i; also the first column of which that row's entries are read.
func stripStart(i int) int { return i - i%stripRows }

// tridiagonal is what the reduction of a Hermitian matrix carries from column to column. In a panel the matrix is A - V W^H - W V^H
// with V the reflections done so far. The rows of vw are v_0^H, w_0^H, v_1^H, ..., those of wv w_0^H, v_0^H, ....
type tridiagonal[T Scalar] struct {
	n      int
	a      []T // n×n; the upper triangle and whatever belongs to blocks on the diagonal
	vw, wv []T
	q      *reflectors[T]
	s      []T // 2 panel widths
	v, y   []T // n
}

// tridiagonalize reduces the n×n Hermitian matrix a, no padding, to a real tridiagonal Q^H A Q with diagonal d (n) and off-diagonal e
// (n-1 used). a is destroyed; of entries below the diagonal only those from the start of the strip on are read. It reports false if
// it was stopped.
func tridiagonalize[T Scalar](n int, a []T, d, e []float64, q *reflectors[T], w *Workspace[T]) bool {
	defer w.release(w.mark())
	q.reset(max(0, n-1), n, 1)
	clear(q.rows)
	const width = tridiagonalPanel
	x := tridiagonal[T]{n: n, a: a, vw: w.elems.take(2 * width * n), wv: w.elems.take(2 * width * n), q: q,
		s: w.elems.take(2 * width), v: w.elems.take(n), y: w.elems.take(n)}
	for k := 0; k < n; k += width {
		if w.stopped() {
			return false
		}
		size := min(width, n-k)
		clear(x.vw)
		clear(x.wv)
		for i := range size {
			d[k+i], e[k+i] = x.column(k+i, 2*i)
		}
		x.update(k+size, 2*size)
	}
	q.close()
	return true
}

// update subtracts the panel from the strips of the rows from `from` on.
func (x *tridiagonal[T]) update(from, count int) {
	n := x.n
	for i := from; i < n; {
		end := min(n, stripStart(i)+stripRows)
		Gemm(ConjTrans, NoTrans, end-i, n-i, count, FromFloat[T](-1), x.vw[i:], n, x.wv[i:], n, 1, x.a[i*n+i:], n)
		i = end
	}
}

// column brings row k up to date with the first done rows of vw and wv, makes the reflection of column k, and w^H; it returns the
// diagonal and the off-diagonal element.
func (x *tridiagonal[T]) column(k, done int) (diagonal, off float64) {
	n := x.n
	row, s := x.y[:n-k], x.s[:done]
	copy(row, x.a[k*n+k:])
	readColumn(k, x.vw, n, s)
	Conjugate(s, s)
	matVec(Trans, done, n-k, -1, x.wv[k:], n, s, 1, row)
	diagonal = Real(row[0])
	if k+1 == n {
		return diagonal, 0
	}
	v, vh := x.v[:n-k-1], x.q.rows[k*n+k+1:k*n+n]
	Conjugate(v, row[1:])
	off, tau := reflector(v)
	x.q.tau[k] = tau
	Conjugate(vh, v)
	if tau == 0 {
		return diagonal, off
	}
	// With p = tau A v: H^H A H = A - w v^H - v w^H, w = p - (conj(tau)/2) (v^H p) v.
	w := x.vw[(done+1)*n+k+1 : (done+1)*n+n]
	x.multiply(k+1, v, vh, w)
	matVec(NoTrans, done, n-k-1, 1, x.wv[k+1:], n, v, 0, s)
	Conjugate(s, s)
	matVec(Trans, done, n-k-1, -1, x.vw[k+1:], n, s, 1, w)
	Scale(Conj(tau), w)
	Axpy(-tau*Dot(vh, w)/FromFloat[T](2), vh, w)
	copy(x.wv[done*n+k+1:], w)
	copy(x.vw[done*n+k+1:], vh)
	copy(x.wv[(done+1)*n+k+1:], vh)
	return diagonal, off
}

// multiply writes conj(A v) for the rows and columns from `from` on; vh = conj(v). Each strip right of
// its square is read once and serves twice, as it is and as the columns below the diagonal.
func (x *tridiagonal[T]) multiply(from int, v, vh, out []T) {
	n := x.n
	clear(out)
	upper := x.y[:n-from]
	for i := from; i < n; {
		end := min(n, stripStart(i)+stripRows)
		matVec(NoTrans, end-i, end-i, 1, x.a[i*n+i:], n, v[i-from:], 0, upper[i-from:end-from])
		if end < n {
			twoProducts(end-i, n-end, x.a[i*n+end:], n, v[end-from:], vh[i-from:end-from], upper[i-from:end-from], out[end-from:])
		}
		i = end
	}
	Conjugate(upper, upper)
	Axpy(1, upper, out)
}
