package dense

// QR writes A = Q R for the m×n matrix A, k = min(m, n): Q (m×k) has orthonormal columns, R (k×n) is zero below a diagonal that is
// real and not negative, which makes the pair unique when A has full rank. A is not modified and must not overlap Q or R. An A that
// holds NaN or Inf gives factors that do.
func QR[T Scalar](m, n int, a []T, lda int, q []T, ldq int, r []T, ldr int, w *Workspace[T]) {
	k := min(m, n)
	matrix("A", m, n, lda, len(a))
	matrix("Q", m, k, ldq, len(q))
	matrix("R", k, n, ldr, len(r))
	if k == 0 {
		return
	}
	w = orNew(w)
	defer w.release(w.mark())
	s := safeScale(largest(m, n, a, lda))
	f := w.elems.take(m * n)
	copyMatrix(m, n, s, a, lda, f, n)
	signs := w.reals.take(k)
	tau := w.elems.take(k)
	factorQR(m, n, f, n, signs, tau, w)
	for i := range k {
		row := r[i*ldr : i*ldr+n]
		clear(row[:i])
		copy(row[i:], f[i*n+i:i*n+n])
		if c := signs[i] / s; c != 1 {
			Scale(FromFloat[T](c), row[i:])
		}
	}
	formQ(m, k, f, n, signs, tau, q, ldq, w)
}

// factorQR overwrites the m×n matrix f by R (unsigned) on and above the diagonal and the reflectors below it. signs[i] = ±1 times
// row i of R, and column i of Q, makes the diagonal not negative.
func factorQR[T Scalar](m, n int, f []T, ldf int, signs []float64, tau []T, w *Workspace[T]) {
	defer w.release(w.mark())
	v, vc, work := w.elems.take(m), w.elems.take(m), w.elems.take(n)
	for i := range min(m, n) {
		v, vc := v[:m-i], vc[:m-i]
		readColumn(i, f[i*ldf:], ldf, v)
		var beta float64
		beta, tau[i] = reflector(v)
		signs[i] = 1
		if beta < 0 {
			signs[i] = -1
		}
		writeColumn(i, f[i*ldf:], ldf, v)
		f[i*ldf+i] = FromFloat[T](beta)
		if i+1 < n {
			Conjugate(vc, v)
			reflectLeft(m-i, n-i-1, Conj(tau[i]), v, vc, f[i*ldf+i+1:], ldf, work)
		}
	}
}

// formQ multiplies out the first k reflectors that factorQR left in f.
func formQ[T Scalar](m, k int, f []T, ldf int, signs []float64, tau []T, q []T, ldq int, w *Workspace[T]) {
	defer w.release(w.mark())
	v, vc, work := w.elems.take(m), w.elems.take(m), w.elems.take(k)
	for i := range m {
		clear(q[i*ldq : i*ldq+k])
	}
	for i := k - 1; i >= 0; i-- {
		q[i*ldq+i] = FromFloat[T](signs[i])
		v, vc := v[:m-i], vc[:m-i]
		readColumn(i, f[i*ldf:], ldf, v)
		v[0] = FromFloat[T](1)
		Conjugate(vc, v)
		reflectLeft(m-i, k-i, tau[i], v, vc, q[i*ldq+i:], ldq, work)
	}
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

// LQ writes A = L Q for the m×n matrix A, k = min(m, n): L (m×k) is zero above a real, not negative diagonal and Q (k×n) has
// orthonormal rows. Otherwise as QR.
func LQ[T Scalar](m, n int, a []T, lda int, l []T, ldl int, q []T, ldq int, w *Workspace[T]) {
	k := min(m, n)
	matrix("A", m, n, lda, len(a))
	matrix("L", m, k, ldl, len(l))
	matrix("Q", k, n, ldq, len(q))
	if k == 0 {
		return
	}
	w = orNew(w)
	defer w.release(w.mark())
	ah, qh, rh := w.elems.take(m*n), w.elems.take(n*k), w.elems.take(k*m)
	adjoint(m, n, a, lda, ah, m)
	QR(n, m, ah, m, qh, k, rh, m, w)
	adjoint(n, k, qh, k, q, ldq)
	adjoint(k, m, rh, m, l, ldl)
}
