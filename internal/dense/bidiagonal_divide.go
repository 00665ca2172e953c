package dense

import "math"

// bidiagonalSVD is the singular value decomposition of a real upper bidiagonal matrix B = L^T diag(s) R by divide and conquer (Gu,
// Eisenstat 1995) down to single rows. The last merge stops short of its products: vectors computes the rows that are asked for.
//
// A problem of rows lo..lo+n-1 has n columns, or n+1 (wide) when a row follows below. Its singular vectors are rows of left and
// right, in the same places; a wide one's row lo+n of right holds the null vector. The row mid = lo+n/2 with its entries d (column
// mid) and e (column mid+1) joins the wide problem above it and the one below.
type bidiagonalSVD struct {
	n       int
	scale   float64   // the true matrix is scale times the one solved
	d, e    []float64 // of B/scale
	values  []float64 // by row
	index   []int     // rows by increasing value
	left    []float64 // n×n
	right   []float64 // n×n
	z       []float64 // by row: what the joining row of a merge couples to
	m       merge
	coupled [2][]float64 // what collect copied of right and left
	c       []float64    // coefficients of roots
	spare   []float64    // rows on their way
	all     []int        // 0, 1, ...
	chosen  []int        // roots that vectors was asked for
}

// factor decomposes the bidiagonal with diagonal d and off-diagonal e (len(d)-1 used). It reports false if a root is not found or, which
// m.halted tells, stop said so.
func (b *bidiagonalSVD) factor(d, e []float64, stop func() bool) bool {
	n := len(d)
	b.m.stop, b.m.halted = stop, false
	b.n = n
	b.d, b.e, b.z, b.values = resize(b.d, n), resize(b.e, n), resize(b.z, n), resize(b.values, n)
	b.scale = normalize(d, e, b.d, b.e)
	b.index, b.all = resize(b.index, n), counting(b.all, n)
	b.left, b.right = resize(b.left, n*n), resize(b.right, n*n)
	clear(b.left)
	clear(b.right)
	b.m.reserve(n)
	return b.solve(0, n, 0)
}

// sorted writes the singular values to s, decreasing.
func (b *bidiagonalSVD) sorted(s []float64) {
	for i := range s {
		s[i] = b.values[b.index[len(s)-1-i]] * b.scale
	}
}

// solve decomposes the problem of n rows from lo on; wide is 0 or 1.
func (b *bidiagonalSVD) solve(lo, n, wide int) bool {
	switch n {
	case 0:
		if wide == 1 {
			b.right[lo*b.n+lo] = 1
		}
		return true
	case 1:
		b.single(lo, wide)
		if b.n == 1 {
			b.m.reset()
			b.m.drop(0, b.values)
			return b.m.solveSecular(true)
		}
		return true
	}
	upper := n / 2
	return b.solve(lo, upper, 1) && b.solve(lo+upper+1, n-1-upper, wide) && b.merge(lo, upper, n-1-upper, wide)
}

// single decomposes the row lo.
func (b *bidiagonalSVD) single(lo, wide int) {
	n, x, y := b.n, b.d[lo], 0.0
	if wide == 1 {
		y = b.e[lo]
	}
	size := math.Hypot(x, y)
	if size == 0 {
		x, y = 1, 0
	} else {
		x, y = x/size, y/size
	}
	b.values[lo], b.index[lo], b.left[lo*n+lo] = size, lo, 1
	b.right[lo*n+lo] = x
	if wide == 1 {
		b.right[lo*n+lo+1] = y
		b.right[(lo+1)*n+lo], b.right[(lo+1)*n+lo+1] = -y, x
	}
}

// merge joins a wide problem of `upper` rows from lo on, the row below it, and the problem of `below` rows that follows.
func (b *bidiagonalSVD) merge(lo, upper, below, wide int) bool {
	b.deflate(lo, upper, below, wide)
	if !b.m.solveSecular(true) {
		return false
	}
	b.collect(lo, upper, below, wide)
	if size := upper + 1 + below; size < b.n {
		if !b.multiply(lo, size, upper, wide) {
			return false
		}
		b.m.finish(lo, b.values, b.index[lo:lo+size])
	} else {
		b.m.finish(0, b.values, b.index)
	}
	return true
}

