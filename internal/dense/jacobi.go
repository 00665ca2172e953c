package dense

import (
	"fmt"
	"math"
	"slices"
)

// The two functions of this file are the slow oracle of the tests: another method than SVD and Eigen, short enough to be checked by
// eye. They treat every number through Conj and Abs, so they are slow, and they share no code with what they check but that.

// jacobiSweeps bounds the sweeps; about ten are enough for anything.
const jacobiSweeps = 60

// JacobiSVD computes A = U diag(s) V^H of the m×n matrix A by one-sided rotations (Hestenes 1958; Demmel, Veselic 1992): s (min(m,n),
// decreasing), u (m×min), vh (min×n). A is not modified.
func JacobiSVD[T Scalar](m, n int, a []T, lda int, s []float64, u []T, ldu int, vh []T, ldvh int) error {
	matrix("A", m, n, lda, len(a))
	k := min(m, n)
	if len(s) != k {
		panic(fmt.Sprintf("dense: room for %d singular values of a %d×%d matrix", len(s), m, n))
	}
	matrix("U", m, k, ldu, len(u))
	matrix("V^H", k, n, ldvh, len(vh))
	top := largest(m, n, a, lda)
	if err := checkFinite(svdRoutine, m, n, top); err != nil {
		return err
	}
	// x holds the columns that are rotated (those of A, or of A^H when it is wide) as rows; y the rotations, likewise.
	length := max(m, n)
	x, y := make([]T, k*length), make([]T, k*k)
	scale := safeScale(top)
	for j := range k {
		y[j*k+j] = FromFloat[T](1)
		for i := range length {
			if m >= n {
				x[j*length+i] = a[i*lda+j]
			} else {
				x[j*length+i] = Conj(a[j*lda+i])
			}
		}
		Scale(FromFloat[T](scale), x[j*length:(j+1)*length])
	}
	floor := noise * Norm(x)
	if !orthogonalize(k, length, floor, x, y) {
		return &NumericalError{svdRoutine, m, n, "the rotations did not converge"}
	}
	norms := make([]float64, k)
	order := make([]int, k)
	for j := range k {
		norms[j], order[j] = Norm(x[j*length:(j+1)*length]), j
	}
	slices.SortStableFunc(order, func(i, j int) int { return -compare(norms[i], norms[j]) })
	left := completeBasis(k, length, floor, x, norms, order)
	for to, j := range order {
		s[to] = norms[j] / scale
		for i := range length {
			if z := left[to*length+i]; m >= n {
				u[i*ldu+to] = z
			} else {
				vh[to*ldvh+i] = Conj(z)
			}
		}
		for i := range k {
			if z := y[j*k+i]; m >= n {
				vh[to*ldvh+i] = Conj(z)
			} else {
				u[i*ldu+to] = z
			}
		}
	}
	return nil
}

func compare(x, y float64) int {
	switch {
	case x < y:
		return -1
	case x > y:
		return 1
	}
	return 0
}

// noise times the norm of a matrix is where columns count as zero: in a rank-deficient one they only shrink from sweep to sweep.
const noise = 0x1p-70

// orthogonalize rotates pairs of the k rows of x (columns of the matrix) until all are orthogonal, and y along with them.
func orthogonalize[T Scalar](k, length int, floor float64, x, y []T) bool {
	for range jacobiSweeps {
		quiet := true
		for p := range k {
			for q := p + 1; q < k; q++ {
				xp, xq := x[p*length:(p+1)*length], x[q*length:(q+1)*length]
				np, nq := Norm(xp), Norm(xq)
				z := Dot(xp, xq)
				if min(np, nq) > floor && Abs(z) > 0x1p-52*math.Sqrt(float64(length))*np*nq {
					quiet = false
					c, sn := rotation(np*np, nq*nq, z)
					rotate(c, sn, xp, xq)
					rotate(c, sn, y[p*k:(p+1)*k], y[q*k:(q+1)*k])
				}
			}
		}
		if quiet {
			return true
		}
	}
	return false
}

// rotation returns c (real) and s such that the columns c x - conj(s) y, s x + c y diagonalize [[a, z], [conj z, b]].
func rotation[T Scalar](a, b float64, z T) (c float64, s T) {
	size := Abs(z)
	theta := (b - a) / (2 * size)
	t := 1 / (math.Abs(theta) + math.Hypot(theta, 1))
	if theta < 0 {
		t = -t
	}
	c = 1 / math.Hypot(t, 1)
	return c, FromFloat[T](t*c) * (z / FromFloat[T](size))
}

