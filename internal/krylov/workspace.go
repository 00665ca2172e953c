package krylov

import (
	"math"

	"rundle/internal/dense"
	"rundle/internal/task"
)

// Workspace holds the vectors of a Krylov space. The zero value is ready.
type Workspace[T dense.Scalar] struct {
	vectors     [][]T
	coef        []T
	alpha, beta []float64 // the tridiagonal matrix
	values      []float64
	ritz        []float64 // its eigenvectors, columns

	pool    *task.Pool
	pass    pass[T]
	sums    []T                 // of the pieces of a pass
	onPiece func(worker, i int) // method piece, bound once
}

// reset makes room for the small quantities of a space of n vectors; the vectors themselves come when they are needed.
func (w *Workspace[T]) reset(n int) {
	if len(w.alpha) >= n {
		return
	}
	w.alpha, w.beta, w.values = make([]float64, n), make([]float64, n), make([]float64, n)
	w.ritz = make([]float64, n*n)
}

// vector returns vector i, of length n, with whatever it held.
func (w *Workspace[T]) vector(i, n int) []T {
	for len(w.vectors) <= i {
		w.vectors = append(w.vectors, nil)
	}
	if cap(w.vectors[i]) < n {
		w.vectors[i] = make([]T, n)
	}
	w.vectors[i] = w.vectors[i][:n]
	return w.vectors[i]
}

// chunk is the stretch of all vectors that is worked on at a time, so that the vector being made orthogonal stays in the cache; a piece is
// what one thread takes. They are constants because sums depend on them.
const (
	chunk = 2048
	piece = 8 * chunk
)

// elementWork states one element of one vector in flops, for the decision to go parallel: the algebra runs at memory speed.
const elementWork = 8

// pass is one reading of x and the vectors: x += sum factors[i] subtract[i], then, with the new x, the products with the vectors of dots and, where norm is
// set, with itself.
type pass[T dense.Scalar] struct {
	x              []T
	factors        []T
	subtract, dots [][]T
	norm           bool
}

// read carries out a pass. The products go to coef, as many as dots; it returns the square of the norm. Pieces are added up in their order.
func (w *Workspace[T]) read(p pass[T], coef []T) float64 {
	if w.onPiece == nil {
		w.onPiece = w.piece
	}
	n, width := (len(p.x)+piece-1)/piece, len(p.dots)+1
	if len(w.sums) < n*width {
		w.sums = make([]T, n*width)
	}
	w.pass = p
	w.pool.Do(n, elementWork*float64(len(p.x))*float64(len(p.subtract)+len(p.dots)+1), w.onPiece)
	w.pass = pass[T]{}
	clear(coef)
	norm2 := 0.0
	for i := range n {
		sums := w.sums[i*width:][:width]
		for j := range coef {
			coef[j] += sums[j]
		}
		norm2 += dense.Real(sums[width-1])
	}
	return norm2
}

func (w *Workspace[T]) piece(_, i int) {
	p, width := &w.pass, len(w.pass.dots)+1
	sums := w.sums[i*width:][:width]
	clear(sums)
	for from, end := i*piece, min((i+1)*piece, len(p.x)); from < end; from += chunk {
		to := min(from+chunk, end)
		x := p.x[from:to]
		for j, v := range p.subtract {
			dense.Axpy(p.factors[j], v[from:to], x)
		}
		for j, v := range p.dots {
			sums[j] += dense.Dot(v[from:to], x)
		}
		if p.norm {
			sums[width-1] += dense.Dot(x, x)
		}
	}
}

// room returns the two halves of w.coef, n elements each.
func (w *Workspace[T]) room(n int) (a, b []T) {
	if len(w.coef) < 2*n {
		w.coef = make([]T, 4*n)
	}
	return w.coef[:n], w.coef[n : 2*n]
}

// orthogonalize makes x = H v, v the last of the Lanczos vectors, orthogonal to all of them. It returns the component along v and the norm of what
// remains. Most of x lies along the last two vectors and goes first; what rounding leaves along all of them is then small, and one more
// round takes it away. Where it is not small another one follows, and that is enough.
func (w *Workspace[T]) orthogonalize(vectors [][]T, x []T) (alpha, beta float64) {
	const rounds = 3
	m := len(vectors)
	near := vectors[max(0, m-2):]
	factors, coef := w.room(m)
	w.read(pass[T]{x: x, dots: near}, factors[:len(near)])
	alpha = dense.Real(negate(factors[:len(near)]))
	for round := 1; ; round++ {
		norm2 := w.read(pass[T]{x: x, factors: factors, subtract: near, dots: vectors, norm: true}, coef)
		along := 0.0
		for _, c := range coef {
			along += dense.Real(dense.Conj(c) * c)
		}
		alpha += dense.Real(negate(coef))
		if along <= norm2/4 || round == rounds {
			break
		}
		near = vectors
		factors, coef = coef, factors
	}
	return alpha, norm(w.read(pass[T]{x: x, factors: coef, subtract: vectors, norm: true}, nil), x)
}

// negate changes the signs of coefficients and returns the last one as it was.
func negate[T dense.Scalar](coef []T) T {
	last := coef[len(coef)-1]
	for i, c := range coef {
		coef[i] = -c
	}
	return last
}

// norm returns the norm of x, of which norm2 is the plain sum of squares: good unless it has left the range where squares are normal numbers.
func norm[T dense.Scalar](norm2 float64, x []T) float64 {
	const small, large = 1e-280, 1e280
	if norm2 > small && norm2 < large {
		return math.Sqrt(norm2)
	}
	return dense.Norm(x)
}

// remove projects the orthonormal vectors out of x, in two rounds.
func (w *Workspace[T]) remove(vectors [][]T, x []T) {
	if len(vectors) == 0 {
		return
	}
	first, second := w.room(len(vectors))
	w.read(pass[T]{x: x, dots: vectors}, first)
	negate(first)
	w.read(pass[T]{x: x, factors: first, subtract: vectors, dots: vectors}, second)
	negate(second)
	w.read(pass[T]{x: x, factors: second, subtract: vectors}, nil)
}
