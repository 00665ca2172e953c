package block

import (
	"rundle/internal/dense"
	"rundle/internal/task"
)

// Workspace keeps the memory of factorizations from one to the next: of each size rank among the matrices of a tensor the largest so far, so
// that neighbouring bonds, whose matrices are alike, allocate their results alone. The zero value is ready; a nil *Workspace allocates
// each time. One factorization at a time may use it.
type Workspace[T dense.Scalar] struct {
	svd     []dense.SVD[T] // most work first
	workers []worker[T]
}

// worker is what one thread needs.
type worker[T dense.Scalar] struct {
	dense dense.Workspace[T]
	slab  []T
}

// take returns n elements with arbitrary content, valid until the next take.
func (w *worker[T]) take(n int) []T {
	if cap(w.slab) < n {
		w.slab = make([]T, n)
	}
	return w.slab[:n]
}

// prepare makes room for the threads of a pool, with its stop.
func (ws *Workspace[T]) prepare(pool *task.Pool) *Workspace[T] {
	if ws == nil {
		ws = new(Workspace[T])
	}
	if n := pool.Threads(); len(ws.workers) < n {
		ws.workers = make([]worker[T], n)
	}
	for i := range ws.workers {
		ws.workers[i].dense.Stop = pool.Stop()
	}
	return ws
}
