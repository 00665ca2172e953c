package dense

import (
	"fmt"
	"math"
)

// PivotedQR writes A P = Q R for the m×n matrix A with column j of A P the column pivot[j] of A, chosen so that the diagonal of R is
// real, not negative and falls: its first numbers show the rank of A, but for artificial examples (Businger, Golub 1965). It stops when
// no column left is longer than tolerance times the longest column of A and returns the number of steps, the rank; zero goes on to the
// end. Columns of Q (m×min(m,n)) and rows of R (min(m,n)×n) beyond the rank are zero; Q R is then off by at most tolerance times
// that length in each column. A is not modified and must not overlap Q or R. The error is a *NumericalError, A holds NaN or Inf,
// or ErrStopped.
func PivotedQR[T Scalar](m, n int, a []T, lda int, q []T, ldq int, r []T, ldr int, pivot []int, tolerance float64, w *Workspace[T]) (rank int, err error) {
	k := min(m, n)
	matrix("A", m, n, lda, len(a))
	matrix("Q", m, k, ldq, len(q))
	matrix("R", k, n, ldr, len(r))
	if len(pivot) != n {
		panic(fmt.Sprintf("dense: room for %d pivots of a %d×%d matrix", len(pivot), m, n))
	}
	for j := range pivot {
		pivot[j] = j
	}
	top := largest(m, n, a, lda)
	if err := checkFinite("pivoted QR", m, n, top); err != nil || k == 0 {
		return 0, err
	}
	w = orNew(w)
	defer w.release(w.mark())
	p := pivoting[T]{m: m, n: n, k: k, pivot: pivot, h: &w.rows,
		x: w.elems.take(n * m), l: w.elems.take(n * k), g: w.elems.take(n * pivotPanel), s: w.elems.take(n + pivotPanel),
		norms: w.reals.take(n), sure: w.reals.take(n)}
	adjoint(m, n, a, lda, p.x, m)
	scale := safeScale(top)
	copyMatrix(n, m, scale, p.x, m, p.x, m)
	clear(p.l)
	rank, ok := p.factor(tolerance, w)
	if !ok {
		return 0, ErrStopped
	}

	qh := w.elems.take(k * m)
	clear(qh)
	if rank > 0 {
		p.h.close()
		if !p.h.formAdjoint(qh, m, w) {
			return 0, ErrStopped
		}
	}
	for j := range rank {
		s := 1.0
		if Real(p.l[j*k+j]) < 0 {
			s = -1
			Scale(FromFloat[T](s), qh[j*m:(j+1)*m])
		}
		if s /= scale; s != 1 {
			for i := j; i < n; i++ {
				p.l[i*k+j] *= FromFloat[T](s)
			}
		}
	}
	adjoint(k, m, qh, m, q, ldq)
	adjoint(n, k, p.l, k, r, ldr)
	return rank, nil
}

// pivotPanel is the number of reflections after which the rows left are updated by one product; BenchmarkPivotedQR sets it anew.
const pivotPanel = 16

// pivoting factors the rows of x = A^H: P^T x = L Q with reflections from the right. In a panel the rows left are x - g R, R the
// reflections of the panel (Quintana-Orti, Sun, Bischof 1998).
type pivoting[T Scalar] struct {
	m, n, k int
	pivot   []int
	h       *reflectors[T]
	x       []T       // n×m
	l       []T       // n×k
	g       []T       // n×pivotPanel
	s       []T       // scratch
	norms   []float64 // of what is left of each row
	sure    []float64 // the same when last computed in full
}

// factor returns the number of reflections, and false if it was stopped.
func (p *pivoting[T]) factor(tolerance float64, w *Workspace[T]) (rank int, ok bool) {
	p.h.reset(p.k, p.m, 0)
	clear(p.h.rows)
	longest := 0.0
	for i := range p.n {
		p.norms[i] = Norm(p.x[i*p.m : (i+1)*p.m])
		p.sure[i] = p.norms[i]
		longest = max(longest, p.norms[i])
	}
	for k := 0; k < p.k; {
		if w.stopped() {
			return 0, false
		}
		done, stop := p.panel(k, tolerance*longest)
		next := k + done
		if rest := p.n - next; rest > 0 && done > 0 && next < p.m {
			Gemm(NoTrans, NoTrans, rest, p.m-next, done, FromFloat[T](-1), p.g[next*pivotPanel:], pivotPanel, p.h.rows[k*p.m+next:], p.m, 1, p.x[next*p.m+next:], p.m)
		}
		if stop {
			p.h.count = next
			return next, true
		}
		for i := next; i < p.n; i++ {
			if p.norms[i] < 0 { // too much has cancelled
				p.norms[i] = Norm(p.x[i*p.m+next : (i+1)*p.m])
				p.sure[i] = p.norms[i]
			}
		}
		k = next
	}
	return p.k, true
}

