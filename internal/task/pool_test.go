package task

import (
	"errors"
	"fmt"
	"runtime"
	"slices"
	"sync"
	"sync/atomic"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"go.uber.org/goleak"
	"pgregory.net/rapid"
)

const large = 10 * Threshold

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

func TestThreads(t *testing.T) {
	assert.Equal(t, 1, (*Pool)(nil).Threads())
	assert.Equal(t, 1, new(Pool).Threads())
	assert.Equal(t, runtime.GOMAXPROCS(0), New(0).Threads())
	assert.Equal(t, runtime.GOMAXPROCS(0), New(-3).Threads())
	assert.Equal(t, 7, New(7).Threads())
}

func TestDoRunsEachOnce(t *testing.T) {
	for _, row := range []struct {
		name    string
		pool    *Pool
		n       int
		flops   float64
		workers int // at most
	}{
		{"nil pool", nil, 10, large, 1},
		{"zero pool", new(Pool), 10, large, 1},
		{"one thread", New(1), 10, large, 1},
		{"little work", New(4), 10, Threshold / 2, 1},
		{"nothing", New(4), 0, large, 0},
		{"one piece", New(4), 1, large, 1},
		{"fewer pieces than threads", New(8), 3, large, 3},
		{"many pieces", New(4), 1000, large, 4},
	} {
		t.Run(row.name, func(t *testing.T) {
			defer goleak.VerifyNone(t)
			counts := make([]atomic.Int32, row.n)
			busy := make([]atomic.Int32, max(1, row.pool.Threads()))
			seen := make([]atomic.Bool, len(busy))
			row.pool.Do(row.n, row.flops, func(worker, i int) {
				if busy[worker].Add(1) != 1 {
					t.Errorf("worker %d does two pieces at once", worker)
				}
				runtime.Gosched()
				counts[i].Add(1)
				seen[worker].Store(true)
				busy[worker].Add(-1)
			})
			for i := range counts {
				assert.EqualValues(t, 1, counts[i].Load(), "piece %d", i)
			}
			used := 0
			for i := range seen {
				if seen[i].Load() {
					used++
				}
			}
			assert.LessOrEqual(t, used, row.workers)
		})
	}
}

func TestDoSerialKeepsOrder(t *testing.T) {
	var order []int
	New(4).Do(20, 0, func(worker, i int) {
		assert.Zero(t, worker)
		order = append(order, i)
	})
	assert.True(t, slices.IsSorted(order))
	assert.Len(t, order, 20)
}

// TestDoSpreads proves that pieces do run at the same time: each waits for the other.
func TestDoSpreads(t *testing.T) {
	var both sync.WaitGroup
	both.Add(2)
	workers := make([]int, 2)
	New(2).Do(2, large, func(worker, i int) {
		both.Done()
		both.Wait()
		workers[i] = worker
	})
	slices.Sort(workers)
	assert.Equal(t, []int{0, 1}, workers, "the caller takes part")
}

// TestDoIsDeterministic sums numbers whose sum depends on the order, by pieces, at many thread counts.
func TestDoIsDeterministic(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.SliceOfN(rapid.Float64Range(-1e6, 1e6), 1, 300).Draw(t, "x")
		pieces := rapid.IntRange(1, 40).Draw(t, "pieces")
		sum := func(threads int) []float64 {
			out := make([]float64, pieces)
			scratch := make([][]float64, New(threads).Threads())
			New(threads).Do(pieces, large, func(worker, i int) {
				scratch[worker] = scratch[worker][:0]
				for j := i; j < len(x); j += pieces {
					scratch[worker] = append(scratch[worker], x[j])
				}
				for _, v := range scratch[worker] {
					out[i] += v / 3
				}
			})
			return out
		}
		want := sum(1)
		for _, threads := range []int{2, 3, 8, 50} {
			require.Equal(t, want, sum(threads), "threads=%d", threads)
		}
	})
}

func TestDoNested(t *testing.T) {
	p := New(3)
	var total atomic.Int64
	p.Do(5, large, func(_, i int) {
		p.Do(7, large, func(_, j int) { total.Add(int64(7*i + j)) })
	})
	assert.EqualValues(t, 34*35/2, total.Load())
}

