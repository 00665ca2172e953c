package dmrg

import (
	"context"
	"fmt"

	"rundle/mps/block"
)

// pickTotal returns the target where every charge is named; else the total of lowest energy among the values of the free charges.
// Up to a dozen totals are all looked at. Of more, the walk starts at the total whose product state has the lowest diagonal
// energy and steps to the best neighbour (one free charge up or down to its next possible value, or two at once) until none
// is lower: for energies convex in the charges, which thermodynamic stability asks of a bulk, that is the global minimum.
func (p *problem) pickTotal(ctx context.Context, energy func(block.Charge) (float64, error)) (block.Charge, error) {
	totals, _ := p.frames.Totals(p.target, scoutLimit)
	switch len(totals) {
	case 0:
		return block.Charge{}, fmt.Errorf("dmrg: no state of the ladder lies in the sector")
	case 1:
		return totals[0], nil
	}
	known := make(map[block.Charge]float64)
	look := func(q block.Charge) (float64, error) {
		if e, ok := known[q]; ok {
			return e, nil
		}
		e, err := energy(q)
		if err == nil {
			known[q] = e
		}
		return e, err
	}
	if len(totals) <= 12 {
		return lowestOf(totals, look, p.scale)
	}
	at, err := p.walkStart(totals)
	if err != nil {
		return at, err
	}
	for {
		near := neighbours(p.strings.Group, totals, at)
		next, err := lowestOf(append([]block.Charge{at}, near...), look, p.scale)
		if err != nil || next == at {
			return next, err
		}
		at = next
	}
}

// lowestOf returns the first total whose energy is lowest up to a rounding of the scouts.
func lowestOf(totals []block.Charge, look func(block.Charge) (float64, error), scale float64) (block.Charge, error) {
	var best block.Charge
	var low float64
	for i, q := range totals {
		e, err := look(q)
		if err != nil {
			return best, err
		}
		if i == 0 || e < low-1e-9*scale {
			best, low = q, e
		}
	}
	return best, nil
}

// walkStart is the total with the lowest diagonal energy of a product state; of equals, the middle one.
func (p *problem) walkStart(totals []block.Charge) (block.Charge, error) {
	stride := 1 + len(totals)/64
	type seen struct {
		q block.Charge
		e float64
	}
	var all []seen
	for i := 0; i < len(totals); i += stride {
		_, e, err := startStates(p.strings, totals[i])
		if err != nil {
			return totals[i], err
		}
		all = append(all, seen{totals[i], e})
	}
	low := all[0].e
	for _, s := range all {
		low = min(low, s.e)
	}
	var equal []block.Charge
	for _, s := range all {
		if s.e <= low+1e-9*p.scale {
			equal = append(equal, s.q)
		}
	}
	return equal[len(equal)/2], nil
}

// neighbours lists the totals that differ from at by the smallest steps: for every total, the others that are nearest in
// their direction.
func neighbours(g block.Group, totals []block.Charge, at block.Charge) []block.Charge {
	type direction [4]int32
	best := make(map[direction]block.Charge)
	var order []direction
	dist := func(q block.Charge) (d int64) {
		for k := 0; k < g.Len(); k++ {
			x := int64(q[k] - at[k])
			d += x * x
		}
		return d
	}
	for _, q := range totals {
		if q == at {
			continue
		}
		var dir direction
		for k := 0; k < g.Len(); k++ {
			switch {
			case q[k] > at[k]:
				dir[k] = 1
			case q[k] < at[k]:
				dir[k] = -1
			}
		}
		if b, ok := best[dir]; !ok {
			best[dir] = q
			order = append(order, dir)
		} else if dist(q) < dist(b) {
			best[dir] = q
		}
	}
	var out []block.Charge
	for _, d := range order {
		out = append(out, best[d])
	}
	return out
}