// panel makes reflections from k on until the panel is full or the length of a row has to be computed anew, which is marked by -1. It
// tells how many, and whether no row left is longer than floor.
func (p *pivoting[T]) panel(k int, floor float64) (done int, stop bool) {
	for ; done < min(pivotPanel, p.k-k); done++ {
		i := k + done
		best := i
		for j := i + 1; j < p.n; j++ {
			if p.norms[j] > p.norms[best] {
				best = j
			}
		}
		if p.norms[best] <= floor {
			return done, true
		}
		p.swap(i, best)
		p.reflect(k, i)
		if p.shorten(i) {
			return done + 1, false
		}
	}
	return done, false
}

// swap exchanges two rows of everything.
func (p *pivoting[T]) swap(i, j int) {
	if i == j {
		return
	}
	exchange(p.x[i*p.m:(i+1)*p.m], p.x[j*p.m:(j+1)*p.m])
	exchange(p.l[i*p.k:(i+1)*p.k], p.l[j*p.k:(j+1)*p.k])
	exchange(p.g[i*pivotPanel:(i+1)*pivotPanel], p.g[j*pivotPanel:(j+1)*pivotPanel])
	p.norms[i], p.norms[j] = p.norms[j], p.norms[i]
	p.sure[i], p.sure[j] = p.sure[j], p.sure[i]
	p.pivot[i], p.pivot[j] = p.pivot[j], p.pivot[i]
}

func exchange[T Scalar](x, y []T) {
	for i, a := range x {
		x[i], y[i] = y[i], a
	}
}

// reflect brings row i, of a panel that starts at k, up to date, makes its reflection and column i of L and g.
func (p *pivoting[T]) reflect(k, i int) {
	m, done := p.m, i-k
	row, uh := p.x[i*m+i:(i+1)*m], p.h.rows[i*m+i:(i+1)*m]
	for j := range done {
		Axpy(-p.g[i*pivotPanel+j], p.h.rows[(k+j)*m+i:(k+j+1)*m], row)
	}
	u := row
	Conjugate(u, u)
	beta, tau := reflector(u)
	Conjugate(uh, u)
	p.h.tau[i] = tau
	p.l[i*p.k+i] = FromFloat[T](beta)
	rest := p.n - i - 1
	if rest == 0 {
		return
	}
	// g[:,done] = tau (x - g R) u
	s, t := p.s[:rest], p.s[rest:rest+done]
	matVec(NoTrans, rest, m-i, 1, p.x[(i+1)*m+i:], m, u, 0, s)
	if done > 0 {
		matVec(NoTrans, done, m-i, 1, p.h.rows[k*m+i:], m, u, 0, t)
	}
	for r := range rest {
		g := p.g[(i+1+r)*pivotPanel:][:done+1]
		sum, left := s[r], p.x[(i+1+r)*m+i]
		for j := range done {
			sum -= g[j] * t[j]
			left -= g[j] * p.h.rows[(k+j)*m+i]
		}
		g[done] = tau * sum
		p.l[(i+1+r)*p.k+i] = left - g[done]
	}
}

// shorten takes column i of L off the lengths of the rows left and tells whether one has to be computed anew: it cannot be told from
// rounding any more (Drmac, Bujanovic 2008).
func (p *pivoting[T]) shorten(i int) (again bool) {
	for j := i + 1; j < p.n; j++ {
		norm := p.norms[j]
		if norm == 0 {
			continue
		}
		ratio := Abs(p.l[j*p.k+i]) / norm
		left := math.Max(0, (1-ratio)*(1+ratio))
		if q := norm / p.sure[j]; left*q*q <= 1.5e-8 {
			p.norms[j] = -1
			again = true
			continue
		}
		p.norms[j] = norm * math.Sqrt(left)
	}
	return again
}