func TestDoReraisesPanics(t *testing.T) {
	cause := errors.New("the cause")
	for _, threads := range []int{1, 2, 4} {
		for _, bad := range []int{0, 3, 99} {
			t.Run(fmt.Sprintf("threads=%d/bad=%d", threads, bad), func(t *testing.T) {
				defer goleak.VerifyNone(t)
				var ran atomic.Int32
				caught := func() (v any) {
					defer func() { v = recover() }()
					New(threads).Do(100, large, func(_, i int) {
						if i == bad {
							panic(cause)
						}
						ran.Add(1)
					})
					return nil
				}()
				require.NotNil(t, caught)
				err, ok := caught.(error)
				require.True(t, ok, "%T", caught)
				assert.ErrorIs(t, err, cause)
				assert.Less(t, ran.Load(), int32(100))
				if p, ok := caught.(*Panic); ok {
					assert.Contains(t, p.Error(), "the cause")
					assert.Contains(t, p.Error(), "pool_test.go", "where it happened")
				} else {
					assert.Equal(t, 1, threads)
				}
			})
		}
	}
}

func TestDoPanicStopsHandingOut(t *testing.T) {
	var ran atomic.Int32
	assert.Panics(t, func() {
		New(2).Do(1_000_000, large, func(_, i int) {
			if ran.Add(1) == 10 {
				panic("stop")
			}
			runtime.Gosched()
		})
	})
	assert.Less(t, ran.Load(), int32(1_000_000))
}

func TestPanicWithoutError(t *testing.T) {
	p := &Panic{Value: 42, Stack: []byte("stack")}
	assert.Equal(t, "panic in a worker: 42\n\nstack", p.Error())
	assert.NoError(t, p.Unwrap())
}

// TestDoRecycles: nested lists, failed ones and others use the same memory in turns.
func TestDoRecycles(t *testing.T) {
	for round := range 50 {
		var sum atomic.Int64
		assert.Panics(t, func() { New(3).Do(9, large, func(_, i int) { panic(i) }) })
		New(1+round%5).Do(20, large, func(_, i int) {
			New(2).Do(3, large, func(_, j int) { sum.Add(int64(i + j)) })
		})
		require.EqualValues(t, 3*190+20*3, sum.Load())
	}
}

// TestDoGoexit ends workers the way a failing test does; the list must not count as done.
func TestDoGoexit(t *testing.T) {
	defer goleak.VerifyNone(t)
	assert.Panics(t, func() {
		var both sync.WaitGroup
		both.Add(2)
		New(2).Do(2, large, func(worker, i int) {
			both.Done()
			both.Wait()
			if worker == 1 {
				runtime.Goexit()
			}
		})
	})
}

func TestByWork(t *testing.T) {
	for _, row := range []struct {
		name string
		work []float64
		want []int
	}{
		{"empty", nil, []int{}},
		{"one", []float64{3}, []int{0}},
		{"largest first", []float64{1, 3, 2}, []int{1, 2, 0}},
		{"equal ones keep their order", []float64{2, 1, 2, 1, 2}, []int{0, 2, 4, 1, 3}},
		{"sorted", []float64{5, 4, 3}, []int{0, 1, 2}},
	} {
		t.Run(row.name, func(t *testing.T) { assert.Equal(t, row.want, ByWork(row.work)) })
	}
}

// BenchmarkDo measures what spreading a list of empty pieces costs; Threshold follows from it.
func BenchmarkDo(b *testing.B) {
	for _, threads := range []int{1, 2} {
		for _, n := range []int{2, 1000} {
			b.Run(fmt.Sprintf("threads=%d/pieces=%d", threads, n), func(b *testing.B) {
				p := New(threads)
				var sink [64]int
				for b.Loop() {
					p.Do(n, large, func(worker, i int) { sink[worker*8] = i })
				}
			})
		}
	}
}

func TestUntil(t *testing.T) {
	assert.Nil(t, (*Pool)(nil).Stop())
	assert.Nil(t, New(3).Stop())
	stopped := false
	p := New(3).Until(func() bool { return stopped })
	assert.Equal(t, 3, p.Threads())
	assert.False(t, p.Stop()())
	stopped = true
	assert.True(t, p.Stop()())
	count := 0
	p.Do(5, 0, func(_, _ int) { count++ })
	assert.Equal(t, 5, count, "every piece runs all the same")
	assert.Equal(t, 1, (*Pool)(nil).Until(nil).Threads())
}
