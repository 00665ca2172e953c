package task

import (
	"fmt"
	"runtime"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"go.uber.org/goleak"
)

// held runs f while the pool is held, and looks for what is left over.
func held(t *testing.T, p *Pool, f func()) {
	t.Helper()
	defer goleak.VerifyNone(t)
	p.Hold()
	defer p.Release()
	f()
}

func countedOnce(t *testing.T, p *Pool, n int) {
	t.Helper()
	counts := make([]atomic.Int32, n)
	p.Do(n, large, func(_, i int) { counts[i].Add(1) })
	for i := range counts {
		require.EqualValues(t, 1, counts[i].Load(), "piece %d", i)
	}
}

func TestHold(t *testing.T) {
	for _, threads := range []int{1, 2, 5} {
		p := New(threads)
		held(t, p, func() {
			for k := range 200 {
				countedOnce(t, p, 1+k%7)
				if k%50 == 0 {
					time.Sleep(2 * lookOut) // the workers fall asleep
				}
			}
		})
		countedOnce(t, p, 9) // and without
		held(t, p, func() { countedOnce(t, p.Until(nil), 9) })
	}
	held(t, nil, func() {})
	held(t, new(Pool), func() { countedOnce(t, new(Pool), 3) })
}

func TestHoldNested(t *testing.T) {
	p := New(3)
	held(t, p, func() {
		held := runtime.NumGoroutine()
		countedOnce(t, p, 5)
		assert.Greater(t, runtime.NumGoroutine(), held, "workers stay")
		p.Hold()
		countedOnce(t, p, 5)
		p.Release()
		assert.Greater(t, runtime.NumGoroutine(), held, "until the last release")
	})
}

// Lists that come at once, and from within a piece, all get done.
func TestHoldShared(t *testing.T) {
	p := New(3)
	held(t, p, func() {
		var wait sync.WaitGroup
		for range 8 {
			wait.Go(func() {
				p.Hold()
				defer p.Release()
				for range 50 {
					countedOnce(t, p, 6)
				}
			})
		}
		wait.Wait()
		p.Do(4, large, func(_, _ int) { countedOnce(t, p, 4) })
	})
}

func TestHoldPanics(t *testing.T) {
	p := New(2)
	for name, end := range map[string]func(){"panic": func() { panic("piece") }, "goexit": runtime.Goexit} {
		held(t, p, func() {
			for range 20 {
				var once atomic.Int32
				assert.Panics(t, func() {
					p.Do(2, large, func(worker, _ int) {
						for once.Load() == 0 && worker == 0 {
							runtime.Gosched() // the worker is to meet it
						}
						if once.Add(1) == 1 {
							end()
						}
					})
				}, name)
				countedOnce(t, p, 5)
			}
		})
	}
}

// BenchmarkHold runs lists of two pieces of equal length with serial work between: what waking a worker costs shows in the ratio to half
// the serial time.
func BenchmarkHold(b *testing.B) {
	spin := func(d time.Duration) {
		for begin := time.Now(); time.Since(begin) < d; {
		}
	}
	for _, piece := range []time.Duration{50 * time.Microsecond, 200 * time.Microsecond} {
		for _, hold := range []bool{false, true} {
			b.Run(fmt.Sprintf("piece=%v/held=%v", piece, hold), func(b *testing.B) {
				p := New(2)
				if hold {
					p.Hold()
					defer p.Release()
				}
				for b.Loop() {
					p.Do(2, large, func(_, _ int) { spin(piece) })
					spin(20 * time.Microsecond)
				}
				elapsed := float64(b.Elapsed()) / float64(b.N)
				b.ReportMetric((2*float64(piece)+20e3)/elapsed, "speedup")
			})
		}
	}
}