// deflate sets up the secular equation: pole 0 with row mid, then those singular values of the halves that the joining row couples.
func (b *bidiagonalSVD) deflate(lo, upper, below, wide int) {
	n, m, mid, end := b.n, &b.m, lo+upper, lo+upper+1+below
	const tol = deflation
	z, alpha, beta := b.z, b.d[mid], b.e[mid]
	for r := lo; r < mid; r++ {
		z[r] = alpha * b.right[r*n+mid]
	}
	for r := mid + 1; r < end; r++ {
		z[r] = beta * b.right[r*n+mid+1]
	}
	m.reset()
	z0, p := alpha*b.right[mid*n+mid], upperPart
	if wide == 1 {
		// The null vectors of both halves: one combination couples, the other is the null vector of the whole.
		z1, z2 := z0, beta*b.right[end*n+mid+1]
		c, s := 1.0, 0.0
		if z0 = math.Hypot(z1, z2); z0 > tol {
			c, s = z1/z0, z2/z0
		}
		planeRotation(b.right[mid*n+lo:mid*n+end+1], b.right[end*n+lo:end*n+end+1], c, s)
		p = bothParts
	}
	if math.Abs(z0) <= tol {
		z0 = tol
	}
	m.keep(0, z0, mid, p)

	previous, where := -1, upperPart
	for _, r := range m.sorted(b.index[lo:mid], b.index[mid+1:end], b.values) {
		here := upperPart
		if r > mid {
			here = lowerPart
		}
		switch {
		case math.Abs(z[r]) <= tol:
			m.drop(r, b.values)
			continue
		case previous >= 0 && b.values[r]-b.values[previous] <= tol:
			// Equal values: a rotation moves all of the coupling to one of the two.
			size := math.Hypot(z[r], z[previous])
			c, s := z[r]/size, -z[previous]/size
			planeRotation(b.left[previous*n+lo:previous*n+end], b.left[r*n+lo:r*n+end], c, s)
			planeRotation(b.right[previous*n+lo:previous*n+end+wide], b.right[r*n+lo:r*n+end+wide], c, s)
			z[r] = size
			if where != here {
				here = bothParts
			}
			m.drop(previous, b.values)
		case previous >= 0:
			m.keep(math.Max(b.values[previous], tol/2), z[previous], previous, where)
		}
		previous, where = r, here
	}
	if previous >= 0 {
		m.keep(math.Max(b.values[previous], tol/2), z[previous], previous, where)
	}
}

// collect copies the coupled rows together: of each matrix first the upper columns of the rows that have any, then the lower ones. Row
// mid of left is a unit vector between the two; it is zero here, and multiply and vectors fill its column in.
func (b *bidiagonalSVD) collect(lo, upper, below, wide int) {
	b.coupled[0] = b.m.collect(b.right, b.n, lo, upper+1, below+wide, lo+upper+1, b.coupled[0])
	b.coupled[1] = b.m.collect(b.left, b.n, lo, upper, below, lo+upper+1, b.coupled[1])
}

// zeroPlace is where pole 0 of the last merge is placed.
func (b *bidiagonalSVD) zeroPlace(wide int) int { return wide * b.m.count[upperPart] }

// multiply replaces the rows lo..lo+size-1 of left and right by the vectors of the merged problem. It
// reports false if it was stopped.
func (b *bidiagonalSVD) multiply(lo, size, upper, wide int) bool {
	m, n, k, zero := &b.m, b.n, len(b.m.poles), b.zeroPlace(wide)
	b.c = resize(b.c, k*k)
	m.coefficients(b.all[:k], b.c)
	b.spare = m.settle(b.right, n, lo, size+wide, b.spare)
	if !m.product(k, b.c, b.coupled[0], upper+1, size-upper-1+wide, b.right[lo*n+lo:], n, upper+1) {
		return false
	}

	m.leftCoefficients(b.all[:k], zero, b.c)
	b.spare = m.settle(b.left, n, lo, size, b.spare)
	if !m.product(k, b.c, b.coupled[1], upper, size-upper-1, b.left[lo*n+lo:], n, upper+1) {
		return false
	}
	for i := range k {
		b.left[(lo+i)*n+lo+upper] = b.c[i*k+zero]
	}
	return true
}

// vectors writes the singular vectors of the keep largest values to the rows of x (keep×n), the left ones or the right ones. It
// reports false if it was stopped.
func (b *bidiagonalSVD) vectors(keep int, left bool, x []float64) bool {
	m, n := &b.m, b.n
	if n == 1 {
		if left {
			x[0] = b.left[0]
		} else {
			x[0] = b.right[0]
		}
		return true
	}
	k, upper := len(m.poles), n/2
	b.chosen = b.chosen[:0]
	for at := range keep {
		if i := b.index[n-1-at]; i < k {
			b.chosen = append(b.chosen, i)
		}
	}
	roots := len(b.chosen)
	b.c, b.spare = resize(b.c, roots*k), resize(b.spare, roots*n)
	old := b.right
	if left {
		old = b.left
		zero := b.zeroPlace(0)
		m.leftCoefficients(b.chosen, zero, b.c)
		if !m.product(roots, b.c, b.coupled[1], upper, n-1-upper, b.spare, n, upper+1) {
			return false
		}
		for i := range roots {
			b.spare[i*n+upper] = b.c[i*k+zero]
		}
	} else {
		m.coefficients(b.chosen, b.c)
		if !m.product(roots, b.c, b.coupled[0], upper+1, n-1-upper, b.spare, n, upper+1) {
			return false
		}
	}
	next := b.spare
	for at := range keep {
		row := x[at*n : (at+1)*n]
		if i := b.index[n-1-at]; i < k {
			copy(row, next)
			next = next[n:]
		} else {
			copy(row, old[m.gone[i-k]*n:])
		}
	}
	return true
}
