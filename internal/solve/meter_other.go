//go:build !unix

package solve

import "runtime"

// processUse returns no processor time, and what the runtime has taken from the system as the peak of memory.
func processUse() (cpu float64, peak int64) {
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	return 0, int64(m.Sys)
}
