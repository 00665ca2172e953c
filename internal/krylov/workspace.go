package krylov

import "rundle/internal/dense"

// Workspace holds the vectors of a Krylov space. The zero value is ready.
type Workspace[T dense.Scalar] struct {
	vectors     [][]T
	coef        []T
	alpha, beta []float64 // the tridiagonal matrix
	values      []float64
	ritz        []float64 // its eigenvectors, columns
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

// chunk is the piece of all vectors that is worked on at a time, so that the vector being made orthogonal stays in the cache. It is a
// constant because sums depend on it.
const chunk = 2048

// orthogonalize makes x orthogonal to the orthonormal vectors, in two passes, and returns the component along the last.
func (w *Workspace[T]) orthogonalize(vectors [][]T, x []T) T {
	last := len(vectors) - 1
	w.project(vectors, x)
	along := -w.coef[last]
	w.project(vectors, x)
	return along - w.coef[last]
}

// remove projects the orthonormal vectors out of x, in two passes.
func (w *Workspace[T]) remove(vectors [][]T, x []T) {
	if len(vectors) == 0 {
		return
	}
	w.project(vectors, x)
	w.project(vectors, x)
}

// project is one pass of classical Gram-Schmidt. It leaves minus the components in w.coef.
func (w *Workspace[T]) project(vectors [][]T, x []T) {
	if len(w.coef) < len(vectors) {
		w.coef = make([]T, max(len(vectors), 2*len(w.coef)))
	}
	coef := w.coef[:len(vectors)]
	clear(coef)
	for from := 0; from < len(x); from += chunk {
		to := min(from+chunk, len(x))
		for i, v := range vectors {
			coef[i] -= dense.Dot(v[from:to], x[from:to])
		}
	}
	combine(coef, vectors, x)
}

// combine adds the sum of coef[i] vectors[i] to x.
func combine[T dense.Scalar](coef []T, vectors [][]T, x []T) {
	for from := 0; from < len(x); from += chunk {
		to := min(from+chunk, len(x))
		for i, v := range vectors {
			dense.Axpy(coef[i], v[from:to], x[from:to])
		}
	}
}
