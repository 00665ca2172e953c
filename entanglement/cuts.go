package entanglement

import (
	"cmp"
	"math"
	"slices"

	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// Table holds the entanglement of every cut of a state; all slices have one element a cut, in site order.
type Table struct {
	AfterSite []int     // the cut lies after this site, counting from 0
	RungEdge  []bool    // the cut lies between two rungs
	Entropy   []float64 // von Neumann, nats
	Renyi2    []float64 // -ln tr rho^2, nats
	Spectrum  [][]Level // by increasing xi
}

// Level is one Schmidt value lambda: xi = -ln(lambda^2), and the charges of the sites left of the cut. Levels of one charge share the map.
type Level struct {
	Xi     float64
	Charge map[string]float64
}

// Cuts returns entropies and spectra at every cut of a state, normalized. Schmidt values of zero are left out; a state of norm zero has
// none. A single site has no cut.
func Cuts(s *mps.State) Table {
	var t Table
	lad := s.Scope().Ladder()
	for b, spectrum := range s.Spectra() {
		levels, weights := levelsOf(spectrum, s.Frames())
		_, here, _ := lad.SiteAt(b)
		_, next, _ := lad.SiteAt(b + 1)
		t.AfterSite = append(t.AfterSite, b)
		t.RungEdge = append(t.RungEdge, here != next)
		t.Entropy = append(t.Entropy, VonNeumann(weights))
		t.Renyi2 = append(t.Renyi2, Renyi(weights, 2))
		t.Spectrum = append(t.Spectrum, levels)
	}
	return t
}

// levelsOf lists the levels of a cut and their weights lambda², which add up to one.
func levelsOf(s block.Spectrum, frames *ladder.Frames) (levels []Level, weights []float64) {
	for k, values := range s.Values {
		charge := frames.Values(s.Axis.Sectors[k].Charge)
		for _, lambda := range values {
			if p := lambda * lambda; p > 0 {
				weights = append(weights, p)
				levels = append(levels, Level{Xi: -math.Log(p), Charge: charge})
			}
		}
	}
	slices.SortStableFunc(levels, func(a, b Level) int { return cmp.Compare(a.Xi, b.Xi) })
	return levels, weights
}

// VonNeumann returns -sum p ln p in nats of the weights p, which should add up to one.
func VonNeumann(p []float64) float64 {
	terms := make([]float64, 0, len(p))
	for _, x := range p {
		if x > 0 {
			terms = append(terms, -x*math.Log(x))
		}
	}
	return max(0, ascendingSum(terms))
}

// Renyi returns ln(sum p^n)/(1-n) in nats of the weights p, which should add up to one. n = 1 is the von Neumann entropy, n = 0 the logarithm of the number
// of weights, n = +Inf minus that of the largest. A negative or undefined n gives NaN, no weights at all zero.
func Renyi(p []float64, n float64) float64 {
	switch {
	case !(n >= 0):
		return math.NaN()
	case len(p) == 0:
		return 0
	case n == 1:
		return VonNeumann(p)
	}
	// In units of the largest weight, so that no power vanishes that counts.
	top := slices.Max(p)
	if !(top > 0) {
		return 0
	}
	if math.IsInf(n, 1) {
		return max(0, -math.Log(top))
	}
	terms := make([]float64, 0, len(p))
	for _, x := range p {
		if x > 0 {
			terms = append(terms, math.Pow(x/top, n))
		}
	}
	return max(0, (n*math.Log(top)+math.Log(ascendingSum(terms)))/(1-n))
}

// ascendingSum adds up from the smallest term, so that long tails keep their digits.
func ascendingSum(x []float64) float64 {
	slices.Sort(x)
	var s float64
	for _, v := range x {
		s += v
	}
	return s
}
