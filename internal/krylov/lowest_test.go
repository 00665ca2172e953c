package krylov

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/internal/task"
)

// problem is a Hermitian matrix with its exact eigenpairs.
type problem[T dense.Scalar] struct {
	n       int
	a       []T
	values  []float64
	vectors []T // columns
	applied int
}

// newProblem builds a matrix with the given eigenvalues in a random basis.
func newProblem[T dense.Scalar](t *testing.T, rng *rand.Rand, spectrum []float64) *problem[T] {
	n := len(spectrum)
	x, q, r := make([]T, n*n), make([]T, n*n), make([]T, n*n)
	dense.Random(rng, x)
	dense.QR(n, n, x, n, q, n, r, n, nil)
	copy(r, q)
	for i := range n {
		for j := range n {
			r[i*n+j] *= dense.FromFloat[T](spectrum[j])
		}
	}
	p := &problem[T]{n: n, a: make([]T, n*n), values: make([]float64, n), vectors: make([]T, n*n)}
	dense.Gemm(dense.NoTrans, dense.ConjTrans, n, n, n, 1, r, n, q, n, 0, p.a, n)
	for i := range n { // exactly Hermitian
		p.a[i*n+i] = dense.FromFloat[T](dense.Real(p.a[i*n+i]))
		for j := range i {
			p.a[i*n+j] = dense.Conj(p.a[j*n+i])
		}
	}
	require.NoError(t, dense.Eigen(n, p.a, n, p.values, p.vectors, n, nil))
	return p
}

func (p *problem[T]) apply(dst, src []T) {
	p.applied++
	for i := range dst {
		dst[i] = dense.FromFloat[T](math.NaN()) // must not be relied on
	}
	dense.Gemm(dense.NoTrans, dense.NoTrans, p.n, 1, p.n, 1, p.a, p.n, src, 1, 0, dst, 1)
}

func (p *problem[T]) vector(j int) []T {
	v := make([]T, p.n)
	for i := range v {
		v[i] = p.vectors[i*p.n+j]
	}
	return v
}

// residual returns the norm of H x - value x computed afresh.
func (p *problem[T]) residual(x []T, value float64) float64 {
	y := make([]T, p.n)
	p.apply(y, x)
	p.applied--
	dense.Axpy(dense.FromFloat[T](-value), x, y)
	return dense.Norm(y)
}

func uniform(rng *rand.Rand, n int) []float64 {
	s := make([]float64, n)
	for i := range s {
		s[i] = 2*rng.Float64() - 1
	}
	return s
}

func both(t *testing.T, f func(t *testing.T), g func(t *testing.T)) {
	t.Run("real", f)
	t.Run("complex", g)
}

func TestLowestAgainstDense(t *testing.T) {
	both(t, testAgainstDense[float64], testAgainstDense[complex128])
}

func testAgainstDense[T dense.Scalar](t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	var w Workspace[T]
	for _, n := range []int{1, 2, 3, 4, 5, 8, 13, 40, 70, 20, 2} {
		p := newProblem[T](t, rng, uniform(rng, n))
		x := make([]T, n)
		dense.Random(rng, x)
		y := make([]T, n)
		p.apply(y, x)
		p.applied--
		start := dense.Real(dense.Dot(x, y)) / (dense.Norm(x) * dense.Norm(x))
		res := Lowest(p.apply, x, nil, Options{MaxVectors: 80, Tolerance: 1e-11}, &w)
		assert.InDelta(t, start, res.Start, 1e-13, "n=%d", n)
		assert.True(t, res.Converged, "n=%d %+v", n, res)
		assert.InDelta(t, p.values[0], res.Value, 1e-13, "n=%d", n)
		assert.InDelta(t, 1, dense.Norm(x), 1e-14, "n=%d", n)
		assert.InDelta(t, p.residual(x, res.Value), res.Residual, 1e-13, "n=%d", n)
		assert.LessOrEqual(t, res.Residual, 1e-11, "n=%d", n)
		assert.Equal(t, p.applied, res.Applications)
		assert.LessOrEqual(t, res.Applications, n, "n=%d: the space cannot be larger than the whole", n)
		if n == 1 {
			assert.True(t, math.IsInf(res.Gap, 1))
		} else { // resolved to the square of a small overlap, never from below
			assert.InDelta(t, p.values[1]-p.values[0], res.Gap, 1e-3, "n=%d", n)
			assert.GreaterOrEqual(t, res.Gap, p.values[1]-p.values[0]-1e-12, "n=%d", n)
		}
	}
}

