package solve

import (
	"runtime"
	"time"

	"rundle/internal/dense"
	"rundle/internal/runfolder"
)

// meter measures what a run takes.
type meter struct {
	begin time.Time
	cpu   float64
}

func startMeter() meter {
	cpu, _ := processUse()
	return meter{time.Now(), cpu}
}

// resources reports what the run took since the meter was started; the peak of memory is that of the process.
func (m meter) resources(threads int, version string) runfolder.Resources {
	cpu, peak := processUse()
	if threads <= 0 {
		threads = runtime.GOMAXPROCS(0)
	}
	kernels, _ := dense.Kernels()
	return runfolder.Resources{
		WallSeconds: time.Since(m.begin).Seconds(), CPUSeconds: cpu - m.cpu, PeakMemoryBytes: peak,
		Threads: threads, Kernels: kernels, Version: version,
	}
}
