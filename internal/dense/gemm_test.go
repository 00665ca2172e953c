package dense

import (
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"slices"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/gonum"
)

var allOps = []Op{NoTrans, Trans, ConjTrans, ConjNoTrans}

// element returns op(X)[i, j].
func element[T Scalar](op Op, x *padded[T], i, j int) T {
	switch op {
	case Trans:
		return x.at(j, i)
	case ConjTrans:
		return Conj(x.at(j, i))
	case ConjNoTrans:
		return Conj(x.at(i, j))
	}
	return x.at(i, j)
}

// product computes one element of Gemm's result as its comment says, and the sum of the magnitudes that rounding is measured in.
func product[T Scalar](opA, opB Op, k int, alpha T, a, b *padded[T], beta, c T, i, j int) (want T, size float64) {
	var sum T
	for l := range k {
		x, y := element(opA, a, i, l), element(opB, b, l, j)
		sum += x * y
		size += Abs(x) * Abs(y)
	}
	want, size = alpha*sum, Abs(alpha)*size
	if beta != 0 {
		want += beta * c
		size += Abs(beta) * Abs(c)
	}
	return want, size
}

func testGemm[T Scalar](t *testing.T, opA, opB Op, m, n, k int, alpha, beta T, seed uint64) {
	t.Helper()
	rng := rand.New(rand.NewPCG(seed, 99))
	rows := func(op Op, r, c int) (int, int) {
		if op.transposes() {
			return c, r
		}
		return r, c
	}
	fresh := func(op Op, r, c int) *padded[T] {
		r, c = rows(op, r, c)
		entries := make([]T, r*c)
		Random(rng, entries)
		return input(r, c, rng.IntN(4), 1+2*rng.IntN(3), entries)
	}
	a, b := fresh(opA, m, k), fresh(opB, k, n)
	guard := -777.25
	c := newPadded[T](m, n, rng.IntN(4), 1+2*rng.IntN(3), guard)
	before := make([]T, m*n)
	for i := range before {
		before[i] = FromFloat[T](math.NaN())
	}
	if beta != 0 {
		Random(rng, before)
	}
	for i := range m {
		copy(c.a[i*c.ld:i*c.ld+n], before[i*n:(i+1)*n])
	}
	Gemm(opA, opB, m, n, k, alpha, a.a, a.ld, b.a, b.ld, beta, c.a, c.ld)
	name := fmt.Sprintf("%v%v m=%d n=%d k=%d alpha=%v beta=%v", opA, opB, m, n, k, alpha, beta)
	for i := range m {
		for j := range n {
			want, size := product(opA, opB, k, alpha, a, b, beta, before[i*n+j], i, j)
			if d := Abs(c.at(i, j) - want); !(d <= eps*float64(k+8)*size) {
				t.Errorf("%s: C[%d,%d] = %v, want %v", name, i, j, c.at(i, j), want)
				return
			}
		}
	}
	c.checkGuards(t, name)
	a.checkGuards(t, name)
	b.checkGuards(t, name)
}

func TestGemm(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, testGemmSizes[float64], testGemmSizes[complex128]) })
}

func testGemmSizes[T Scalar](t *testing.T) {
	scalars := []T{0, 1, FromFloat[T](-1.5)}
	if IsComplex[T]() {
		scalars = append(scalars, FromComplex[T](complex(0.5, -2)))
	}
	seed := uint64(0)
	run := func(m, n, k int) {
		for _, opA := range allOps {
			for _, opB := range allOps {
				seed++
				testGemm(t, opA, opB, m, n, k, scalars[seed%uint64(len(scalars))], scalars[(seed/4)%uint64(len(scalars))], seed)
				testGemm[T](t, opA, opB, m, n, k, 1, 0, seed)
			}
		}
	}
	for m := range 6 {
		for n := range 6 {
			for k := range 6 {
				run(m, n, k)
			}
		}
	}
	// Across the edges of the blocks, narrow and wide.
	for _, s := range [][3]int{
		{63, 127, 65}, {64, 128, 64}, {65, 129, 31}, {130, 5, 257}, {5, 510, 70}, {5, 20, 520}, {260, 13, 9}, {100, 1, 200}, {1, 200, 100},
		{1, 1, 300}, {70, 150, 1}, {129, 11, 65}, {3, 25, 150},
	} {
		for _, opA := range allOps {
			for _, opB := range allOps {
				seed++
				checkGemm(t, opA, opB, s[0], s[1], s[2], scalars[1+seed%2], scalars[seed/2%3], seed)
			}
		}
	}
}

// TestGemmPlain holds the loops of tiny products at sizes where the tiled code is used otherwise.
func TestGemmPlain(t *testing.T) {
	for _, opA := range allOps {
		for _, opB := range allOps {
			const m, n, k = 9, 10, 11
			a, b := random[complex128](m*k), random[complex128](k*n)
			lda, ldb := k, n
			if opA.transposes() {
				lda = m
			}
			if opB.transposes() {
				ldb = k
			}
			got, want := make([]complex128, m*n), make([]complex128, m*n)
			plain(opA, opB, m, n, k, 2i, a, lda, b, ldb, 0, got, n)
			Gemm(opA, opB, m, n, k, 2i, a, lda, b, ldb, 0, want, n)
			Axpy(-1, want, got)
			small(t, Norm(got)/Norm(want)/eps, 10, "complex %v%v", opA, opB)

			x, y := random[float64](m*k), random[float64](k*n)
			gotReal, wantReal := make([]float64, m*n), make([]float64, m*n)
			plain(opA, opB, m, n, k, 2, x, lda, y, ldb, 0, gotReal, n)
			Gemm(opA, opB, m, n, k, 2, x, lda, y, ldb, 0, wantReal, n)
			Axpy(-1, wantReal, gotReal)
			small(t, Norm(gotReal)/Norm(wantReal)/eps, 10, "real %v%v", opA, opB)
		}
	}
}