func TestLowestStops(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	spectrum := uniform(rng, 200)
	p := newProblem[float64](t, rng, spectrum)
	start := make([]float64, p.n)
	dense.Random(rng, start)
	for _, row := range []struct {
		name         string
		opt          Options
		applications int
		stopped      Reason
	}{
		{"vectors cap applications", Options{MaxVectors: 5}, 5, Exhausted},
		{"one vector", Options{MaxVectors: 1}, 1, Exhausted},
		{"restarts up to the cap", Options{MaxVectors: 5, MaxApplications: 17}, 17, Exhausted},
		{"cap below the space", Options{MaxVectors: 30, MaxApplications: 4}, 4, Exhausted},
		{"default", Options{}, 32, Exhausted},
		{"restarts converge", Options{MaxVectors: 20, MaxApplications: 2000, Tolerance: 1e-9}, -1, WithinTolerance},
		{"tolerance below rounding", Options{MaxVectors: 200, Tolerance: 1e-300}, -1, WithinTolerance},
	} {
		t.Run(row.name, func(t *testing.T) {
			x := append([]float64(nil), start...)
			res := Lowest(p.apply, x, nil, row.opt, nil)
			assert.Equal(t, row.stopped, res.Stopped, "%v %+v", res.Stopped, res)
			assert.Equal(t, row.stopped != Exhausted, res.Converged)
			if row.applications >= 0 {
				assert.Equal(t, row.applications, res.Applications)
			} else {
				assert.InDelta(t, p.values[0], res.Value, 1e-12)
			}
			assert.InDelta(t, p.residual(x, res.Value), res.Residual, 1e-12)
			assert.InDelta(t, 1, dense.Norm(x), 1e-14)
			assert.GreaterOrEqual(t, res.Value, p.values[0]-1e-13, "variational")
		})
	}
}

func TestLowestRestartNeverRises(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	p := newProblem[complex128](t, rng, uniform(rng, 100))
	x := make([]complex128, p.n)
	dense.Random(rng, x)
	last := math.Inf(1)
	var w Workspace[complex128]
	for range 12 {
		res := Lowest(p.apply, x, nil, Options{MaxVectors: 3}, &w)
		assert.LessOrEqual(t, res.Value, last+1e-14)
		last = res.Value
	}
}

func TestLowestInvariantSpace(t *testing.T) {
	both(t, testInvariantSpace[float64], testInvariantSpace[complex128])
}

func testInvariantSpace[T dense.Scalar](t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 8))
	// A large offset and few different eigenvalues: the space of any start has as many dimensions as there are different ones.
	for _, offset := range []float64{0, -1, 1e6} {
		for _, kinds := range []int{1, 2, 3, 5} {
			spectrum := make([]float64, 60)
			for i := range spectrum {
				spectrum[i] = offset + float64(i%kinds)
			}
			p := newProblem[T](t, rng, spectrum)
			x := make([]T, p.n)
			dense.Random(rng, x)
			res := Lowest(p.apply, x, nil, Options{Tolerance: 1e-12}, nil)
			name := fmt.Sprintf("offset=%g kinds=%d %v %+v", offset, kinds, res.Stopped, res)
			assert.True(t, res.Converged, name)
			assert.LessOrEqual(t, res.Applications, kinds+1, name)
			assert.InDelta(t, offset, res.Value, 1e-13*(1+math.Abs(offset)), name)
			assert.Less(t, p.residual(x, res.Value), 1e-13*(1+math.Abs(offset)), name)
		}
	}
	t.Run("start is an eigenvector", func(t *testing.T) {
		p := newProblem[T](t, rng, uniform(rng, 30))
		x := p.vector(7)
		res := Lowest(p.apply, x, nil, Options{Tolerance: 1e-10}, nil)
		assert.Equal(t, 1, res.Applications)
		assert.True(t, res.Converged)
		assert.InDelta(t, p.values[7], res.Value, 1e-13)
	})
	t.Run("zero operator", func(t *testing.T) {
		x := make([]T, 9)
		dense.Random(rng, x)
		res := Lowest(func(dst, src []T) { clear(dst) }, x, nil, Options{}, nil)
		assert.Equal(t, Result{Gap: math.Inf(1), Applications: 1, Converged: true, Stopped: Invariant}, res)
	})
}

func TestLowestAgainstVectors(t *testing.T) {
	both(t, testAgainstVectors[float64], testAgainstVectors[complex128])
}

