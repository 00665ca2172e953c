package task

import (
	"fmt"
	"runtime"
	"runtime/debug"
	"sync"
	"sync/atomic"
	"time"
)

// Threshold is the work, in floating-point operations, below which a list runs serially. Spreading costs 0.5 microseconds for two
// pieces and 8 for a thousand (BenchmarkDo, AMD EPYC, 2 cores), once a core is awake and its caches warm; 15 Mflop are 0.3 milliseconds at
// the best rate of one core, enough to pay for both.
const Threshold = 15e6

// HeldThreshold is the same between Hold and Release, where a worker is awake: 2 Mflop are 20 to 40 microseconds, and spreading costs one
// or two (BenchmarkHold).
const HeldThreshold = 2e6

// Pool is a number of threads. It holds no goroutines, except between Hold and Release, and may be shared and used from several places at
// once.
type Pool struct {
	threads int
	stop    func() bool
	crew    *crew // nil: nothing is ever held
}

// New returns a pool of the given number of threads; zero or less means GOMAXPROCS.
func New(threads int) *Pool {
	if threads <= 0 {
		threads = runtime.GOMAXPROCS(0)
	}
	p := &Pool{threads: threads}
	if threads > 1 {
		p.crew = new(crew)
	}
	return p
}

// Until returns a pool of as many threads that carries stop to long pieces: those that know how ask it now and then, from any of the
// threads, and give up once it says true. Do itself runs every piece.
func (p *Pool) Until(stop func() bool) *Pool {
	q := &Pool{threads: p.Threads(), stop: stop}
	if p != nil {
		q.crew = p.crew
	}
	return q
}

// Stop returns what Until was given, else nil.
func (p *Pool) Stop() func() bool {
	if p == nil {
		return nil
	}
	return p.stop
}

// Threads returns the number of threads: worker numbers given by Do are below it. A nil pool has one.
func (p *Pool) Threads() int {
	if p == nil {
		return 1
	}
	return max(1, p.threads)
}

// Do calls run(worker, i) once for each i in 0..n-1 and returns when all are done. The pieces are handed out in order. Calls with the
// same worker number never overlap. flops is the work of the whole list; below Threshold (or HeldThreshold), or with one thread, the
// caller does all of it, in order, as worker 0.
func (p *Pool) Do(n int, flops float64, run func(worker, i int)) {
	threads := min(p.Threads(), n)
	if threads <= 1 || flops < p.threshold() {
		for i := range n {
			run(0, i)
		}
		return
	}
	l := lists.Get().(*list)
	l.begin(threads, n, run)
	defer l.wait.Wait() // also when the caller's own piece ends the goroutine
	starts := l.starts[:threads-1]
	held := p.held() && p.crew.busy.TryLock()
	if held {
		defer p.crew.busy.Unlock()
		p.crew.spread(starts)
	} else {
		for _, start := range starts {
			go start()
		}
	}
	l.work(0)
	l.watch()
	l.wait.Wait()
	f := l.failed.Load()
	l.end()
	if f != nil {
		if held { // a piece may have ended a worker
			p.crew.dismiss()
		}
		panic(f)
	}
}

// threshold is the work that pays for spreading.
func (p *Pool) threshold() float64 {
	if p.held() {
		return HeldThreshold
	}
	return Threshold
}

// list is the state of one Do. Lists are recycled, with the functions that start workers, so that spreading allocates nothing.
type list struct {
	next   atomic.Int64
	n      int64
	run    func(worker, i int)
	failed atomic.Pointer[Panic]
	left   atomic.Int32 // workers that are not done yet; those of wait a moment later
	wait   sync.WaitGroup
	starts []func() // of workers 1, 2, ...
}

var lists = sync.Pool{New: func() any { return new(list) }}

// begin makes the list ready for its workers.
func (l *list) begin(threads, n int, run func(worker, i int)) {
	for worker := len(l.starts) + 1; worker < threads; worker++ {
		l.starts = append(l.starts, func() {
			defer func() {
				l.left.Add(-1)
				l.wait.Done()
			}()
			l.work(worker)
		})
	}
	l.n, l.run = int64(n), run
	l.next.Store(0)
	l.failed.Store(nil)
	l.left.Store(int32(threads - 1))
	l.wait.Add(threads - 1)
}

// watch waits for the workers awake, but not for long: to be woken takes as long as to wake.
func (l *list) watch() {
	for begin := time.Now(); time.Since(begin) < lookOut; {
		for range 50 {
			if l.left.Load() == 0 {
				return
			}
		}
	}
}

// end gives the list back; no worker may be left.
func (l *list) end() {
	l.run = nil
	l.failed.Store(nil)
	lists.Put(l)
}

func (l *list) work(worker int) {
	done := false
	defer func() {
		if done {
			return
		}
		// run panicked, or ended the goroutine by runtime.Goexit (a test's FailNow): no piece is to be lost in silence.
		l.failed.CompareAndSwap(nil, &Panic{Value: recover(), Stack: debug.Stack()})
		l.next.Store(l.n)
	}()
	for {
		i := l.next.Add(1) - 1
		if i >= l.n {
			break
		}
		l.run(worker, int(i))
	}
	done = true
}

// Panic is what Do panics with when a piece of a spread list did: the first value caught, and where. It is an error, so that whoever
// recovers it can print it; Unwrap gives the value if that is an error too.
type Panic struct {
	Value any
	Stack []byte
}

func (p *Panic) Error() string {
	if p.Value == nil {
		return fmt.Sprintf("worker ended early\n\n%s", p.Stack)
	}
	return fmt.Sprintf("panic in a worker: %v\n\n%s", p.Value, p.Stack)
}

// Unwrap returns the value of the panic if it is an error.
func (p *Panic) Unwrap() error {
	err, _ := p.Value.(error)
	return err
}