func TestGemmPanics(t *testing.T) {
	x := make([]float64, 100)
	for _, row := range []struct {
		name string
		call func()
		want string
	}{
		{"short A", func() { Gemm(NoTrans, NoTrans, 3, 4, 5, 1, x[:14], 5, x, 4, 0, x, 4) }, "dense: A is 3×5 with stride 5 but holds 14 elements"},
		{"short transposed B", func() { Gemm(NoTrans, Trans, 3, 4, 5, 1, x, 5, x[:19], 5, 0, x, 4) }, "dense: B (transposed) is 4×5 with stride 5 but holds 19 elements"},
		{"narrow stride", func() { Gemm(NoTrans, NoTrans, 3, 4, 5, 1, x, 5, x, 4, 0, x, 3) }, "dense: C is 3×4 with stride 3 but holds 100 elements"},
		{"negative", func() { Gemm(NoTrans, NoTrans, -3, 4, 5, 1, x, 5, x, 4, 0, x, 4) }, "dense: C is -3×4 with stride 4 but holds 100 elements"},
		{"operation", func() { Gemm(NoTrans, Op(7), 3, 4, 5, 1, x, 5, x, 4, 0, x, 4) }, "dense: product with operations n, Op(7)"},
	} {
		t.Run(row.name, func(t *testing.T) { assert.PanicsWithValue(t, row.want, row.call) })
	}
}

// TestGemmHandsOnNaN: a NaN in an input reaches its whole row or column, through the tiled and the tiny code.
func TestGemmHandsOnNaN(t *testing.T) {
	for _, n := range []int{2, 20} {
		a, b, c := random[float64](n*n), random[float64](n*n), make([]float64, n*n)
		a[n+1] = math.NaN()
		Gemm(NoTrans, NoTrans, n, n, n, 1, a, n, b, n, 0, c, n)
		for j := range n {
			assert.True(t, math.IsNaN(c[n+j]))
			assert.False(t, math.IsNaN(c[j]))
		}
	}
}

// TestGemmStartsNoGoroutine looks at who started the goroutines that live while large products run; gonum's own product, which starts
// some, shows that it looks well.
func TestGemmStartsNoGoroutine(t *testing.T) {
	const n = 260
	a, c := random[float64](n*n), make([]float64, n*n)
	z, d := random[complex128](n*n), make([]complex128, n*n)
	assert.NotEmpty(t, starters(func() {
		gonum.Implementation{}.Dgemm(blas.NoTrans, blas.NoTrans, n, n, n, 1, a, n, a, n, 0, c, n)
	}), "gonum's product")
	for _, ops := range [][2]Op{{NoTrans, NoTrans}, {Trans, Trans}} {
		assert.Empty(t, starters(func() {
			Gemm(ops[0], ops[1], n, n, n, 1, a, n, a, n, 0, c, n)
			Gemm(ops[0], ops[1], n, n, n, 1, z, n, z, n, 0, d, n)
		}))
	}
}

// starters repeats work for a while and returns the functions of ours and gonum's that have started a goroutine meanwhile.
func starters(work func()) []string {
	var stop atomic.Bool
	found := make(chan []string)
	go func() {
		buffer, seen := make([]byte, 1<<20), []string(nil)
		for !stop.Load() {
			text := string(buffer[:runtime.Stack(buffer, true)])
			for _, part := range strings.Split(text, "created by ")[1:] {
				name, _, _ := strings.Cut(part, " in goroutine")
				ours := strings.HasPrefix(name, "rundle/") && !strings.Contains(name, "dense.starters")
				if (ours || strings.HasPrefix(name, "gonum.org/")) && !slices.Contains(seen, name) {
					seen = append(seen, name)
				}
			}
			time.Sleep(50 * time.Microsecond)
		}
		found <- seen
	}()
	for begin := time.Now(); time.Since(begin) < 100*time.Millisecond; {
		work()
	}
	stop.Store(true)
	return <-found
}

// TestGemmFromManyGoroutines: the copies of tiles are shared by turns, never at once. The race detector looks on.
func TestGemmFromManyGoroutines(t *testing.T) {
	const n, callers = 40, 8
	z := random[complex128](n * n)
	results := make([][]complex128, callers)
	var wait sync.WaitGroup
	for i := range results {
		wait.Go(func() {
			results[i] = make([]complex128, n*n)
			for range 5 {
				Gemm(Trans, ConjTrans, n, n, n, 1, z, n, z, n, 0, results[i], n)
			}
		})
	}
	wait.Wait()
	for _, r := range results[1:] {
		assert.Equal(t, results[0], r)
	}
}