func testAgainstVectors[T dense.Scalar](t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 10))
	p := newProblem[T](t, rng, uniform(rng, 50))
	var w Workspace[T]
	var found [][]T
	for k := range 5 {
		x := make([]T, p.n)
		dense.Random(rng, x)
		res := Lowest(p.apply, x, found, Options{MaxVectors: 50, Tolerance: 1e-12}, &w)
		assert.True(t, res.Converged)
		assert.InDelta(t, p.values[k], res.Value, 1e-12, "state %d", k)
		for _, y := range found {
			assert.Less(t, dense.Abs(dense.Dot(y, x)), 1e-14)
		}
		found = append(found, x)
	}
	t.Run("arbitrary projector", func(t *testing.T) {
		y := make([]T, p.n)
		dense.Random(rng, y)
		dense.Scale(dense.FromFloat[T](1/dense.Norm(y)), y)
		x := make([]T, p.n)
		dense.Random(rng, x)
		res := Lowest(p.apply, x, [][]T{y}, Options{MaxVectors: 50, Tolerance: 1e-12}, &w)
		// PHP + 10 yy^H has the same lowest pair.
		hy, q := make([]T, p.n), append([]T(nil), p.a...)
		p.apply(hy, y)
		mean := dense.Dot(y, hy)
		for i := range p.n {
			for j := range p.n {
				q[i*p.n+j] += (mean+10)*y[i]*dense.Conj(y[j]) - hy[i]*dense.Conj(y[j]) - y[i]*dense.Conj(hy[j])
			}
		}
		values := make([]float64, p.n)
		require.NoError(t, dense.Eigen(p.n, q, p.n, values, make([]T, p.n*p.n), p.n, nil))
		assert.InDelta(t, values[0], res.Value, 1e-12)
	})
	t.Run("all but one dimension taken", func(t *testing.T) {
		q := newProblem[T](t, rng, []float64{-1, 2, 3})
		x := make([]T, 3)
		dense.Random(rng, x)
		res := Lowest(q.apply, x, [][]T{q.vector(0), q.vector(2)}, Options{}, nil)
		assert.InDelta(t, 2, res.Value, 1e-13)
		assert.Equal(t, Invariant, res.Stopped)
		assert.Equal(t, 1, res.Applications)
	})
}

func TestLowestBadStart(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 12))
	p := newProblem[float64](t, rng, uniform(rng, 4))
	bad := func(dst, src []float64) { clear(dst); dst[1] = math.NaN() }
	large := func(dst, src []float64) { copy(dst, src); dense.Scale(1e-3, dst) }
	for _, row := range []struct {
		name    string
		apply   func(dst, src []float64)
		x       []float64
		against [][]float64
		want    Reason
	}{
		{"zero", p.apply, make([]float64, 4), nil, ZeroStart},
		{"empty", p.apply, nil, nil, ZeroStart},
		{"spanned", p.apply, []float64{2, 0, 0, 0}, [][]float64{{1, 0, 0, 0}}, ZeroStart},
		{"spanned by all", p.apply, []float64{1, 2, 3, 4}, [][]float64{{1, 0, 0, 0}, {0, 1, 0, 0}, {0, 0, 1, 0}, {0, 0, 0, 1}}, ZeroStart},
		{"NaN start", p.apply, []float64{1, math.NaN(), 0, 0}, nil, NotFinite},
		{"infinite start", p.apply, []float64{1, math.Inf(1), 0, 0}, nil, NotFinite},
		{"NaN operator", bad, []float64{1, 0, 0, 0}, nil, NotFinite},
		{"huge start", large, []float64{1e200, -1e200, 0, 1e200}, nil, Invariant},
		{"tiny start", large, []float64{1e-300, 0, 1e-310, 0}, nil, Invariant},
		{"subnormal start", large, []float64{1e-322, 0, 0, 0}, nil, Invariant},
	} {
		t.Run(row.name, func(t *testing.T) {
			res := Lowest(row.apply, row.x, row.against, Options{}, nil)
			assert.Equal(t, row.want, res.Stopped, res.Stopped.String())
			assert.Equal(t, row.want == Invariant, res.Converged)
			if res.Converged {
				assert.InDelta(t, 1e-3, res.Value, 1e-17)
				assert.InDelta(t, 1, dense.Norm(row.x), 1e-15)
			} else {
				assert.True(t, math.IsNaN(res.Value), "no value may be taken for a result")
			}
		})
	}
	assert.PanicsWithValue(t, "krylov: start of length 4, vector to stay orthogonal to of length 3", func() {
		Lowest(p.apply, make([]float64, 4), [][]float64{make([]float64, 3)}, Options{}, nil)
	})
}

// TestLowestScales checks that nothing depends on the unit of energy.
func TestLowestScales(t *testing.T) {
	rng := rand.New(rand.NewPCG(13, 14))
	p := newProblem[complex128](t, rng, uniform(rng, 60))
	start := make([]complex128, p.n)
	dense.Random(rng, start)
	var first Result
	for i, unit := range []float64{1, 0x1p-60, 0x1p60, 0x1p400, 0x1p-400} {
		x := append([]complex128(nil), start...)
		res := Lowest(func(dst, src []complex128) {
			p.apply(dst, src)
			dense.Scale(complex(unit, 0), dst)
		}, x, nil, Options{MaxVectors: 60}, nil)
		if i == 0 {
			first = res
		}
		assert.InEpsilon(t, first.Value*unit, res.Value, 1e-14)
		assert.Equal(t, first.Stopped, res.Stopped)
		assert.Equal(t, first.Applications, res.Applications)
	}
}

