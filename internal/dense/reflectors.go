package dense

// reflectors is a product Q = H_0 H_1 ... H_(count-1) of reflections H_i = 1 - tau_i v_i v_i^H. Row i of the count×length matrix rows
// holds v_i^H: zeros, a one at column i+shift, the rest. Blocks of them act as 1 - V T V^H (Schreiber, Van Loan 1989).
type reflectors[T Scalar] struct {
	count, length, shift int
	rows                 []T
	tau                  []T
	t                    []T // upper triangles T, one of width×width a block, stride width
	width                int
}

// blockWidth is the number of reflections that are applied at once; BenchmarkSVD and BenchmarkQR set it anew.
func blockWidth(count int) int {
	if count <= 256 {
		return min(count, 16)
	}
	return 32
}

// reset makes room for so many reflections.
func (h *reflectors[T]) reset(count, length, shift int) {
	h.count, h.length, h.shift, h.width = count, length, shift, blockWidth(count)
	h.rows, h.tau = resize(h.rows, count*length), resize(h.tau, count)
	if h.width > 0 {
		h.t = resize(h.t, (count+h.width-1)/h.width*h.width*h.width)
	}
}

// block returns the triangle of the block that starts at reflection i.
func (h *reflectors[T]) block(i int) []T { return h.t[i*h.width:][:h.width*h.width] }

// close computes the triangles once rows and tau are there.
func (h *reflectors[T]) close() {
	for i := 0; i < h.count; i += h.width {
		n, from := min(h.width, h.count-i), i+h.shift
		rows := h.rows[i*h.length+from:]
		triangle(n, h.length-from, rows, h.length, h.tau[i:], h.block(i), h.width)
	}
}

// triangle computes the n×n upper triangle T of n reflections in rows of the given length.
func triangle[T Scalar](n, length int, rows []T, ld int, tau []T, t []T, ldt int) {
	if n == 0 {
		return
	}
	Gemm(NoTrans, ConjTrans, n, n, length, 1, rows, ld, rows, ld, 0, t, ldt)
	// T[:i,i] = -tau_i T[:i,:i] (V^H v_i)[:i], from the top down in place.
	for i := range n {
		for r := range i {
			var sum T
			for c := r; c < i; c++ {
				sum += t[r*ldt+c] * t[c*ldt+i]
			}
			t[r*ldt+i] = -tau[i] * sum
		}
		clear(t[i*ldt : i*ldt+i])
		t[i*ldt+i] = tau[i]
	}
}

// applyRight replaces C (m×length) by C (1 - V op(T) V^H) for n reflections in rows; ConjTrans is the adjoint. work holds 2 m n numbers.
func applyRight[T Scalar](op Op, m, n, length int, rows []T, ld int, t []T, ldt int, c []T, ldc int, work []T) {
	if m == 0 || n == 0 {
		return
	}
	x, y := work[:m*n], work[m*n:2*m*n]
	Gemm(NoTrans, ConjTrans, m, n, length, 1, c, ldc, rows, ld, 0, x, n)
	Gemm(NoTrans, op, m, n, n, 1, x, n, t, ldt, 0, y, n)
	Gemm(NoTrans, NoTrans, m, length, n, FromFloat[T](-1), y, n, rows, ld, 1, c, ldc)
}

// applyAdjoint replaces C (m×length) by C Q^H. It reports false if it was stopped.
func (h *reflectors[T]) applyAdjoint(m int, c []T, ldc int, w *Workspace[T]) bool {
	if h.count == 0 {
		return true
	}
	defer w.release(w.mark())
	work := w.elems.take(2 * m * h.width)
	for i := (h.count - 1) / h.width * h.width; i >= 0; i -= h.width {
		if w.stopped() {
			return false
		}
		n, from := min(h.width, h.count-i), i+h.shift
		applyRight(ConjTrans, m, n, h.length-from, h.rows[i*h.length+from:], h.length, h.block(i), h.width, c[from:], ldc, work)
	}
	return true
}

// formAdjoint writes the first k rows of Q^H to q, k = count. It reports false if it was stopped.
func (h *reflectors[T]) formAdjoint(q []T, ldq int, w *Workspace[T]) bool {
	defer w.release(w.mark())
	work := w.elems.take(2 * h.count * h.width)
	for i := range h.count {
		clear(q[i*ldq : i*ldq+h.length])
		q[i*ldq+i] = FromFloat[T](1)
	}
	for i := (h.count - 1) / h.width * h.width; i >= 0; i -= h.width {
		if w.stopped() {
			return false
		}
		n, from := min(h.width, h.count-i), i+h.shift
		applyRight(ConjTrans, h.count-i, n, h.length-from, h.rows[i*h.length+from:], h.length, h.block(i), h.width, q[i*ldq+from:], ldq, work)
	}
	return true
}
