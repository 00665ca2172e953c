package block

import (
	"cmp"
	"math"
	"slices"
)

// Cut says which singular values to keep. The zero value keeps all that are not zero.
type Cut struct {
	Bond    int     // most values kept, over all charges; 0: no cap
	Weight  float64 // largest discarded weight: sum of dropped squares over the sum of all; 0: drop only zeros
	Floor   float64 // drop values below Floor times the largest; 0: drop only zeros
	MinBond int     // keep this many, whatever Weight and Floor say, if there are so many that are not zero; Bond wins
}

// Select applies the cut to lists of decreasing values, one list a charge. It keeps the largest over all lists, ties in the
// order of the lists, at least one unless all are zero, and never a zero. It returns the count kept of each list, and the weight
// discarded: the sum of the dropped squares, added up directly, over the sum of all.
func (c Cut) Select(values [][]float64) (keep []int, discarded float64) {
	type candidate struct {
		value float64
		list  int
	}
	var all []candidate
	for i, list := range values {
		for _, v := range list {
			if v > 0 {
				all = append(all, candidate{v, i})
			}
		}
	}
	keep = make([]int, len(values))
	if len(all) == 0 {
		return keep, 0
	}
	slices.SortStableFunc(all, func(x, y candidate) int { return cmp.Compare(y.value, x.value) })
	// Sums run from the smallest value up, in units of the largest: no overflow, and no cancellation for a small tail.
	top, total := all[0].value, 0.0
	tail := make([]float64, len(all)+1) // tail[n]: squares dropped if n values are kept
	for i := len(all) - 1; i >= 0; i-- {
		v := all[i].value / top
		total += v * v
		tail[i] = total
	}
	n := len(all)
	for n > 1 && (all[n-1].value < c.Floor*top || tail[n-1] <= c.Weight*total) {
		n--
	}
	n = max(n, min(c.MinBond, len(all)))
	if c.Bond > 0 {
		n = min(n, c.Bond)
	}
	for _, x := range all[:n] {
		keep[x.list]++
	}
	return keep, tail[n] / total
}

// norm2 returns the root of the sum of squares of all values, without overflow.
func norm2(values [][]float64) float64 {
	top := 0.0
	for _, list := range values {
		for _, v := range list {
			top = max(top, v)
		}
	}
	if top == 0 {
		return 0
	}
	sum := 0.0
	for _, list := range values {
		for _, v := range list {
			sum += (v / top) * (v / top)
		}
	}
	return top * math.Sqrt(sum)
}
