package dense

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"rundle/internal/task"
)

// Product is C = op(A) op(B), as Gemm has it, on matrices at offsets into three slabs.
type Product struct {
	A, B, C       int // the first elements
	M, N, K       int // op(A) is M×K, op(B) K×N
	LDA, LDB, LDC int
	OpA, OpB      Op
}

// flops are those of real numbers; complex ones take four times as many.
func (p *Product) flops() float64 { return 2 * float64(p.M) * float64(p.N) * float64(p.K) }

// Batch is a list of products, of any sizes from 1×1 up, planned once and run many times by a BatchRunner:
//
//	var plan dense.Batch
//	for ... {
//		plan.Add(dense.Product{...})
//	}
//	plan.Seal()
//	...
//	var runner dense.BatchRunner[T] // one for each goroutine that runs plans
//	runner.Run(&plan, c, a, b, pool)
//
// Products with the same C are one sum, in the order in which they were added: the first overwrites C, the others add to it. Blocks of C
// that start at different places must not overlap. What no product writes is left alone.
//
// Seal makes tasks of the sums, largest first, and cuts the ones that would keep the threads waiting for the last. It looks at the sizes
// alone and each element of C has one writer, so that the result is the same, bit by bit, at any number of threads. The zero value is an
// empty list. A sealed list does not change: any number of runners may run it at once.
type Batch struct {
	products []Product
	tasks    []batchTask // largest first
	flops    float64
	cost     float64
	sealed   bool
}

// batchTask is the sum of products[from:to], or a part of it.
type batchTask struct{ from, to int }

// Add appends a product. It panics after Seal.
func (b *Batch) Add(p Product) {
	if b.sealed {
		panic("dense: product added to a sealed batch")
	}
	b.products = append(b.products, p)
}

// AddStrided appends count products of one shape: the i-th has its matrices i·stepA, i·stepB and i·stepC elements further on than p. With
// stepC zero they are one sum.
func (b *Batch) AddStrided(p Product, count, stepA, stepB, stepC int) {
	for range count {
		b.Add(p)
		p.A += stepA
		p.B += stepB
		p.C += stepC
	}
}

// Flops returns the floating-point operations of one run in real arithmetic; complex arithmetic takes four times as many.
func (b *Batch) Flops() float64 { return b.flops }

// Seal ends the list; see Batch. It panics if products that share C differ in its shape. A second call does nothing.
func (b *Batch) Seal() {
	if b.sealed {
		return
	}
	b.sealed = true
	b.products = slices.DeleteFunc(b.products, func(p Product) bool { return p.M == 0 || p.N == 0 })
	byTarget := func(p, q Product) int { return cmp.Compare(p.C, q.C) }
	if !slices.IsSortedFunc(b.products, byTarget) {
		slices.SortStableFunc(b.products, byTarget)
	}
	sums := b.sums()
	for _, s := range sums {
		for i := s.from; i < s.to; i++ {
			b.flops += b.products[i].flops()
			b.cost += b.products[i].flops() + productCost
		}
	}
	b.arrange(b.cutAll(sums))
}

// sums returns the stretches of products with the same C.
func (b *Batch) sums() []batchTask {
	var out []batchTask
	for i := range b.products {
		p := &b.products[i]
		if i == 0 || b.products[i-1].C != p.C {
			out = append(out, batchTask{i, i + 1})
			continue
		}
		if q := &b.products[i-1]; p.M != q.M || p.N != q.N || p.LDC != q.LDC {
			panic(fmt.Sprintf("dense: products for the same matrix, at %d, are %d×%d with stride %d and %d×%d with stride %d",
				p.C, q.M, q.N, q.LDC, p.M, p.N, p.LDC))
		}
		out[len(out)-1].to = i + 1
	}
	return out
}

func (b *Batch) work(t batchTask) float64 {
	sum := 0.0
	for i := t.from; i < t.to; i++ {
		sum += b.products[i].flops() + productCost
	}
	return sum
}

// arrange orders the tasks, largest first, and the products as they will be run.
func (b *Batch) arrange(tasks []batchTask) {
	work := make([]float64, len(tasks))
	for i, t := range tasks {
		work[i] = b.work(t)
	}
	b.tasks = make([]batchTask, 0, len(tasks))
	products := make([]Product, 0, len(b.products))
	for _, i := range task.ByWork(work) {
		from := len(products)
		products = append(products, b.products[tasks[i].from:tasks[i].to]...)
		b.tasks = append(b.tasks, batchTask{from, len(products)})
	}
	b.products = products
}

