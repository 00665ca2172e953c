package task

import (
	"sync"
	"sync/atomic"
	"time"
)

// Waking a thread that sleeps takes 30 to 50 microseconds on virtual machines, a fifth of a list just above Threshold. So for lists that
// follow each other closely a caller may hold the workers: they look out for the next list for a while before they sleep, as the caller does
// for their end. Two pieces of 200 microseconds with 20 between take 225 held and 270 otherwise, where nothing lost would be 220
// (BenchmarkHold).

// lookOut is how long a held worker waits awake. The steps between the lists of a bond update take less.
const lookOut = 60 * time.Microsecond

// Hold keeps workers from one list to the next until Release; they are started by the first list that needs them. Holds may be nested and
// overlap. With one thread it does nothing.
func (p *Pool) Hold() {
	if p != nil && p.crew != nil {
		p.crew.holds.Add(1)
	}
}

// Release ends a Hold. The last one waits for the workers to end.
func (p *Pool) Release() {
	if p == nil || p.crew == nil || p.crew.holds.Add(-1) > 0 {
		return
	}
	c := p.crew
	c.busy.Lock() // a list of another caller may still run
	defer c.busy.Unlock()
	if c.holds.Load() == 0 {
		c.dismiss()
	}
}

// held reports whether workers are kept.
func (p *Pool) held() bool { return p.crew != nil && p.crew.holds.Load() > 0 }

// crew is the held workers of a pool; worker 0 is always the caller.
type crew struct {
	holds atomic.Int32
	busy  sync.Mutex // held by the Do that uses the crew
	hands []*hand
	ended sync.WaitGroup
}

// hand is a held worker.
type hand struct {
	next   atomic.Pointer[func()] // what to run; nil: nothing yet
	asleep atomic.Bool
	wake   chan struct{}
}

var quit = func() {}

// spread hands the starts of a list to the crew.
func (c *crew) spread(starts []func()) {
	for i := range starts {
		if i == len(c.hands) {
			h := &hand{wake: make(chan struct{}, 1)}
			c.hands = append(c.hands, h)
			c.ended.Add(1)
			go c.serve(h)
		}
		c.hands[i].call(&starts[i])
	}
}

// dismiss ends the workers, also where a piece has ended one before.
func (c *crew) dismiss() {
	for _, h := range c.hands {
		h.call(&quit)
	}
	c.ended.Wait()
	clear(c.hands)
	c.hands = c.hands[:0]
}

// call passes on what to run and wakes the worker if it sleeps.
func (h *hand) call(f *func()) {
	h.next.Store(f)
	if h.asleep.CompareAndSwap(true, false) {
		h.wake <- struct{}{}
	}
}

// serve runs what comes until quit.
func (c *crew) serve(h *hand) {
	defer c.ended.Done()
	for {
		f := h.await()
		if f == &quit {
			return
		}
		(*f)()
	}
}

// await returns the next thing to run: awake for a while, then asleep.
func (h *hand) await() *func() {
	for {
		begin := time.Now()
		for time.Since(begin) < lookOut {
			for range 50 {
				if f := h.next.Load(); f != nil {
					h.next.Store(nil)
					return f
				}
			}
		}
		h.asleep.Store(true)
		// What came before that may have found the worker awake.
		if h.next.Load() != nil && h.asleep.CompareAndSwap(true, false) {
			continue
		}
		<-h.wake
	}
}
