package dense

import "math"

// tridiagonalEigen is the spectral decomposition of a real symmetric tridiagonal matrix T = Z^T diag(x) Z by divide and conquer
// (Cuppen 1981; Gu, Eisenstat 1995) down to single rows: T is two smaller ones plus a rank-one matrix that joins them. Eigenvectors
// are rows. The last merge stops short of its product: vectors computes the rows that are asked for.
type tridiagonalEigen struct {
	n       int
	scale   float64   // the true matrix is scale times the one solved
	d, e    []float64 // of T/scale
	values  []float64 // by row
	index   []int     // rows by increasing value
	rows    []float64 // n×n
	z       []float64 // by row: what the joining matrix of a merge couples to
	m       merge
	coupled []float64 // what collect copied of rows
	c       []float64 // coefficients of roots
	spare   []float64 // rows on their way
	all     []int     // 0, 1, ...
	chosen  []int     // roots that vectors was asked for
	y       []float64 // of TridiagonalEigen
}

// factor decomposes the matrix with diagonal d and off-diagonal e (len(d)-1 used). It reports false if a root is not found or, which
// m.halted tells, stop said so.
func (b *tridiagonalEigen) factor(d, e []float64, stop func() bool) bool {
	n := len(d)
	b.m.stop, b.m.halted = stop, false
	b.n = n
	b.d, b.e, b.z, b.values = resize(b.d, n), resize(b.e, n), resize(b.z, n), resize(b.values, n)
	b.scale = normalize(d, e, b.d, b.e)
	b.index, b.all = resize(b.index, n), counting(b.all, n)
	b.rows = resize(b.rows, n*n)
	clear(b.rows)
	b.m.reserve(n)
	return b.solve(0, n)
}

// sorted writes the eigenvalues to x, ascending.
func (b *tridiagonalEigen) sorted(x []float64) {
	for i := range x {
		x[i] = b.values[b.index[i]] * b.scale
	}
}

// solve decomposes the n rows and columns from lo on.
func (b *tridiagonalEigen) solve(lo, n int) bool {
	if n == 1 {
		b.values[lo], b.index[lo], b.rows[lo*b.n+lo] = b.d[lo], lo, 1
		return true
	}
	mid := lo + n/2
	rho := math.Abs(b.e[mid-1])
	b.d[mid-1] -= rho
	b.d[mid] -= rho
	return b.solve(lo, n/2) && b.solve(mid, n-n/2) && b.merge(lo, n)
}

func (b *tridiagonalEigen) merge(lo, size int) bool {
	m, mid := &b.m, lo+size/2
	b.deflate(lo, mid, lo+size)
	if !m.solveSecular(false) {
		return false
	}
	b.coupled = m.collect(b.rows, b.n, lo, mid-lo, lo+size-mid, mid, b.coupled)
	if size < b.n {
		k := len(m.poles)
		b.c = resize(b.c, k*k)
		m.coefficients(b.all[:k], b.c)
		b.spare = m.settle(b.rows, b.n, lo, size, b.spare)
		if !m.product(k, b.c, b.coupled, mid-lo, lo+size-mid, b.rows[lo*b.n+lo:], b.n, mid-lo) {
			return false
		}
	}
	m.finish(lo, b.values, b.index[lo:lo+size])
	return true
}

// deflate sets up the secular equation with those eigenvalues of the halves that the joining matrix, e times the square of (last
// unit vector of the first half, ± first of the second), couples.
func (b *tridiagonalEigen) deflate(lo, mid, end int) {
	n, m, z := b.n, &b.m, b.z
	e := b.e[mid-1]
	root := math.Sqrt(math.Abs(e))
	norm := 0.0
	for r := lo; r < end; r++ {
		if r < mid {
			z[r] = root * b.rows[r*n+mid-1]
		} else {
			z[r] = math.Copysign(root, e) * b.rows[r*n+mid]
		}
		norm += z[r] * z[r]
	}
	norm = math.Sqrt(norm)
	m.reset()
	previous, where := -1, upperPart
	for _, r := range m.sorted(b.index[lo:mid], b.index[mid:end], b.values) {
		here := upperPart
		if r >= mid {
			here = lowerPart
		}
		if math.Abs(z[r])*norm <= deflation {
			m.drop(r, b.values)
			continue
		}
		if previous >= 0 {
			size := math.Hypot(z[r], z[previous])
			c, s := z[r]/size, -z[previous]/size
			x, y := b.values[previous], b.values[r]
			if math.Abs((y-x)*c*s) <= deflation {
				// Values so near each other that a rotation can move all of the coupling to one of the two.
				planeRotation(b.rows[previous*n+lo:previous*n+end], b.rows[r*n+lo:r*n+end], c, s)
				b.values[previous], b.values[r] = x*c*c+y*s*s, x*s*s+y*c*c
				z[r] = size
				if where != here {
					here = bothParts
				}
				m.drop(previous, b.values)
			} else {
				m.keep(x, z[previous], previous, where)
			}
		}
		previous, where = r, here
	}
	if previous >= 0 {
		m.keep(b.values[previous], z[previous], previous, where)
	}
}

// vectors writes the eigenvectors number first, first+1, ... or, backwards, first, first-1, ... in increasing order of their values,
// to the keep rows of x (keep×n). It reports false if it was stopped.
func (b *tridiagonalEigen) vectors(first, step, keep int, x []float64) bool {
	m, n := &b.m, b.n
	if n == 1 {
		x[0] = b.rows[0]
		return true
	}
	k, mid := len(m.poles), n/2
	b.chosen = b.chosen[:0]
	for at := range keep {
		if i := b.index[first+at*step]; i < k {
			b.chosen = append(b.chosen, i)
		}
	}
	roots := len(b.chosen)
	b.c, b.spare = resize(b.c, roots*k), resize(b.spare, roots*n)
	m.coefficients(b.chosen, b.c)
	if !m.product(roots, b.c, b.coupled, mid, n-mid, b.spare, n, mid) {
		return false
	}
	next := b.spare
	for at := range keep {
		row := x[at*n : (at+1)*n]
		if i := b.index[first+at*step]; i < k {
			copy(row, next)
			next = next[n:]
		} else {
			copy(row, b.rows[m.gone[i-k]*n:])
		}
	}
	return true
}
