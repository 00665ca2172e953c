package solve

import (
	"math"
	"math/cmplx"
)

// Bounds on the ratio of the square roots of two discarded weights, and the rounding that every error bar holds.
const (
	leastRatio = 0.5
	mostRatio  = 0.95
	rounding   = 1e-13
)

// spreadBars returns the errors of values from those at the settled bond dimension before; w and before are the discarded weights.
// See the package's comment.
func spreadBars(now, earlier []complex128, w, before float64) []float64 {
	ratio := mostRatio
	if before > 0 {
		ratio = math.Sqrt(w / before)
	} else if w == 0 {
		ratio = leastRatio
	}
	ratio = min(mostRatio, max(leastRatio, ratio))
	var squares float64
	for i := range now {
		d := cmplx.Abs(now[i] - earlier[i])
		squares += d * d
	}
	floor := math.Sqrt(squares / float64(max(1, len(now))))
	bars := make([]float64, len(now))
	for i := range now {
		d := max(floor, cmplx.Abs(now[i]-earlier[i]))
		bars[i] = d*ratio/(1-ratio) + rounding*max(1, cmplx.Abs(now[i]))
	}
	return bars
}

// weightBars returns the errors of values where one bond dimension is all there is: w is the discarded weight, energy the error of the
// energy in units of the largest coupling.
func weightBars(now []complex128, w, energy float64) []float64 {
	size := 1.0
	for _, v := range now {
		size = max(size, cmplx.Abs(v))
	}
	bars := make([]float64, len(now))
	for i := range bars {
		bars[i] = 2*size*(math.Sqrt(w)+math.Sqrt(min(1, energy))) + rounding*size
	}
	return bars
}
