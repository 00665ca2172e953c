package dense

import (
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/internal/task"
)

// slabs are what a random batch runs on. Each matrix stands apart, with a stride of its own, NaN around the factors and a guard value
// around the results.
type slabs[T Scalar] struct {
	rng     *rand.Rand
	a, b, c []T
	plan    Batch
	list    []Product // as added
}

const batchGuard = -777.25

// place appends a rows×cols matrix of random numbers, or of one value, to a slab.
func (s *slabs[T]) place(slab *[]T, rows, cols int, random bool, around float64) (at, ld int) {
	ld = cols + s.rng.IntN(3)
	at = len(*slab) + s.rng.IntN(4)
	for len(*slab) < at+rows*ld+2 {
		*slab = append(*slab, FromFloat[T](around))
	}
	if random {
		for i := range rows {
			Random(s.rng, (*slab)[at+i*ld:at+i*ld+cols])
		}
	}
	return at, ld
}

// sum adds products for one new m×n matrix, with a factor for each entry of depths.
func (s *slabs[T]) sum(m, n int, depths []int) {
	c, ldc := s.place(&s.c, m, n, false, batchGuard)
	for _, k := range depths {
		p := Product{C: c, LDC: ldc, M: m, N: n, K: k, OpA: allOps[s.rng.IntN(4)], OpB: allOps[s.rng.IntN(4)]}
		rows, cols := m, k
		if p.OpA.transposes() {
			rows, cols = k, m
		}
		p.A, p.LDA = s.place(&s.a, rows, cols, true, math.NaN())
		rows, cols = k, n
		if p.OpB.transposes() {
			rows, cols = n, k
		}
		p.B, p.LDB = s.place(&s.b, rows, cols, true, math.NaN())
		s.list = append(s.list, p)
	}
}

// seal adds the products in random order but for those of one sum.
func (s *slabs[T]) seal() {
	for len(s.list) > 0 {
		i := s.rng.IntN(len(s.list))
		for j, p := range s.list {
			if p.C == s.list[i].C {
				s.plan.Add(p)
				s.list = append(s.list[:j:j], s.list[j+1:]...)
				break
			}
		}
	}
	s.plan.Seal()
}

// want computes the result by the contract of Gemm, and the magnitudes in which rounding is measured.
func (s *slabs[T]) want(list []Product) (c []T, size []float64) {
	c, size = append([]T(nil), s.c...), make([]float64, len(s.c))
	fresh := map[int]bool{}
	for _, p := range list {
		rowA, colA := p.OpA.strides(p.LDA)
		rowB, colB := p.OpB.strides(p.LDB)
		for i := range p.M {
			for j := range p.N {
				at := p.C + i*p.LDC + j
				if !fresh[at] {
					fresh[at] = true
					c[at] = 0
				}
				for l := range p.K {
					x, y := s.a[p.A+i*rowA+l*colA], s.b[p.B+l*rowB+j*colB]
					size[at] += Abs(x) * Abs(y)
					if p.OpA.conjugates() {
						x = Conj(x)
					}
					if p.OpB.conjugates() {
						y = Conj(y)
					}
					c[at] += x * y
				}
			}
		}
	}
	return c, size
}

// TestBatch: sums of products of many sizes and all operations, from NaN-filled surroundings, are right, touch nothing else, and come out
// the same at any number of threads.
func TestBatch(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, testBatch[float64], testBatch[complex128]) })
}