// TestLowestKeepsOrthogonality runs far past convergence of the first pair: without reorthogonalization ghosts appear long before.
func TestLowestKeepsOrthogonality(t *testing.T) {
	rng := rand.New(rand.NewPCG(15, 16))
	spectrum := uniform(rng, 120)
	spectrum[0] = -50 // converges within a few steps and destroys orthogonality from then on
	p := newProblem[float64](t, rng, spectrum)
	x := make([]float64, p.n)
	dense.Random(rng, x)
	var w Workspace[float64]
	r := run[float64]{apply: p.apply, opt: Options{MaxVectors: 120, MaxApplications: 120, Tolerance: 1e-300}, w: &w}
	_, ok := r.start(x)
	require.True(t, ok)
	r.expandFully(x, 100)
	worst := 0.0
	for i := range r.size {
		for j := range i {
			worst = max(worst, math.Abs(dense.Dot(w.vectors[i], w.vectors[j])))
		}
	}
	assert.Less(t, worst, 100*eps)
}

// expandFully takes steps without asking whether they are needed.
func (r *run[T]) expandFully(x []T, steps int) {
	r.w.reset(steps + 1)
	copy(r.w.vector(0, len(x)), x)
	for r.size = 0; r.size+1 < steps; {
		next := r.w.vector(r.size+1, len(x))
		r.apply(next, r.w.vectors[r.size])
		r.size++
		_, beta := r.w.orthogonalize(r.w.vectors[:r.size], next)
		divide(beta, next)
	}
}

// TestLowestStopsAtSmallGain compares the value of each number of vectors with the next.
func TestLowestStopsAtSmallGain(t *testing.T) {
	rng := rand.New(rand.NewPCG(19, 20))
	p := newProblem[complex128](t, rng, uniform(rng, 150))
	start := make([]complex128, p.n)
	dense.Random(rng, start)
	value := func(opt Options) Result { return Lowest(p.apply, append([]complex128(nil), start...), nil, opt, nil) }
	for _, gain := range []float64{1e-1, 1e-2, 1e-4, 1e-6} {
		res := value(Options{Gain: gain, MaxVectors: 100})
		assert.Equal(t, SmallGain, res.Stopped)
		assert.False(t, res.Converged)
		n := res.Applications
		last, before, long := value(Options{MaxVectors: n}), value(Options{MaxVectors: n - 1}), value(Options{MaxVectors: n - 2})
		assert.Equal(t, last.Value, res.Value)
		assert.Less(t, before.Value-res.Value, gain)
		assert.GreaterOrEqual(t, long.Value-before.Value, gain, "not one vector more than needed")
	}
}

// TestLowestOnThreads wants the same bits from any number of threads, of vectors of several pieces.
func TestLowestOnThreads(t *testing.T) {
	const n = 400_000
	rng := rand.New(rand.NewPCG(21, 22))
	diagonal, start := make([]float64, n), make([]float64, n)
	dense.Random(rng, diagonal)
	dense.Random(rng, start)
	apply := func(dst, src []float64) {
		for i, d := range diagonal {
			dst[i] = d * src[i]
		}
	}
	want := append([]float64(nil), start...)
	first := Lowest(apply, want, [][]float64{unit(n, 7)}, Options{MaxVectors: 6}, nil)
	for _, threads := range []int{1, 2, 3} {
		x := append([]float64(nil), start...)
		assert.Equal(t, first, Lowest(apply, x, [][]float64{unit(n, 7)}, Options{MaxVectors: 6, Pool: task.New(threads)}, nil))
		assert.True(t, slices.Equal(want, x), "%d threads", threads)
	}
}

func unit(n, i int) []float64 {
	x := make([]float64, n)
	x[i] = 1
	return x
}

func BenchmarkLowest(b *testing.B) {
	for _, n := range []int{1 << 10, 1 << 16} {
		for _, vectors := range []int{8, 20} {
			b.Run(fmt.Sprintf("n=%d/vectors=%d", n, vectors), func(b *testing.B) {
				rng := rand.New(rand.NewPCG(1, 1))
				diagonal, start, x := make([]float64, n), make([]float64, n), make([]float64, n)
				dense.Random(rng, diagonal)
				dense.Random(rng, start)
				var w Workspace[float64]
				apply := func(dst, src []float64) {
					for i, d := range diagonal {
						dst[i] = d * src[i]
					}
				}
				for b.Loop() {
					copy(x, start)
					Lowest(apply, x, nil, Options{MaxVectors: vectors}, &w)
				}
			})
		}
	}
}
