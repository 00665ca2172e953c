package dense

// bidiagonalPanel is the number of columns and rows that are reduced before the rest of an m×n matrix is updated; BenchmarkSVD sets it
// anew.
func bidiagonalPanel(n int) int {
	if n < 384 {
		return 8
	}
	return 12
}

// bidiagonalize reduces the m×n matrix a, m >= n, no padding, to a real upper bidiagonal B = Q^H A P with diagonal d (n) and
// off-diagonal e (n-1 used). a is destroyed. It reports false if it was stopped.
//
// In a panel the matrix is A - V Y^H - X U^H with V and U the reflections of the columns and rows done so far. The rows of vx are
// v_0^H, x_0^H, v_1^H, ..., those of yu y_0^H, u_0^H, ..., so that one product of a vector serves both terms.
func bidiagonalize[T Scalar](m, n int, a []T, d, e []float64, q, p *reflectors[T], w *Workspace[T]) bool {
	defer w.release(w.mark())
	q.reset(n, m, 0)
	p.reset(max(0, n-1), n, 1)
	clear(q.rows)
	clear(p.rows)
	width := bidiagonalPanel(n)
	vx, yu := w.elems.take(2*width*m), w.elems.take(2*width*n)
	x := bidiagonalPanelState[T]{m: m, n: n, a: a, vx: vx, yu: yu, q: q, p: p,
		s: w.elems.take(2 * width), v: w.elems.take(m), u: w.elems.take(n), x: w.elems.take(m)}
	for k := 0; k < n; k += width {
		if w.stopped() {
			return false
		}
		size := min(width, n-k)
		clear(vx)
		clear(yu)
		for i := range size {
			d[k+i] = x.column(k+i, 2*i)
			if k+i+1 < n {
				x.sweep(k+i, 2*i)
				e[k+i] = x.row(k+i, 2*i)
			}
		}
		if next := k + size; next < n {
			Gemm(ConjTrans, NoTrans, m-next, n-next, 2*size, FromFloat[T](-1), vx[next:], m, yu[next:], n, 1, a[next*n+next:], n)
		}
	}
	q.close()
	p.close()
	return true
}

// bidiagonalPanelState is what bidiagonalize carries from column to column.
type bidiagonalPanelState[T Scalar] struct {
	m, n   int
	a      []T
	vx, yu []T
	q, p   *reflectors[T]
	s      []T // 2 panel widths
	v      []T // m
	u      []T // n
	x      []T // m
}

// column brings column k up to date with the first done rows of vx and yu and makes its reflection; it returns the diagonal element.
func (b *bidiagonalPanelState[T]) column(k, done int) float64 {
	m, n := b.m, b.n
	v, vh := b.v[:m-k], b.q.rows[k*m+k:k*m+m]
	readColumn(k, b.a[k*n:], n, v)
	Conjugate(v, v)
	s := b.s[:done]
	readColumn(k, b.yu, n, s)
	Conjugate(s, s)
	matVec(Trans, done, m-k, -1, b.vx[k:], m, s, 1, v)
	Conjugate(v, v)
	beta, tau := reflector(v)
	b.q.tau[k] = tau
	Conjugate(vh, v)
	copy(b.vx[done*m+k:], vh)
	return beta
}

// sweepBytes is the size of the piece of the matrix that sweep reads twice: it should stay in the cache meanwhile. BenchmarkSVD sets it
// anew.
const sweepBytes = 640 << 10

// sweep makes y^H, and row k right of the diagonal up to date as the column u to reflect, and x = A u. A is read once: as soon as some
// columns of A have given their part of y^H, that part of u is known and they serve for x (Howell, Demmel, Fulton, Hammarling,
// Marmol, ACM TOMS 34, 14 (2008)).
func (b *bidiagonalPanelState[T]) sweep(k, done int) {
	m, n := b.m, b.n
	v, vh, tau := b.v[:m-k], b.q.rows[k*m+k:k*m+m], Conj(b.q.tau[k])
	y, u, x := b.yu[done*n:done*n+n], b.u[:n], b.x[:m-k-1]

	// What the panel takes off y and off the row.
	s := b.s[:done]
	matVec(NoTrans, done, m-k, 1, b.vx[k:], m, v, 0, s)
	Conjugate(s, s)
	matVec(Trans, done, n-k-1, -tau, b.yu[k+1:], n, s, 0, y[k+1:])
	copy(u[k+1:], b.a[k*n+k+1:k*n+n])
	readColumn(k, b.vx, m, s)
	Conjugate(s, s)
	matVec(Trans, done, n-k-1, -1, b.yu[k+1:], n, s, 1, u[k+1:])

	clear(x)
	width := max(32, sweepBytes/(8*(m-k)*realParts[T]())&^7)
	for j := k + 1; j < n; j += width {
		end := min(j+width, n)
		matVec(Trans, m-k, end-j, tau, b.a[k*n+j:], n, vh, 1, y[j:end])
		Axpy(-1, y[j:end], u[j:end])
		Conjugate(u[j:end], u[j:end])
		matVec(NoTrans, m-k-1, end-j, 1, b.a[(k+1)*n+j:], n, u[j:end], 1, x)
	}
}

// row makes the reflection of row k and x^H; it returns the off-diagonal element.
func (b *bidiagonalPanelState[T]) row(k, done int) float64 {
	m, n := b.m, b.n
	u, uh := b.u[k+1:n], b.p.rows[k*n+k+1:k*n+n]
	alpha := u[0]
	beta, tau := reflector(u)
	b.p.tau[k] = tau
	Conjugate(uh, u)
	copy(b.yu[(done+1)*n+k+1:], uh)
	x := b.vx[(done+1)*m+k+1 : (done+1)*m+m]
	if tau == 0 {
		clear(x)
		return beta
	}
	// The reflector made (u - beta e_0)/(alpha - beta) of u.
	readColumn(k+1, b.a[(k+1)*n:], n, x)
	Scale(FromFloat[T](-beta), x)
	Axpy(1, b.x[:m-k-1], x)
	Scale(1/(alpha-FromFloat[T](beta)), x)
	Conjugate(x, x)
	s := b.s[:done+1]
	matVec(NoTrans, done+1, n-k-1, 1, b.yu[k+1:], n, u, 0, s)
	Conjugate(s, s)
	matVec(Trans, done+1, m-k-1, -1, b.vx[k+1:], m, s, 1, x)
	Scale(Conj(tau), x)
	return beta
}

// readColumn copies column j of a into x.
func readColumn[T Scalar](j int, a []T, lda int, x []T) {
	for i := range x {
		x[i] = a[i*lda+j]
	}
}

// writeColumn copies x into column j of a.
func writeColumn[T Scalar](j int, a []T, lda int, x []T) {
	for i := range x {
		a[i*lda+j] = x[i]
	}
}

// realParts is the number of real numbers in a T.
func realParts[T Scalar]() int {
	if IsComplex[T]() {
		return 2
	}
	return 1
}
