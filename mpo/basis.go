package mpo

import (
	"math"

	"rundle/internal/dense"
	"rundle/mpo/ladder"
)

// basis is a set of linearly independent local operators, number 0 the identity: a list of sparse matrices, or without a list
// the matrix units on d states, of which that of the reference state is replaced by the identity.
type basis[T dense.Scalar] struct {
	elements [][]element[T]
	d, ref   int32
}

type element[T dense.Scalar] struct {
	out, in int32
	v       T
}

// part is a coefficient of an operator in a basis.
type part[T dense.Scalar] struct {
	k int32
	v T
}

// write appends the matrix elements of a cell.
func (b *basis[T]) write(to []Entry[T], left, right int32, c cell[T]) []Entry[T] {
	switch {
	case b.elements != nil:
		for _, e := range b.elements[c.k] {
			to = append(to, Entry[T]{left, right, e.out, e.in, c.v * e.v})
		}
	case c.k == 0:
		for s := range b.d {
			to = append(to, Entry[T]{left, right, s, s, c.v})
		}
	default:
		to = append(to, Entry[T]{left, right, (c.k - 1) / b.d, (c.k - 1) % b.d, c.v})
	}
	return to
}

// units writes entries between numbered indices as cells over matrix units. Diagonal elements are written as differences to
// those of the reference state: it is the state whose own are smallest, lest they lose digits.
func units[T dense.Scalar](entries []Entry[T], d int) ([]cell[T], *basis[T]) {
	size := make([]float64, d)
	for _, e := range entries {
		if e.Out == e.In {
			size[e.Out] = max(size[e.Out], dense.Abs(e.Value))
		}
	}
	b := &basis[T]{d: int32(d)}
	for s, x := range size {
		if x < size[b.ref] {
			b.ref = int32(s)
		}
	}
	cells := make([]cell[T], 0, len(entries))
	for _, e := range entries {
		if e.Out != b.ref || e.In != b.ref {
			cells = append(cells, cell[T]{e.Left, e.Right, 1 + e.Out*b.d + e.In, e.Value})
			continue
		}
		cells = append(cells, cell[T]{e.Left, e.Right, 0, e.Value})
		for s := range b.d {
			if s != b.ref {
				cells = append(cells, cell[T]{e.Left, e.Right, 1 + s*b.d + s, -e.Value})
			}
		}
	}
	return gather(cells, noise), b
}

// dependent is the part of an operator's norm below which what lies outside the span of others counts as rounding.
const dependent = 1e-12

// independent picks from a table's operators a basis, in the order of the table, and writes every operator in it: local
// operators may be independent as words and dependent as matrices, such as n and n^2 on a fermion site.
func independent[T dense.Scalar](t *ladder.OpTable, dim int) (*basis[T], [][]part[T]) {
	b := &basis[T]{}
	var ortho [][]complex128 // orthonormal matrices that span the basis
	var coefs [][]complex128 // basis element k = sum_j coefs[k][j] ortho[j], a triangle
	written := make([][]part[T], len(t.Matrices))
	for op, matrix := range t.Matrices {
		norm := matrixNorm(matrix)
		if norm == 0 {
			continue
		}
		if k, ratio, ok := multipleOfEarlier(t, written, op); ok {
			written[op] = []part[T]{{k, dense.FromComplex[T](ratio)}}
			continue
		}
		rest := append([]complex128(nil), matrix...)
		c := make([]complex128, len(ortho), len(ortho)+1)
		for range 2 { // twice is enough for orthogonality
			for j, q := range ortho {
				x := inner(q, rest)
				c[j] += x
				for i := range rest {
					rest[i] -= x * q[i]
				}
			}
		}
		if size := matrixNorm(rest); size > dependent*norm {
			for i := range rest {
				rest[i] /= complex(size, 0)
			}
			written[op] = []part[T]{{int32(len(b.elements)), dense.FromFloat[T](1)}}
			b.elements = append(b.elements, sparse[T](matrix, dim))
			ortho, coefs = append(ortho, rest), append(coefs, append(c, complex(size, 0)))
			continue
		}
		written[op] = solveTriangle[T](coefs, c)
	}
	return b, written
}

// multipleOfEarlier reports whether operator op is an exact multiple of an earlier one that is a basis element itself.
func multipleOfEarlier[T dense.Scalar](t *ladder.OpTable, written [][]part[T], op int) (k int32, ratio complex128, ok bool) {
	for e := range op {
		if len(written[e]) != 1 || written[e][0].v != dense.FromFloat[T](1) {
			continue
		}
		if ratio, ok = quotient(t.Matrices[op], t.Matrices[e]); ok {
			return written[e][0].k, ratio, true
		}
	}
	return 0, 0, false
}

// quotient returns r with a = r b, if there is one to the last digits.
func quotient(a, b []complex128) (r complex128, ok bool) {
	for i := range a {
		switch {
		case a[i] == 0 && b[i] == 0:
		case a[i] == 0 || b[i] == 0:
			return 0, false
		case !ok:
			r, ok = a[i]/b[i], true
		case abs(a[i]-r*b[i]) > noise*abs(a[i]):
			return 0, false
		}
	}
	return r, ok
}

// solveTriangle writes the operator with coefficients c over the orthonormal matrices in the basis elements.
func solveTriangle[T dense.Scalar](coefs [][]complex128, c []complex128) []part[T] {
	x := append([]complex128(nil), c...)
	var size float64
	for k := len(x) - 1; k >= 0; k-- {
		x[k] /= coefs[k][k]
		for j := range k {
			x[j] -= x[k] * coefs[k][j]
		}
		size = max(size, abs(x[k])*abs(coefs[k][k]))
	}
	var parts []part[T]
	for k, v := range x {
		if abs(v)*abs(coefs[k][k]) > dependent*size {
			if !dense.IsComplex[T]() {
				v = complex(real(v), 0) // real matrices have real coefficients
			}
			parts = append(parts, part[T]{int32(k), dense.FromComplex[T](v)})
		}
	}
	return parts
}

func sparse[T dense.Scalar](matrix []complex128, dim int) []element[T] {
	var list []element[T]
	for i, v := range matrix {
		if v != 0 {
			list = append(list, element[T]{int32(i / dim), int32(i % dim), dense.FromComplex[T](v)})
		}
	}
	return list
}

func inner(a, b []complex128) complex128 {
	var s complex128
	for i, x := range a {
		s += complex(real(x), -imag(x)) * b[i]
	}
	return s
}

func matrixNorm(a []complex128) float64 {
	var s float64
	for _, x := range a {
		s = math.Hypot(s, abs(x))
	}
	return s
}

func abs(x complex128) float64 { return math.Hypot(real(x), imag(x)) }
