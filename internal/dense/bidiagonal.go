package dense

// bidiagonalPanel is the number of columns and rows that are reduced before the rest of an m×n matrix is updated; BenchmarkSVD sets it
// anew.
func bidiagonalPanel(n int) int {
	if n < 384 {
		return 8
	}
	return 24
}

// bidiagonalize reduces the m×n matrix a, m >= n, no padding, to a real upper bidiagonal B = Q^H A P with diagonal d (n) and
// off-diagonal e (n-1 used). a is destroyed.
//
// In a panel the matrix is A - V Y^H - X U^H with V and U the reflections of the columns and rows done so far. The rows of vx are
// v_0^H, x_0^H, v_1^H, ..., those of yu y_0^H, u_0^H, ..., so that one product of a vector serves both terms.
func bidiagonalize[T Scalar](m, n int, a []T, d, e []float64, q, p *reflectors[T], w *Workspace[T]) {
	defer w.release(w.mark())
	q.reset(n, m, 0)
	p.reset(max(0, n-1), n, 1)
	clear(q.rows)
	clear(p.rows)
	width := bidiagonalPanel(n)
	vx, yu := w.elems.take(2*width*m), w.elems.take(2*width*n)
	x := bidiagonalPanelState[T]{m: m, n: n, a: a, vx: vx, yu: yu, q: q, p: p,
		s: w.elems.take(2 * width), v: w.elems.take(m), u: w.elems.take(n)}
	for k := 0; k < n; k += width {
		size := min(width, n-k)
		clear(vx)
		clear(yu)
		for i := range size {
			d[k+i] = x.column(k+i, 2*i)
			if k+i+1 < n {
				e[k+i] = x.row(k+i, 2*i)
			}
		}
		if next := k + size; next < n {
			Gemm(ConjTrans, NoTrans, m-next, n-next, 2*size, FromFloat[T](-1), vx[next:], m, yu[next:], n, 1, a[next*n+next:], n)
		}
	}
	q.close()
	p.close()
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
}

// column brings column k up to date with the first done rows of vx and yu, makes its reflection, and the row y^H; it returns the
// diagonal element.
func (b *bidiagonalPanelState[T]) column(k, done int) float64 {
	m, n := b.m, b.n
	v, vh := b.v[:m-k], b.q.rows[k*m+k:k*m+m]
	readColumn(k, b.a[k*n:], n, v)
	Conjugate(v, v)
	if done > 0 {
		s := b.s[:done]
		readColumn(k, b.yu, n, s)
		negateConjugate(s)
		addCombination(done, m-k, s, b.vx[k:], m, v)
	}
	Conjugate(v, v)
	beta, tau := reflector(v)
	b.q.tau[k] = tau
	Conjugate(vh, v)
	copy(b.vx[done*m+k:], vh)
	if k+1 == n {
		return beta
	}
	y := b.yu[done*n+k+1 : done*n+n]
	matVec(Trans, m-k, n-k-1, b.a[k*n+k+1:], n, vh, y)
	if done > 0 {
		s := b.s[:done]
		matVec(NoTrans, done, m-k, b.vx[k:], m, v, s)
		negateConjugate(s)
		addCombination(done, n-k-1, s, b.yu[k+1:], n, y)
	}
	Scale(Conj(tau), y)
	return beta
}

// row does the same for row k right of the diagonal, and makes x^H; it returns the off-diagonal element.
func (b *bidiagonalPanelState[T]) row(k, done int) float64 {
	m, n := b.m, b.n
	u, uh := b.u[:n-k-1], b.p.rows[k*n+k+1:k*n+n]
	copy(u, b.a[k*n+k+1:])
	s := b.s[:done+1]
	readColumn(k, b.vx, m, s)
	negateConjugate(s)
	addCombination(done+1, n-k-1, s, b.yu[k+1:], n, u)
	Conjugate(u, u)
	beta, tau := reflector(u)
	b.p.tau[k] = tau
	Conjugate(uh, u)
	copy(b.yu[(done+1)*n+k+1:], uh)
	if k+1 == m {
		return beta
	}
	x := b.vx[(done+1)*m+k+1 : (done+1)*m+m]
	matVec(NoTrans, m-k-1, n-k-1, b.a[(k+1)*n+k+1:], n, u, x)
	Conjugate(x, x)
	matVec(NoTrans, done+1, n-k-1, b.yu[k+1:], n, u, s)
	negateConjugate(s)
	addCombination(done+1, m-k-1, s, b.vx[k+1:], m, x)
	Scale(Conj(tau), x)
	return beta
}

// addCombination adds sum_i s_i rows_i to x; the rows are those of a count×length matrix.
func addCombination[T Scalar](count, length int, s []T, rows []T, ld int, x []T) {
	for i := range count {
		Axpy(s[i], rows[i*ld:i*ld+length], x[:length])
	}
}

// readColumn copies column j of a into x.
func readColumn[T Scalar](j int, a []T, lda int, x []T) {
	for i := range x {
		x[i] = a[i*lda+j]
	}
}

func identity(n int, a []float64) {
	clear(a)
	for i := range n {
		a[i*n+i] = 1
	}
}

// writeColumn copies x into column j of a.
func writeColumn[T Scalar](j int, a []T, lda int, x []T) {
	for i := range x {
		a[i*lda+j] = x[i]
	}
}
