package fit

import (
	"fmt"
	"math"
	"slices"
)

// Polynomial fits y = p_0 + p_1 x + .. + p_degree x^degree.
func Polynomial(x, y, sigma []float64, degree int) (Report, error) {
	if len(x) != len(y) {
		return Report{}, fmt.Errorf("fit: %d places for %d values", len(x), len(y))
	}
	if degree < 0 {
		return Report{}, fmt.Errorf("fit: degree %d is negative", degree)
	}
	if len(y) < degree+1 {
		return Report{}, tooFew(len(y), degree+1)
	}
	design := make([][]float64, len(x))
	for i, v := range x {
		design[i] = make([]float64, degree+1)
		power := 1.0
		for k := range design[i] {
			design[i][k] = power
			power *= v
		}
	}
	return Linear(design, y, sigma)
}

// An Extrapolation is the limit of y at x -> 0.
type Extrapolation struct {
	Value float64
	Error float64 // covers the choice of points and degree; not a standard error
	Slope float64 // of the straight line used
}

// distanceShare is the least part of the way from the nearest point to the
// limit that counts as its error: a fifth is common practice in the trade
// for energies against discarded weight.
const distanceShare = 0.2

// ToZero extrapolates y to x = 0, x positive, from at least two points: a
// straight line in which every point weighs with 1/x, because the law is the
// better the nearer the limit. The error is the largest of a fifth of the way
// extrapolated, the scatter about the line, and the differences to the line
// through the two nearest points and to the parabola and the power law through
// the three nearest.
func ToZero(x, y []float64) (Extrapolation, error) {
	if len(x) != len(y) {
		return Extrapolation{}, fmt.Errorf("fit: %d places for %d values", len(x), len(y))
	}
	for i, v := range x {
		if !finite(v) || v <= 0 {
			return Extrapolation{}, fmt.Errorf("fit: place %d is %v: extrapolation to zero needs positive places", i, v)
		}
	}
	order := make([]int, len(x))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int {
		if x[i] < x[j] {
			return -1
		}
		if x[i] > x[j] {
			return 1
		}
		return 0
	})
	near, values := make([]float64, len(x)), make([]float64, len(x))
	for k, i := range order {
		near[k], values[k] = x[i], y[i]
	}
	line, err := Polynomial(near, values, near, 1)
	if err != nil {
		return Extrapolation{}, err
	}
	out := Extrapolation{Value: line.Params[0], Slope: line.Params[1]}
	out.Error = distanceShare * math.Abs(values[0]-out.Value)
	if line.Freedom > 0 {
		out.Error = max(out.Error, line.Error(0)*line.Scatter())
	}
	for degree := 1; degree <= 2; degree++ {
		other, err := Polynomial(near[:min(degree+1, len(near))], values[:min(degree+1, len(near))], nil, degree)
		if err != nil { // fewer or coinciding points: no such witness
			continue
		}
		out.Error = max(out.Error, math.Abs(other.Params[0]-out.Value))
	}
	if limit, ok := powerLimit(near, values); ok {
		out.Error = max(out.Error, math.Abs(limit-out.Value))
	}
	return out, nil
}

// powerLimit returns a of y = a + b x^p through the three points nearest to
// zero, if they follow such a law with p from 0.3 to 3.
func powerLimit(x, y []float64) (limit float64, ok bool) {
	if len(x) < 3 {
		return 0, false
	}
	// The ratio of the differences rises with p from ln(x2/x1)/ln(x1/x0).
	ratio := (y[2] - y[1]) / (y[1] - y[0])
	law := func(p float64) float64 {
		r := math.Pow(x[1]/x[0], p)
		return r * (math.Pow(x[2]/x[1], p) - 1) / (r - 1)
	}
	low, high := 0.3, 3.0
	if !(ratio >= law(low) && ratio <= law(high)) {
		return 0, false
	}
	for range 60 {
		p := (low + high) / 2
		if law(p) < ratio {
			low = p
		} else {
			high = p
		}
	}
	limit = y[0] - (y[1]-y[0])/(math.Pow(x[1]/x[0], low)-1)
	return limit, finite(limit)
}
