package dmrg

import (
	"math"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mpo"
	"rundle/mps"
)

// span is what states of one sector know of each other: <i|j> and <i|H|j>, row by row.
type span[T dense.Scalar] struct {
	n               int
	overlap, energy []T
}

// spanOf compares normalized states.
func spanOf[T dense.Scalar](op *mpo.Operator[T], states []*mps.Chain[T], pool *task.Pool) span[T] {
	n := len(states)
	s := span[T]{n: n, overlap: make([]T, n*n), energy: make([]T, n*n)}
	for i, a := range states {
		for j, b := range states[:i+1] {
			x, y := mps.Overlap(a, b, pool), mpo.MatrixElement(a, b, op, pool)
			s.overlap[i*n+j], s.overlap[j*n+i] = x, dense.Conj(x)
			s.energy[i*n+j], s.energy[j*n+i] = y, dense.Conj(y)
		}
	}
	return s
}

// dependent is the eigenvalue of the overlaps below which a combination of states is none of its own.
const dependent = 1e-6

// ritz returns the stationary energies in the span, increasing, and the combinations of states that have them, one a column (Rayleigh, Ritz).
// Where the states depend on each other there are fewer than states.
func (s span[T]) ritz() (values []float64, vectors []T, err error) {
	n := s.n
	weights, basis := make([]float64, n), make([]T, n*n)
	if err := dense.Eigen(n, append([]T(nil), s.overlap...), n, weights, basis, n, nil); err != nil {
		return nil, nil, err
	}
	var cols []int
	for k, w := range weights {
		if w > dependent {
			cols = append(cols, k)
		}
	}
	m := len(cols)
	x := make([]T, n*m) // orthonormal combinations
	for c, k := range cols {
		scale := dense.FromFloat[T](1 / math.Sqrt(weights[k]))
		for i := range n {
			x[i*m+c] = basis[i*n+k] * scale
		}
	}
	one, zero := dense.FromFloat[T](1), dense.FromFloat[T](0)
	half, small, turn := make([]T, n*m), make([]T, m*m), make([]T, m*m)
	dense.Gemm(dense.NoTrans, dense.NoTrans, n, m, n, one, s.energy, n, x, m, zero, half, m)
	dense.Gemm(dense.ConjTrans, dense.NoTrans, m, m, n, one, x, m, half, m, zero, small, m)
	values = make([]float64, m)
	if err := dense.Eigen(m, hermitian(m, small), m, values, turn, m, nil); err != nil {
		return nil, nil, err
	}
	vectors = make([]T, n*m)
	dense.Gemm(dense.NoTrans, dense.NoTrans, n, m, m, one, x, m, turn, m, zero, vectors, m)
	return values, vectors, nil
}

// combination adds up states with the factors of column k of vectors, m columns in all. Bonds add up.
func combination[T dense.Scalar](states []*mps.Chain[T], vectors []T, m, k int) *mps.Chain[T] {
	if len(states) == 1 {
		c := states[0].Clone()
		c.Scale(vectors[k])
		return c
	}
	sum := mps.Add(vectors[k], states[0], vectors[m+k], states[1])
	for i := 2; i < len(states); i++ {
		sum = mps.Add(dense.FromFloat[T](1), sum, vectors[i*m+k], states[i])
	}
	return sum
}
