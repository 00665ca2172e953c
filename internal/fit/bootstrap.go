package fit

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
)

// A Spread is the distribution of an estimate over resampled data.
type Spread struct {
	Mean, Error []float64 // per estimated number: mean and standard deviation
	Low, High   []float64 // the central 68.27 % of the resamples
	Failed      int       // resamples of which the estimate failed
}

// failedShare is the part of failed resamples from which on no spread is given.
const failedShare = 0.1

// Bootstrap repeats an estimate on data drawn with replacement from n points:
// estimate receives the drawn indices, sorted. The seed fixes the draws.
func Bootstrap(n, resamples int, seed uint64, estimate func(drawn []int) ([]float64, error)) (Spread, error) {
	if n < 2 {
		return Spread{}, fmt.Errorf("fit: bootstrap of %d points", n)
	}
	rng := rand.New(rand.NewPCG(seed, 0x626f6f74))
	return gather(resamples, func() ([]float64, error) {
		drawn := make([]int, n)
		for i := range drawn {
			drawn[i] = rng.IntN(n)
		}
		slices.Sort(drawn)
		return estimate(drawn)
	})
}

// Perturb repeats an estimate on values moved by normal deviates of their
// standard errors: the bootstrap for few points with known errors.
func Perturb(y, sigma []float64, resamples int, seed uint64, estimate func(y []float64) ([]float64, error)) (Spread, error) {
	if sigma == nil || len(y) == 0 {
		return Spread{}, fmt.Errorf("fit: perturbing %d values needs their errors", len(y))
	}
	if err := checkData(y, sigma); err != nil {
		return Spread{}, err
	}
	rng := rand.New(rand.NewPCG(seed, 0x70657274))
	return gather(resamples, func() ([]float64, error) {
		moved := make([]float64, len(y))
		for i, v := range y {
			moved[i] = v + sigma[i]*rng.NormFloat64()
		}
		return estimate(moved)
	})
}

func gather(resamples int, draw func() ([]float64, error)) (Spread, error) {
	if resamples < 2 {
		return Spread{}, fmt.Errorf("fit: %d resamples give no spread", resamples)
	}
	var s Spread
	var samples [][]float64 // per estimated number
	var last error
	for range resamples {
		p, err := draw()
		if err == nil && slices.ContainsFunc(p, func(v float64) bool { return !finite(v) }) {
			err = fmt.Errorf("fit: estimate %v", p)
		}
		if err != nil {
			s.Failed, last = s.Failed+1, err
			continue
		}
		if samples == nil {
			samples = make([][]float64, len(p))
		}
		if len(p) != len(samples) {
			return Spread{}, fmt.Errorf("fit: an estimate of %d numbers after one of %d", len(p), len(samples))
		}
		for k, v := range p {
			samples[k] = append(samples[k], v)
		}
	}
	if float64(s.Failed) > failedShare*float64(resamples) || resamples-s.Failed < 2 {
		return Spread{}, fmt.Errorf("fit: %d of %d resamples failed, the last with: %w", s.Failed, resamples, last)
	}
	for _, values := range samples {
		mean, deviation := moments(values)
		slices.Sort(values)
		s.Mean, s.Error = append(s.Mean, mean), append(s.Error, deviation)
		s.Low, s.High = append(s.Low, quantile(values, 0.15865)), append(s.High, quantile(values, 0.84135))
	}
	return s, nil
}

func moments(values []float64) (mean, deviation float64) {
	for _, v := range values {
		mean += v / float64(len(values))
	}
	for _, v := range values {
		deviation += (v - mean) * (v - mean) / float64(len(values)-1)
	}
	return mean, math.Sqrt(deviation)
}

// quantile interpolates linearly in sorted values.
func quantile(sorted []float64, q float64) float64 {
	at := q * float64(len(sorted)-1)
	i := min(int(at), len(sorted)-2)
	f := at - float64(i)
	return sorted[i]*(1-f) + sorted[i+1]*f
}
