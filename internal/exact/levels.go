package exact

import (
	"fmt"
	"math/cmplx"
	"math/rand/v2"
)

// A Level is an eigenvalue with its normalized eigenvector.
type Level struct {
	Energy   float64
	Residual float64 // |H x - E x|
	Vector   []complex128
}

// denseLimit is the dimension up to which matrices are solved densely. The
// dense solution costs about 10 dim^3; Lanczos takes about 200 steps.
const denseLimit = 256

// Lowest returns the k lowest levels, multiplets complete up to k.
func (m *Matrix) Lowest(k int) ([]Level, error) {
	k = min(k, m.dim)
	if m.dim <= denseLimit {
		return m.lowestDense(k)
	}
	if m.real != nil {
		return lowestLevels(k, m.dim, multiply(m, m.real))
	}
	return lowestLevels(k, m.dim, multiply(m, m.val))
}

// Ground returns the lowest level and the distance to the next.
func (m *Matrix) Ground() (ground Level, gap float64, err error) {
	levels, err := m.Lowest(2)
	if err != nil {
		return Level{}, 0, err
	}
	if len(levels) == 1 {
		return levels[0], 0, nil
	}
	return levels[0], levels[1].Energy - levels[0].Energy, nil
}

// Spectrum returns all eigenvalues, by the dense solution.
func (m *Matrix) Spectrum() ([]float64, error) {
	values, _, err := eigenHermitian(m.dim, m.dense())
	return values, err
}

func (m *Matrix) lowestDense(k int) ([]Level, error) {
	values, vectors, err := eigenHermitian(m.dim, m.dense())
	if err != nil {
		return nil, err
	}
	levels := make([]Level, k)
	for i := range levels {
		x := vectors[i*m.dim : (i+1)*m.dim]
		levels[i] = Level{values[i], residual(values[i], x, multiply(m, m.val)), x}
	}
	return levels, nil
}

func residual[N number](e float64, x []N, apply func(dst, src []N)) float64 {
	y := make([]N, len(x))
	apply(y, x)
	axpy(fromFloat[N](-e), x, y)
	return norm(y)
}

func lowestLevels[N number](k, n int, apply func(dst, src []N)) ([]Level, error) {
	rng := rand.New(rand.NewPCG(1, 2))
	var locked [][]N
	var levels []Level
	for range k {
		start := make([]N, n)
		for i := range start {
			start[i] = fromFloat[N](rng.NormFloat64())
		}
		e, x, err := lanczos(apply, start, locked)
		if err != nil {
			return nil, fmt.Errorf("exact: level %d: %w", len(levels), err)
		}
		locked = append(locked, x)
		levels = append(levels, Level{e, residual(e, x, apply), toComplex(x)})
	}
	for i := range levels { // a near multiplet may come out of order
		for j := i; j > 0 && levels[j].Energy < levels[j-1].Energy; j-- {
			levels[j], levels[j-1] = levels[j-1], levels[j]
		}
	}
	return levels, nil
}

func toComplex[N number](x []N) []complex128 {
	switch x := any(x).(type) {
	case []complex128:
		return x
	case []float64:
		out := make([]complex128, len(x))
		for i, v := range x {
			out[i] = complex(v, 0)
		}
		return out
	}
	panic("unreachable")
}

// Overlap returns sum conj(x_i) y_i.
func Overlap(x, y []complex128) complex128 {
	var s complex128
	for i, v := range x {
		s += cmplx.Conj(v) * y[i]
	}
	return s
}
