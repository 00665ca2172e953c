package main

import (
	"math/rand/v2"
	"regexp"
	"runtime"
	"slices"
	"time"

	"rundle/internal/dense"
	pool "rundle/internal/task"
)

// A blockList is a batch of products as a sweep has them.
type blockList struct {
	routine string
	largest [3]int // block
	flops   float64
	one     func() // all of it on one thread
	two     func() // and on two

	hold, release func() // of the two, as a sweep holds them from list to list
}

func (l blockList) task() task {
	return task{group: workers, routine: l.routine, op: "list", m: l.largest[0], n: l.largest[1], k: l.largest[2], flops: l.flops}
}

// blockLists returns lists above 20 Mflop: blocks of similar sizes, of sizes over two decades, sums over few blocks, one block alone.
func blockLists(quick bool) []blockList {
	out := listsOf[float64]("dgemm", 1, quick)
	return append(out, listsOf[complex128]("zgemm", 4, quick)...)
}

func listsOf[T dense.Scalar](routine string, cost float64, quick bool) []blockList {
	shapes := []struct {
		count, least, most, sums int
	}{
		{60, 24, 96, 1}, {400, 4, 128, 1}, {40, 8, 200, 6}, {1, 384, 384, 1},
	}
	if quick {
		shapes = shapes[:2]
	}
	var out []blockList
	for _, s := range shapes {
		out = append(out, newList[T](routine, cost, s.count, s.least, s.most, s.sums))
	}
	return out
}

// newList draws the sizes of count blocks between least and most, evenly in their logarithm; sums products add up in each.
func newList[T dense.Scalar](routine string, cost float64, count, least, most, sums int) blockList {
	rng := rand.New(rand.NewPCG(uint64(count), uint64(most)))
	size := func() int {
		n := float64(least)
		for range 8 { // the mean of eight: a bell, as charges make it
			n += float64(rng.IntN(most-least+1)) / 8
		}
		return int(n)
	}
	var plan dense.Batch
	l := blockList{routine: routine}
	var sizeA, sizeB, sizeC int
	for range count {
		m, n := size(), size()
		for range sums {
			p := dense.Product{A: sizeA, B: sizeB, C: sizeC, M: m, N: n, K: size(), LDB: n, LDC: n}
			p.LDA = p.K
			plan.Add(p)
			sizeA += m * p.K
			sizeB += p.K * n
			if shape := [3]int{m, n, p.K}; shape[0]*shape[1]*shape[2] > l.largest[0]*l.largest[1]*l.largest[2] {
				l.largest = shape
			}
		}
		sizeC += m * n
	}
	plan.Seal()
	a, b, c := random[T](sizeA), random[T](sizeB), make([]T, sizeC)
	var runner dense.BatchRunner[T]
	one, two := pool.New(1), pool.New(2)
	l.flops = cost * plan.Flops()
	l.one = func() { runner.Run(&plan, c, a, b, one) }
	l.two = func() { runner.Run(&plan, c, a, b, two) }
	l.hold, l.release = two.Hold, two.Release
	return l
}

// measure lets one thread and two take turns for about so many seconds and compares their wall time. Gflops are those of two threads, the
// reference is one.
func (l blockList) measure(kernels string, seconds float64) row {
	if err := dense.UseKernels(kernels); err != nil {
		panic(err)
	}
	l.hold()
	defer l.release()
	l.two()
	var times [2][]float64
	for spent := 0.0; spent < seconds || len(times[0]) < 8; {
		for i, run := range []func(){l.one, l.two} {
			run() // the list before: threads are awake, as in a sweep
			start := time.Now()
			run()
			t := time.Since(start).Seconds()
			times[i] = append(times[i], t)
			spent += t
		}
	}
	one, two := calm(times[0]), calm(times[1])
	t := l.task()
	return row{Routine: t.routine, Op: t.op, M: t.m, N: t.n, K: t.k, Kernels: kernels, group: workers,
		Gflops: l.flops / two / 1e9, Reference: l.flops / one / 1e9, Ratio: one / two, Bytes: allocated(l.two)}
}

// measureWorkers measures the lists whose name matches, if there are two processors to measure on.
func measureWorkers(names []string, match *regexp.Regexp, quick bool, report func(task, []row) error) error {
	if runtime.GOMAXPROCS(0) < 2 {
		return nil
	}
	seconds := 0.5
	if quick {
		seconds = 0.1
	}
	for _, l := range blockLists(quick) {
		t := l.task()
		if !match.MatchString(t.name()) && !match.MatchString(string(t.group)) {
			continue
		}
		fresh := make([]row, len(names))
		for i, name := range names {
			fresh[i] = l.measure(name, seconds)
		}
		if err := report(t, fresh); err != nil {
			return err
		}
	}
	return nil
}

// calm is the median of the quarter of rounds that took least: the other work of a machine disturbs two threads more than one, and
// never makes a round shorter.
func calm(times []float64) float64 {
	slices.Sort(times)
	return times[len(times)/8]
}