// How a batch is cut, by sizes alone. The bench command's rows "list, two threads" set the cuts: one product of 384 gained 1.95 to 2.0 from a
// second thread with these, 1.80 to 1.96 with twice the share and edges at any vector; uncut, the second thread has nothing to do.
var (
	// productCost is what a product costs besides its operations, in flops of the best rate: some 20 nanoseconds (BenchmarkBatch, n=1).
	productCost = 2000.0
	// A sum is cut if it exceeds this share of the list, so that the threads end at about the same time, ...
	cutShare = 1.0 / 32
	// ... into parts of at least so much work, some 20 microseconds, ...
	cutFlops = 2e6
	// ... and at least so many rows and columns, so that copies of B and edges of tiles stay cheap.
	cutWidth = 64
)

// cutAll replaces the sums that are too large by parts.
func (b *Batch) cutAll(sums []batchTask) []batchTask {
	most := max(cutShare*b.cost, cutFlops)
	out := make([]batchTask, 0, len(sums))
	for _, s := range sums {
		if work := b.work(s); work > 1.5*most {
			out = b.cut(out, s, int(math.Ceil(work/most)))
		} else {
			out = append(out, s)
		}
	}
	return out
}

// cut appends about so many parts of a sum, or fewer: each sums the same products for a rectangle of C. Columns are cut first, as parts by
// rows each make a copy of B.
func (b *Batch) cut(out []batchTask, s batchTask, parts int) []batchTask {
	m, n := b.products[s.from].M, b.products[s.from].N
	columns := max(1, min(parts, n/cutWidth))
	rows := max(1, min((parts+columns-1)/columns, m/cutWidth))
	if rows*columns == 1 {
		return append(out, s)
	}
	for i := range rows {
		i0, i1 := edge(m, rows, i, 8), edge(m, rows, i+1, 8)
		for j := range columns {
			j0, j1 := edge(n, columns, j, 24), edge(n, columns, j+1, 24)
			from := len(b.products)
			for l := s.from; l < s.to; l++ {
				b.products = append(b.products, b.products[l].part(i0, i1, j0, j1))
			}
			out = append(out, batchTask{from, len(b.products)})
		}
	}
	return out
}

// edge returns where part i of n begins: at a multiple of step, of whole vectors of any kernel's rows, or of its widest tile of columns.
func edge(n, parts, i, step int) int {
	if i == parts {
		return n
	}
	return (n*i/parts + step/2) / step * step
}

// part returns the product for the given rows and columns of C.
func (p Product) part(i0, i1, j0, j1 int) Product {
	rowA, _ := p.OpA.strides(p.LDA)
	_, colB := p.OpB.strides(p.LDB)
	p.A += i0 * rowA
	p.B += j0 * colB
	p.C += i0*p.LDC + j0
	p.M, p.N = i1-i0, j1-j0
	return p
}

// BatchRunner runs batches, without allocating once it has run. The zero value is ready. It is not for concurrent use.
type BatchRunner[T Scalar] struct {
	plan    *Batch
	c, a, b []T
	do      func(worker, i int) // run, bound once
}

// Run computes the products of a sealed batch from the slabs a and b into c. It panics if a matrix does not fit into its slab; c must not
// overlap the others. A list that is too short to be worth it, or a nil pool, runs in the caller alone.
func (r *BatchRunner[T]) Run(plan *Batch, c, a, b []T, pool *task.Pool) {
	if !plan.sealed {
		panic("dense: run of a batch that is not sealed")
	}
	if r.do == nil {
		r.do = r.run
	}
	cost := plan.cost
	if IsComplex[T]() {
		cost += 3 * plan.flops
	}
	r.plan, r.c, r.a, r.b = plan, c, a, b
	pool.Do(len(plan.tasks), cost, r.do)
	r.plan, r.c, r.a, r.b = nil, nil, nil, nil
}

func (r *BatchRunner[T]) run(_, i int) {
	t := r.plan.tasks[i]
	var beta T
	for i := t.from; i < t.to; i++ {
		p := &r.plan.products[i]
		Gemm(p.OpA, p.OpB, p.M, p.N, p.K, 1, r.a[p.A:], p.LDA, r.b[p.B:], p.LDB, beta, r.c[p.C:], p.LDC)
		beta = 1
	}
}
