package main

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"runtime"
	"runtime/pprof"
	"time"

	"rundle/dmrg"
)

// job is one measurement of Rundle, in a process of its own.
type job struct {
	Model     string
	Rungs     int // 0: the model's
	Threads   int
	Schedule  []dmrg.Pass // nil: the search's own
	Precision float64
	Until     *float64 // end as soon as a sweep ends with no higher energy
	Profile   bool     // the sweeps that count
}

// record is one sweep.
type record struct {
	Bond, Largest int
	Perturbation  float64
	Energy        float64
	Products      int
	Flops         float64
	CPU, Wall     float64 // seconds
}

// report is what a job found.
type report struct {
	Energy     float64
	Verdict    string
	Arithmetic string
	Sweeps     []record
	Reached    bool    // Until
	CPU, Wall  float64 // seconds from the start of the process to the end of the last sweep
	Peak       float64 // of resident memory, MiB; 0 where the system does not tell
	Shares     shares
	Rate       float64 // of the products in the sweeps that count, Gflop/s
	LargeRate  float64 // of one large product
}

// seconds is the least time of the sweeps that count.
func (r report) seconds(of func(record) float64) float64 {
	s := r.Sweeps[len(r.Sweeps)-counted:]
	return min(of(s[0]), of(s[1]))
}

func cpuOf(r record) float64  { return r.CPU }
func wallOf(r record) float64 { return r.Wall }

var began = time.Now()

// serve does the job that the argument describes and prints the report.
func serve(ctx context.Context, text string, w io.Writer) error {
	var j job
	if err := json.Unmarshal([]byte(text), &j); err != nil {
		return fmt.Errorf("--job: %w", err)
	}
	r, err := j.do(ctx)
	if err != nil {
		return err
	}
	return json.NewEncoder(w).Encode(r)
}

// do runs the search.
func (j job) do(ctx context.Context) (*report, error) {
	m, err := find(j.Model)
	if err != nil {
		return nil, err
	}
	if j.Rungs > 0 {
		m.rungs = j.Rungs
	}
	h, sector, err := m.build()
	if err != nil {
		return nil, err
	}
	ctx, enough := context.WithCancel(ctx)
	defer enough()
	watch := &watch{job: j, enough: enough, report: &report{}, cpu: processSeconds(), wall: time.Now()}
	found, err := dmrg.Ground(ctx, h, sector, dmrg.Options{Threads: j.Threads, Schedule: j.Schedule, Precision: j.Precision, OnSweep: watch.sweep})
	if err != nil && !(watch.report.Reached && errors.Is(err, context.Canceled)) {
		return nil, err
	}
	if watch.err != nil {
		return nil, watch.err
	}
	r := watch.report
	r.Verdict, r.Arithmetic = string(found.Verdict), "complex"
	r.Energy = r.Sweeps[len(r.Sweeps)-1].Energy
	if found.State.Frames().Real {
		r.Arithmetic = "real"
	}
	if r.Peak, err = peakMemory(); err != nil {
		return nil, err
	}
	if j.Profile {
		return r, watch.digest()
	}
	return r, nil
}

// watch keeps the books while a search runs.
type watch struct {
	job     job
	enough  func()
	report  *report
	cpu     float64
	wall    time.Time
	profile bytes.Buffer
	err     error
}

// sweep notes a sweep, and begins and ends the profile between sweeps.
func (w *watch) sweep(s dmrg.Sweep) {
	r := w.report
	r.CPU, r.Wall = processSeconds(), time.Since(began).Seconds()
	r.Sweeps = append(r.Sweeps, record{Bond: s.Bond, Largest: s.LargestBond, Perturbation: s.Perturbation, Energy: s.Energy, Products: s.Products,
		Flops: s.Flops, CPU: r.CPU - w.cpu, Wall: time.Since(w.wall).Seconds()})
	if w.job.Until != nil && s.Energy <= *w.job.Until {
		r.Reached = true
		w.enough()
	}
	if w.job.Profile {
		switch n := len(r.Sweeps); n {
		case len(w.job.Schedule) - counted:
			runtime.GC()
			w.err = pprof.StartCPUProfile(&w.profile)
		case len(w.job.Schedule):
			pprof.StopCPUProfile()
		}
	}
	w.cpu, w.wall = processSeconds(), time.Now()
}

// digest reads the profile and measures a large product beside it.
func (w *watch) digest() error {
	r := w.report
	var err error
	if r.Shares, err = readProfile(&w.profile); err != nil {
		return err
	}
	flops := 0.0
	for _, s := range r.Sweeps[len(r.Sweeps)-counted:] {
		flops += s.Flops
	}
	if products := r.Shares.Seconds[productsPart]; products > 0 {
		r.Rate = flops / products / 1e9
	}
	r.LargeRate = largeProduct(r.Arithmetic == "complex")
	return nil
}
