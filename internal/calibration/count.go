package calibration

import (
	"math"
	"slices"
)

// Score is what the bars of some searches are worth.
type Score struct {
	Covered float64 // part of the bars that hold
	Ratio   float64 // median of quoted over true; NaN where every error is rounding
	Bars    int
}

// negligible is the part of a size below which an error is rounding: it counts as covered and leaves the median.
const negligible = 1e-12

// score judges bars of quantities of the given size.
func score(bars []Bar, size float64) Score {
	var ratios []float64
	covered := 0
	for _, b := range bars {
		if b.True <= negligible*size {
			covered++
			continue
		}
		if b.True <= b.Quoted {
			covered++
		}
		ratios = append(ratios, b.Quoted/b.True)
	}
	return Score{Covered: float64(covered) / float64(max(1, len(bars))), Ratio: median(ratios), Bars: len(bars)}
}

// median of numbers that are not NaN; NaN if there is none.
func median(x []float64) float64 {
	x = slices.DeleteFunc(slices.Clone(x), math.IsNaN)
	if len(x) == 0 {
		return math.NaN()
	}
	slices.Sort(x)
	n := len(x)
	return (x[(n-1)/2] + x[n/2]) / 2
}

// Scores are those of the kinds of bars.
type Scores struct{ Energy, Local, Far, Entropy Score }

// Scores judges the searches of a model. Values, correlations and entropies are judged against one.
func (r *Record) Scores() Scores {
	var energy, local, far, entropy []Bar
	for _, c := range r.Cases {
		energy = append(energy, c.Energy)
		local = append(local, c.Local...)
		far = append(far, c.Far...)
		entropy = append(entropy, c.Entropy...)
	}
	return Scores{score(energy, r.Size), score(local, 1), score(far, 1), score(entropy, 1)}
}

// Total averages the coverage over the models that have bars of a kind, and takes the median of their ratios.
func Total(records []Record, keep func(*Record) bool) (models int, total Scores) {
	var all []Scores
	for i := range records {
		if keep(&records[i]) {
			all = append(all, records[i].Scores())
		}
	}
	gather := func(pick func(*Scores) *Score) {
		var covered float64
		var ratios []float64
		out, n := pick(&total), 0
		for i := range all {
			if s := pick(&all[i]); s.Bars > 0 {
				covered += s.Covered
				ratios = append(ratios, s.Ratio)
				out.Bars += s.Bars
				n++
			}
		}
		out.Covered, out.Ratio = covered/float64(max(1, n)), median(ratios)
	}
	gather(func(s *Scores) *Score { return &s.Energy })
	gather(func(s *Scores) *Score { return &s.Local })
	gather(func(s *Scores) *Score { return &s.Far })
	gather(func(s *Scores) *Score { return &s.Entropy })
	return len(all), total
}

// Holds tells whether the bar of an energy covers its error.
func (r *Record) Holds(b Bar) bool { return b.True <= max(b.Quoted, negligible*r.Size) }