func testBatch[T Scalar](t *testing.T) {
	for seed := range uint64(6) {
		s := &slabs[T]{rng: rand.New(rand.NewPCG(seed, 5))}
		deepest := 0
		for range 40 {
			size := []int{3, 6, 20, 50}[s.rng.IntN(4)]
			depths := make([]int, 1+s.rng.IntN(4))
			total := 0
			for i := range depths {
				depths[i] = s.rng.IntN(size + 1)
				total += depths[i]
			}
			deepest = max(deepest, total)
			s.sum(s.rng.IntN(size+1), 1+s.rng.IntN(size), depths)
		}
		if seed%3 == 0 { // some that are cut
			s.sum(140, 70, []int{150, 180})
			s.sum(67, 190, []int{130, 1})
			deepest = max(deepest, 330)
		}
		list := append([]Product(nil), s.list...)
		s.seal()
		want, size := s.want(list)
		var first []T
		var runner BatchRunner[T]
		for _, threads := range []int{1, 2, 3, 8} {
			c := append([]T(nil), s.c...)
			runner.Run(&s.plan, c, s.a, s.b, task.New(threads))
			if first == nil {
				first = c
				for i := range c {
					if d := Abs(c[i] - want[i]); !(d <= 2*eps*float64(deepest+8)*size[i]) {
						t.Fatalf("seed %d: element %d is %v, want %v", seed, i, c[i], want[i])
					}
				}
			}
			require.Equal(t, first, c, "threads=%d", threads)
		}
	}
}

// TestBatchSerialIsGemm: a list without a cut gives the numbers of Gemm, one call a product.
func TestBatchSerialIsGemm(t *testing.T) {
	a, b := random[float64](400), random[float64](400)
	p := Product{A: 3, B: 5, C: 1, M: 7, N: 6, K: 9, LDA: 9, LDB: 9, LDC: 8, OpB: Trans}
	want := make([]float64, 300)
	Gemm(p.OpA, p.OpB, p.M, p.N, p.K, 1, a[3:], p.LDA, b[5:], p.LDB, 0, want[1:], p.LDC)
	Gemm(p.OpA, p.OpB, p.M, p.N, p.K, 1, a[7:], p.LDA, b[25:], p.LDB, 1, want[1:], p.LDC)
	Gemm(p.OpA, p.OpB, p.M, p.N, p.K, 1, a[3:], p.LDA, b[5:], p.LDB, 0, want[101:], p.LDC)
	Gemm(p.OpA, p.OpB, p.M, p.N, p.K, 1, a[13:], p.LDA, b[5:], p.LDB, 0, want[201:], p.LDC)
	var plan Batch
	plan.AddStrided(p, 2, 4, 20, 0) // a sum
	p.C = 101
	plan.AddStrided(p, 2, 10, 0, 100)
	plan.Seal()
	plan.Seal()
	got := make([]float64, 300)
	new(BatchRunner[float64]).Run(&plan, got, a, b, nil)
	assert.Equal(t, want, got)
	assert.Equal(t, 4*2*7*6*9., plan.Flops())
}

// TestBatchCuts: the largest task is small beside the whole, parts cover C once, and one is never narrower than it should be.
func TestBatchCuts(t *testing.T) {
	for _, row := range []struct {
		name    string
		m, n, k int
		parts   int // at least
	}{
		{"square", 512, 512, 512, 16},
		{"tall", 2000, 20, 700, 16},
		{"flat", 30, 1500, 700, 16},
		{"deep", 130, 140, 9000, 4},
		{"too narrow", 100, 100, 9000, 1},
		{"little work", 300, 300, 10, 1},
	} {
		t.Run(row.name, func(t *testing.T) {
			var plan Batch
			plan.Add(Product{M: row.m, N: row.n, K: row.k, LDA: row.k, LDB: row.n, LDC: row.n})
			plan.Seal()
			assert.GreaterOrEqual(t, len(plan.tasks), row.parts)
			if row.parts == 1 {
				assert.Len(t, plan.tasks, 1)
			}
			covered := make([]int8, row.m*row.n)
			for _, p := range plan.products {
				assert.True(t, p.M >= min(row.m, cutWidth-8) && p.N >= min(row.n, cutWidth-24), "%d×%d", p.M, p.N)
				for i := range p.M {
					for j := range p.N {
						covered[p.C+i*p.LDC+j]++
					}
				}
			}
			for at, c := range covered {
				require.EqualValues(t, 1, c, "element %d", at)
			}
		})
	}
}

