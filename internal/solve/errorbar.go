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

// quality is what a search knows of the state it found; energies are in units of the largest coupling.
type quality struct {
	weight   float64 // discarded weight
	residual float64 // norm that the eigensolver left
	energy   float64 // error of the energy
}

// spreadBars returns the errors of an observation from its values at the settled bond dimension before, whose discarded weight was
// weight. See the package's comment.
func spreadBars(now series, earlier []complex128, q quality, weight float64) []float64 {
	ratio := mostRatio
	if weight > 0 {
		ratio = math.Sqrt(q.weight / weight)
	} else if q.weight == 0 {
		ratio = leastRatio
	}
	ratio = min(mostRatio, max(leastRatio, ratio))
	var squares float64
	for i := range earlier {
		d := cmplx.Abs(now.values[i] - earlier[i])
		squares += d * d
	}
	typical := math.Sqrt(squares / float64(max(1, len(earlier))))
	bars := make([]float64, len(earlier))
	for i := range bars {
		d := max(typical, cmplx.Abs(now.values[i]-earlier[i]))
		bars[i] = d*ratio/(1-ratio) + now.norms[i]*(2*q.residual+rounding)
	}
	return bars
}

// loneBars returns the errors of an observation where one bond dimension is all there is.
func loneBars(now series, q quality) []float64 {
	bars := make([]float64, len(now.values))
	for i := range bars {
		bars[i] = now.norms[i] * (2*(math.Sqrt(q.weight)+math.Sqrt(min(1, q.energy))+q.residual) + rounding)
	}
	return bars
}
