package dmrg

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"rundle/mpo/ladder"
	"rundle/mps/block"
)

// Limits of the search for a start state: configurations kept a site, and of these for one partial charge.
const (
	beamWidth     = 400
	beamPerCharge = 6
	suffixLimit   = 2_000_000 // partial charges remembered for the exact look-ahead
)

// diagonalTerm is one term of the Hamiltonian restricted to its diagonal.
type diagonalTerm struct {
	coef  float64
	sites []int32
	diag  [][]float64 // per site, per local state
}

// configuration is a product state of the first sites.
type configuration struct {
	cost   float64 // diagonal energy of the terms that are complete, and the tie-break
	energy float64
	charge block.Charge
	states []int32
}

// startStates returns the local states of a product state of total charge target with a low diagonal energy: a beam search
// from left to right that completes only configurations which can still reach the target. Between equals, the charge that is
// spread most evenly wins.
func startStates(s *ladder.Strings, target block.Charge) ([]int, float64, error) {
	n := len(s.Axes)
	closing, scale := diagonalTerms(s)
	reach := suffixCharges(s, target)
	beam := []configuration{{}}
	for i := 0; i < n; i++ {
		charges := axisCharges(s.Axes[i])
		var next []configuration
		for _, c := range beam {
			for k, q := range charges {
				charge := s.Group.Add(c.charge, q)
				if !reach.possible(i+1, s.Group.Sub(target, charge)) {
					continue
				}
				states := append(slices.Clone(c.states), int32(k))
				energy := c.energy
				for _, t := range closing[i] {
					energy += t.value(states)
				}
				dev := deviation(s.Group, charge, target, float64(i+1)/float64(n))
				next = append(next, configuration{c.cost + energy - c.energy + 1e-3*scale*dev, energy, charge, states})
			}
		}
		if len(next) == 0 {
			return nil, 0, fmt.Errorf("dmrg: no product state of charge %v found: the sector seems out of reach", target)
		}
		beam = prune(next)
	}
	best := beam[0]
	out := make([]int, n)
	for i, k := range best.states {
		out[i] = int(k)
	}
	return out, best.energy, nil
}

func prune(all []configuration) []configuration {
	slices.SortStableFunc(all, func(a, b configuration) int { return cmp.Compare(a.cost, b.cost) })
	seen := make(map[block.Charge]int)
	var keep []configuration
	for _, c := range all {
		if seen[c.charge] >= beamPerCharge {
			continue
		}
		seen[c.charge]++
		keep = append(keep, c)
		if len(keep) == beamWidth {
			break
		}
	}
	return keep
}

func (t diagonalTerm) value(states []int32) float64 {
	v := t.coef
	for k, site := range t.sites {
		v *= t.diag[k][states[site]]
	}
	return v
}

// deviation is the squared distance of the partial U(1) charges from their even share.
func deviation(g block.Group, charge, target block.Charge, share float64) float64 {
	var d float64
	for k := 0; k < g.Len(); k++ {
		if g.Rule(k).Modulus == 0 {
			x := float64(charge[k]) - share*float64(target[k])
			d += x * x
		}
	}
	return d
}

// diagonalTerms sorts the terms that have a diagonal by their last site; scale is the largest coupling.
func diagonalTerms(s *ladder.Strings) (closing [][]diagonalTerm, scale float64) {
	closing = make([][]diagonalTerm, len(s.Axes))
	diagonals := make(map[*ladder.OpTable][][]float64)
	for _, t := range s.Tables {
		if _, ok := diagonals[t]; !ok {
			diagonals[t] = tableDiagonals(t)
		}
	}
	for i, c := range s.Coef {
		scale = max(scale, math.Hypot(real(c), imag(c)))
		factors := s.Factors[s.Start[i]:s.Start[i+1]]
		if len(factors) == 0 || real(c) == 0 {
			continue
		}
		t := diagonalTerm{coef: real(c)}
		for _, f := range factors {
			d := diagonals[s.Tables[f.Site]][f.Op]
			if d == nil {
				t.sites = nil
				break
			}
			t.sites, t.diag = append(t.sites, f.Site), append(t.diag, d)
		}
		if t.sites != nil {
			last := factors[len(factors)-1].Site
			closing[last] = append(closing[last], t)
		}
	}
	return closing, scale
}

// tableDiagonals returns the real diagonal of every operator of a table, nil where it vanishes.
func tableDiagonals(t *ladder.OpTable) [][]float64 {
	out := make([][]float64, len(t.Matrices))
	for i, m := range t.Matrices {
		d := int(math.Round(math.Sqrt(float64(len(m)))))
		diag := make([]float64, d)
		any := false
		for k := range diag {
			diag[k] = real(m[k*d+k])
			any = any || diag[k] != 0
		}
		if any {
			out[i] = diag
		}
	}
	return out
}

// axisCharges lists the charge of every state of an axis.
func axisCharges(a block.Axis) []block.Charge {
	var out []block.Charge
	for _, s := range a.Sectors {
		for k := 0; k < s.Dim; k++ {
			out = append(out, s.Charge)
		}
	}
	return out
}

// lookahead knows which charges the sites from i on can hold: exactly while that fits, else by the range of each charge.
type lookahead struct {
	group  block.Group
	exact  []map[block.Charge]bool // nil where not kept
	lo, hi []block.Charge
}

func suffixCharges(s *ladder.Strings, target block.Charge) lookahead {
	n := len(s.Axes)
	r := lookahead{group: s.Group, exact: make([]map[block.Charge]bool, n+1), lo: make([]block.Charge, n+1), hi: make([]block.Charge, n+1)}
	r.exact[n] = map[block.Charge]bool{{}: true}
	total := 0
	for i := n - 1; i >= 0; i-- {
		for k := 0; k < s.Group.Len(); k++ {
			lo, hi := int32(math.MaxInt32), int32(math.MinInt32)
			for _, q := range s.Axes[i].Sectors {
				lo, hi = min(lo, q.Charge[k]), max(hi, q.Charge[k])
			}
			r.lo[i][k], r.hi[i][k] = r.lo[i+1][k]+lo, r.hi[i+1][k]+hi
		}
		if r.exact[i+1] == nil || total > suffixLimit {
			continue
		}
		m := make(map[block.Charge]bool)
		for c := range r.exact[i+1] {
			for _, q := range s.Axes[i].Sectors {
				m[s.Group.Add(c, q.Charge)] = true
			}
		}
		r.exact[i] = m
		total += len(m)
	}
	return r
}

// possible reports whether the sites from i on can hold charge c.
func (r lookahead) possible(i int, c block.Charge) bool {
	if m := r.exact[i]; m != nil {
		return m[c]
	}
	for k := 0; k < r.group.Len(); k++ {
		if r.group.Rule(k).Modulus == 0 && (c[k] < r.lo[i][k] || c[k] > r.hi[i][k]) {
			return false
		}
	}
	return true
}
