package main

import (
	"math"
	"runtime"
	"slices"

	"rundle/internal/dense"
)

// row is a figure of the table, as --json prints it.
type row struct {
	Routine   string  `json:"routine"`
	Op        string  `json:"op"`
	M         int     `json:"m"`
	N         int     `json:"n"`
	K         int     `json:"k"`
	Kernels   string  `json:"kernels"`
	Gflops    float64 `json:"gflops"`
	Reference float64 `json:"reference_gflops,omitempty"`
	Ratio     float64 `json:"ratio,omitempty"` // above 1: faster than the reference
	Bytes     uint64  `json:"bytes,omitempty"` // allocated by a call

	group group
}

// slice is the thread time that a contestant runs before the next has its turn.
const slice = 2e-3

// measure lets the named kernels and the reference take turns.
func (t task) measure(names []string, quick bool) []row {
	runtime.LockOSThread()
	defer runtime.UnlockOSThread()
	rounds := 15
	switch {
	case quick:
		rounds = 7
	case t.flops > 2e8:
		rounds = 7
	}
	ours, theirs := t.prepare()
	contestants := make([]contestant, 0, len(names)+1)
	for _, name := range names {
		contestants = append(contestants, contestant{kernels: name, run: ours})
	}
	if theirs != nil {
		contestants = append(contestants, contestant{run: theirs})
	}
	for i := range contestants {
		contestants[i].calibrate()
	}
	for range rounds {
		for i := range contestants {
			contestants[i].turn()
		}
	}
	out := make([]row, len(names))
	for i, name := range names {
		seconds := contestants[i].median()
		contestants[i].once(1)
		bytes := allocated(ours)
		out[i] = row{Routine: t.routine, Op: t.op, M: t.m, N: t.n, K: t.k, Kernels: name, Gflops: t.flops / seconds / 1e9, Bytes: bytes, group: t.group}
		if theirs != nil {
			reference := contestants[len(names)].median()
			out[i].Reference = t.flops / reference / 1e9
			out[i].Ratio = reference / seconds
		}
	}
	return out
}

// allocated returns the bytes that a call allocates: the least of a few, as others may allocate meanwhile.
func allocated(run func()) uint64 {
	least := uint64(math.MaxUint64)
	for range 3 {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		run()
		runtime.ReadMemStats(&after)
		least = min(least, after.TotalAlloc-before.TotalAlloc)
	}
	return least
}

type contestant struct {
	kernels string // empty: the reference
	run     func()
	calls   int // in a turn
	times   []float64
}

// once returns the thread time of so many calls.
func (c *contestant) once(calls int) float64 {
	if c.kernels != "" {
		if err := dense.UseKernels(c.kernels); err != nil {
			panic(err)
		}
	}
	start := threadSeconds()
	for range calls {
		c.run()
	}
	return threadSeconds() - start
}

// calibrate warms up and finds how many calls make a slice.
func (c *contestant) calibrate() {
	c.run()
	for c.calls = 1; ; c.calls *= 2 {
		if t := c.once(c.calls); t > slice/2 || c.calls > 1<<20 {
			c.calls = max(1, int(float64(c.calls)*slice/max(t, 1e-9)))
			return
		}
	}
}

func (c *contestant) turn() {
	c.times = append(c.times, c.once(c.calls)/float64(c.calls))
}

func (c *contestant) median() float64 {
	t := slices.Sorted(slices.Values(c.times))
	return t[len(t)/2]
}
