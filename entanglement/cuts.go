package entanglement

import (
	"cmp"
	"math"
	"slices"

	"rundle/mps"
)

// Table holds the entanglement of every cut of a state; all slices have one element a cut, in site order.
type Table struct {
	AfterSite []int     // the cut lies after this site, counting from 0
	RungEdge  []bool    // the cut lies between two rungs
	Entropy   []float64 // von Neumann, nats
	Renyi2    []float64 // -ln tr rho^2, nats
	Spectrum  [][]Level // by increasing xi
}

// Level is one Schmidt value lambda: xi = -ln(lambda^2), and the charges of the sites left of the cut.
type Level struct {
	Xi     float64
	Charge map[string]float64
}

// Cuts returns entropies and spectra at every cut of a state, normalized. Schmidt values of zero are left out.
func Cuts(s *mps.State) Table {
	var t Table
	ladder, frames := s.Scope().Ladder(), s.Frames()
	for b := 0; b < s.Sites()-1; b++ {
		spec := s.Schmidt(b)
		var total float64
		for _, values := range spec.Values {
			for _, v := range values {
				total += v * v
			}
		}
		var levels []Level
		var weights []float64
		for k, values := range spec.Values {
			charge := frames.Values(spec.Axis.Sectors[k].Charge)
			for _, v := range values {
				if p := v * v / total; p > 0 {
					weights = append(weights, p)
					levels = append(levels, Level{Xi: -math.Log(p), Charge: charge})
				}
			}
		}
		slices.SortStableFunc(levels, func(a, b Level) int { return cmp.Compare(a.Xi, b.Xi) })
		_, here, _ := ladder.SiteAt(b)
		_, next, _ := ladder.SiteAt(b + 1)
		t.AfterSite = append(t.AfterSite, b)
		t.RungEdge = append(t.RungEdge, here != next)
		t.Entropy = append(t.Entropy, VonNeumann(weights))
		t.Renyi2 = append(t.Renyi2, Renyi(weights, 2))
		t.Spectrum = append(t.Spectrum, levels)
	}
	return t
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

// Renyi returns ln(sum p^n)/(1-n) in nats for n > 0; n = 1 is the von Neumann entropy.
func Renyi(p []float64, n float64) float64 {
	if n == 1 {
		return VonNeumann(p)
	}
	terms := make([]float64, 0, len(p))
	for _, x := range p {
		if x > 0 {
			terms = append(terms, math.Pow(x, n))
		}
	}
	return max(0, math.Log(ascendingSum(terms))/(1-n))
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
