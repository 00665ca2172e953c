package dense

// QR writes A = Q R for the m×n matrix A, k = min(m, n): Q (m×k) has orthonormal columns, R (k×n) is zero below a diagonal that is
// real and not negative, which makes the pair unique when A has full rank. A is not modified and must not overlap Q or R. An A that
// holds NaN or Inf gives factors that do. The error is ErrStopped; without a Stop there is none.
func QR[T Scalar](m, n int, a []T, lda int, q []T, ldq int, r []T, ldr int, w *Workspace[T]) error {
	k := min(m, n)
	matrix("A", m, n, lda, len(a))
	matrix("Q", m, k, ldq, len(q))
	matrix("R", k, n, ldr, len(r))
	if k == 0 {
		return nil
	}
	w = orNew(w)
	defer w.release(w.mark())
	ah, lh, qh := w.elems.take(m*n), w.elems.take(n*k), w.elems.take(k*m)
	adjoint(m, n, a, lda, ah, m)
	if err := w.lq(n, m, ah, lh, k, qh, m); err != nil {
		return err
	}
	adjoint(k, m, qh, m, q, ldq)
	adjoint(n, k, lh, k, r, ldr)
	return nil
}

// LQ writes A = L Q for the m×n matrix A, k = min(m, n): L (m×k) is zero above a real, not negative diagonal and Q (k×n) has
// orthonormal rows. Otherwise as QR.
func LQ[T Scalar](m, n int, a []T, lda int, l []T, ldl int, q []T, ldq int, w *Workspace[T]) error {
	k := min(m, n)
	matrix("A", m, n, lda, len(a))
	matrix("L", m, k, ldl, len(l))
	matrix("Q", k, n, ldq, len(q))
	if k == 0 {
		return nil
	}
	w = orNew(w)
	defer w.release(w.mark())
	f := w.elems.take(m * n)
	copyMatrix(m, n, 1, a, lda, f, n)
	return w.lq(m, n, f, l, ldl, q, ldq)
}

// lq factors the m×n matrix f, no padding, which it destroys.
func (w *Workspace[T]) lq(m, n int, f []T, l []T, ldl int, q []T, ldq int) error {
	k, h := min(m, n), &w.rows
	s := safeScale(largest(m, n, f, n))
	if s != 1 {
		copyMatrix(m, n, s, f, n, f, n)
	}
	if !h.factor(m, n, f, l, ldl, w) || !h.formAdjoint(q, ldq, w) {
		return ErrStopped
	}
	one := FromFloat[T](1)
	for j := range k {
		scale := one
		if Real(l[j*ldl+j]) < 0 {
			scale = -one
			Scale(scale, q[j*ldq:j*ldq+n])
		}
		if scale *= FromFloat[T](1 / s); scale != one {
			for i := j; i < m; i++ {
				l[i*ldl+j] *= scale
			}
		}
	}
	return nil
}

// factor reduces the m×n matrix A, no padding, to A P = L with L (m×k) lower trapezoidal, k = min(m, n); h becomes P. A is destroyed. It
// reports false if it was stopped.
func (h *reflectors[T]) factor(m, n int, a []T, l []T, ldl int, w *Workspace[T]) bool {
	k := min(m, n)
	h.reset(k, n, 0)
	defer w.release(w.mark())
	work := w.elems.take(2 * m * max(h.width, 1))
	copy(h.rows, a[:k*n])
	for i := 0; i < k; i += h.width {
		if w.stopped() {
			return false
		}
		size := min(h.width, k-i)
		h.panel(i, i, size, l, ldl, work)
		end := i + size
		block, t := h.rows[i*n+i:], h.block(i)
		if end < k {
			applyRight(NoTrans, k-end, size, n-i, block, n, t, h.width, h.rows[end*n+i:], n, work)
			h.harvest(i, size, end, k, l, ldl)
		}
		if k < m { // rows that do not become reflections
			applyRight(NoTrans, m-k, size, n-i, block, n, t, h.width, a[k*n+i:], n, work)
			for r := k; r < m; r++ {
				copy(l[r*ldl+i:r*ldl+end], a[r*n+i:])
			}
		}
	}
	return true
}

// harvest moves the finished columns i..i+size-1 of the rows from..to-1 to L and clears them.
func (h *reflectors[T]) harvest(i, size, from, to int, l []T, ldl int) {
	for r := from; r < to; r++ {
		done := h.rows[r*h.length+i:][:size]
		copy(l[r*ldl+i:], done)
		clear(done)
	}
}

// leafRows is the number of rows below which a panel is reduced row by row.
const leafRows = 8

// panel reduces the rows i..i+size-1, whose columns before i are done, of the block that starts at row start, and computes their
// triangle: the first half, then the second after an update by it (Elmroth, Gustavson 2000).
func (h *reflectors[T]) panel(start, i, size int, l []T, ldl int, work []T) {
	n, at := h.length, i-start
	t := h.block(start)[at*h.width+at:]
	if size <= leafRows {
		for r := i; r < i+size; r++ {
			h.reflectRow(r, i+size, l, ldl)
		}
		triangle(size, n-i, h.rows[i*n+i:], n, h.tau[i:], t, h.width)
		return
	}
	half := size / 2
	next := i + half
	h.panel(start, i, half, l, ldl, work)
	applyRight(NoTrans, size-half, half, n-i, h.rows[i*n+i:], n, t, h.width, h.rows[next*n+i:], n, work)
	h.harvest(i, half, next, i+size, l, ldl)
	h.panel(start, next, size-half, l, ldl, work)
	// T12 = -T1 (V1^H V2) T2.
	rest := size - half
	x, y := work[:half*rest], work[half*rest:2*half*rest]
	Gemm(NoTrans, ConjTrans, half, rest, n-next, 1, h.rows[i*n+next:], n, h.rows[next*n+next:], n, 0, x, rest)
	Gemm(NoTrans, NoTrans, half, rest, half, FromFloat[T](-1), t, h.width, x, rest, 0, y, rest)
	Gemm(NoTrans, NoTrans, half, rest, rest, 1, y, rest, t[half*h.width+half:], h.width, 0, t[half:], h.width)
	for r := half; r < size; r++ {
		clear(t[r*h.width : r*h.width+half])
	}
}

// reflectRow makes reflection r of row r and applies it to the rows up to end.
func (h *reflectors[T]) reflectRow(r, end int, l []T, ldl int) {
	n := h.length
	u := h.rows[r*n+r : r*n+n]
	clear(l[r*ldl+r : r*ldl+h.count])
	Conjugate(u, u) // a row x is a column x^H to its reflection: x G = beta e_0^T
	beta, tau := reflector(u)
	Conjugate(u, u)
	h.tau[r] = tau
	l[r*ldl+r] = FromFloat[T](beta)
	for i := r + 1; i < end; i++ {
		row := h.rows[i*n+r : i*n+n]
		if tau != 0 {
			Axpy(-tau*Dot(u, row), u, row)
		}
		l[i*ldl+r] = row[0]
		row[0] = 0
	}
}