// TestBatchOrder: largest first.
func TestBatchOrder(t *testing.T) {
	var plan Batch
	for i, k := range []int{3, 90, 40, 90, 1} {
		plan.Add(Product{C: 100 * i, M: 5, N: 5, K: k, LDA: k, LDB: 5, LDC: 5})
	}
	plan.Seal()
	var depths []int
	for _, s := range plan.tasks {
		require.Equal(t, s.from+1, s.to)
		depths = append(depths, plan.products[s.from].K)
	}
	assert.Equal(t, []int{90, 90, 40, 3, 1}, depths)
}

func TestBatchPanics(t *testing.T) {
	product := Product{M: 3, N: 4, K: 5, LDA: 5, LDB: 4, LDC: 4}
	x := make([]float64, 100)
	var runner BatchRunner[float64]
	for _, row := range []struct {
		name string
		call func()
		want string
	}{
		{"added late", func() {
			var plan Batch
			plan.Seal()
			plan.Add(product)
		}, "dense: product added to a sealed batch"},
		{"not sealed", func() { runner.Run(new(Batch), x, x, x, nil) }, "dense: run of a batch that is not sealed"},
		{"two shapes", func() {
			var plan Batch
			plan.Add(product)
			other := product
			other.M = 2
			plan.Add(other)
			plan.Seal()
		}, "dense: products for the same matrix, at 0, are 3×4 with stride 4 and 2×4 with stride 4"},
		{"short slab", func() {
			var plan Batch
			plan.Add(product)
			plan.Seal()
			runner.Run(&plan, x, x[:14], x, nil)
		}, "dense: A is 3×5 with stride 5 but holds 14 elements"},
	} {
		t.Run(row.name, func(t *testing.T) { assert.PanicsWithValue(t, row.want, row.call) })
	}
}

func TestBatchEmpty(t *testing.T) {
	var plan Batch
	plan.Add(Product{M: 0, N: 4, K: 5, LDA: 5, LDB: 4, LDC: 4})
	plan.Add(Product{C: 1, M: 1, N: 2, K: 0, LDB: 2, LDC: 2})
	plan.Seal()
	c := []float64{7, 7, 7, 7}
	new(BatchRunner[float64]).Run(&plan, c, nil, nil, nil)
	assert.Equal(t, []float64{7, 0, 0, 7}, c, "an empty sum is zero")
}

// BenchmarkBatch runs lists of one shape, serially and on all threads; productCost follows from the smallest.
func BenchmarkBatch(b *testing.B) {
	b.Run("type=real", benchmarkBatch[float64])
	b.Run("type=complex", benchmarkBatch[complex128])
}

func benchmarkBatch[T Scalar](b *testing.B) {
	for _, n := range []int{1, 2, 4, 8, 16, 64, 512} {
		for _, threads := range []int{1, runtime.GOMAXPROCS(0)} {
			count := max(1, min(4096, 1<<22/(n*n*n)))
			b.Run(fmt.Sprintf("n=%d/count=%d/threads=%d", n, count, threads), func(b *testing.B) {
				x, y, c := random[T](n*n*min(count, 100)), random[T](n*n*min(count, 100)), make([]T, n*n*count)
				var plan Batch
				for i := range count {
					at := i % 100 * n * n
					plan.Add(Product{A: at, B: at, C: i * n * n, M: n, N: n, K: n, LDA: n, LDB: n, LDC: n})
				}
				plan.Seal()
				var runner BatchRunner[T]
				pool := task.New(threads)
				for b.Loop() {
					runner.Run(&plan, c, x, y, pool)
				}
				b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N*count), "ns/product")
				reportFlops(b, flopFactor[T]()*plan.Flops())
			})
		}
	}
}