// rotate replaces (x, y) by (c x - conj(s) y, s x + c y).
func rotate[T Scalar](c float64, s T, x, y []T) {
	cc, sc := FromFloat[T](c), Conj(s)
	for i, u := range x {
		v := y[i]
		x[i], y[i] = cc*u-sc*v, s*u+cc*v
	}
}

// completeBasis returns the rows of x in the given order, normalized; rows that count as zero are replaced by unit vectors
// made orthogonal to those before them.
func completeBasis[T Scalar](k, length int, floor float64, x []T, norms []float64, order []int) []T {
	out := make([]T, k*length)
	next := 0
	for to, j := range order {
		row := out[to*length : (to+1)*length]
		if norms[j] > floor {
			for i := range row {
				row[i] = x[j*length+i] / FromFloat[T](norms[j])
			}
			continue
		}
		for size := 0.0; size < 0.5/math.Sqrt(float64(length)); next++ {
			clear(row)
			row[next] = FromFloat[T](1)
			for range 2 {
				for i := range to {
					other := out[i*length : (i+1)*length]
					Axpy(-Dot(other, row), other, row)
				}
			}
			size = Norm(row)
		}
		Scale(FromFloat[T](1/Norm(row)), row)
	}
	return out
}

// JacobiEigen computes eigenvalues, ascending, and eigenvectors (columns of v) of a Hermitian matrix by two-sided rotations
// (Jacobi 1846; Golub, Van Loan). It reads the upper triangle of A and does not modify it.
func JacobiEigen[T Scalar](n int, a []T, lda int, values []float64, v []T, ldv int) error {
	matrix("A", n, n, lda, len(a))
	matrix("V", n, n, ldv, len(v))
	if len(values) != n {
		panic(fmt.Sprintf("dense: room for %d eigenvalues of a %d×%d matrix", len(values), n, n))
	}
	s, y := make([]T, n*n), make([]T, n*n)
	top := 0.0
	for i := range n {
		y[i*n+i] = FromFloat[T](1)
		s[i*n+i] = FromFloat[T](Real(a[i*lda+i]))
		for j := i + 1; j < n; j++ {
			s[i*n+j], s[j*n+i] = a[i*lda+j], Conj(a[i*lda+j])
		}
		top = math.Max(top, largest(1, n-i, s[i*n+i:], n))
	}
	if err := checkFinite(eigenRoutine, n, n, top); err != nil {
		return err
	}
	scale := safeScale(top)
	Scale(FromFloat[T](scale), s)
	if !diagonalize(n, s, y) {
		return &NumericalError{eigenRoutine, n, n, "the rotations did not converge"}
	}
	order := make([]int, n)
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int { return compare(Real(s[i*n+i]), Real(s[j*n+j])) })
	for to, j := range order {
		values[to] = Real(s[j*n+j]) / scale
		for i := range n {
			v[i*ldv+to] = y[j*n+i]
		}
	}
	return nil
}

// diagonalize rotates the full Hermitian s to diagonal form; the rows of y become the eigenvectors.
func diagonalize[T Scalar](n int, s, y []T) bool {
	column := make([]T, 2*n)
	for range jacobiSweeps {
		quiet := true
		for p := range n {
			for q := p + 1; q < n; q++ {
				z := s[p*n+q]
				a, b := Real(s[p*n+p]), Real(s[q*n+q])
				if g := Abs(z); g == 0 || g <= 0x1p-54*math.Min(math.Abs(a), math.Abs(b)) || g <= 0x1p-60*math.Sqrt(Real(Dot(s, s))) {
					continue
				}
				quiet = false
				c, sn := rotation(a, b, z)
				// Columns p and q by the rotation, rows by its adjoint.
				x, w := column[:n], column[n:]
				readColumn(p, s, n, x)
				readColumn(q, s, n, w)
				rotate(c, sn, x, w)
				writeColumn(p, s, n, x)
				writeColumn(q, s, n, w)
				rotate(c, Conj(sn), s[p*n:(p+1)*n], s[q*n:(q+1)*n])
				s[p*n+q], s[q*n+p] = 0, 0
				rotate(c, sn, y[p*n:(p+1)*n], y[q*n:(q+1)*n])
			}
		}
		if quiet {
			return true
		}
	}
	return false
}
