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

// starter finds product states of low diagonal energy.
type starter struct {
	group   block.Group
	charges [][]block.Charge // of each state of each site
	closing [][]diagonalTerm // the terms by their last site
	keep    [][]int          // of the sites that terms still wait for before site i, and site i, those that they wait for behind it
	scale   float64          // largest coupling
	reach   lookahead
}

// diagonalTerm is one term of the Hamiltonian restricted to its diagonal.
type diagonalTerm struct {
	coef  complex128
	sites []int          // at first the sites; then their places in the memory of a configuration
	diag  [][]complex128 // per site, per local state
}

// configuration is a product state of the first sites. It remembers the local states that terms still wait for.
type configuration struct {
	cost   float64 // diagonal energy of the terms that are complete, and the tie-break
	energy float64
	charge block.Charge
	memory []int32
	before *configuration
	state  int32
}

func newStarter(s *ladder.Strings) *starter {
	b := &starter{group: s.Group, reach: suffixCharges(s), keep: make([][]int, len(s.Axes))}
	b.closing, b.scale = diagonalTerms(s)
	for _, a := range s.Axes {
		b.charges = append(b.charges, a.Charges())
	}
	// How long is each site waited for?
	until := make([]int, len(s.Axes))
	for last, terms := range b.closing {
		for _, t := range terms {
			for _, site := range t.sites {
				until[site] = max(until[site], last)
			}
		}
	}
	place := make(map[int]int)
	var waiting []int
	for i := range s.Axes {
		waiting = append(waiting, i)
		for k, site := range waiting {
			place[site] = k
		}
		for _, t := range b.closing[i] {
			for k, site := range t.sites {
				t.sites[k] = place[site]
			}
		}
		var left []int
		for k, site := range waiting {
			if until[site] > i {
				b.keep[i] = append(b.keep[i], k)
				left = append(left, site)
			}
		}
		waiting = left
	}
	return b
}

// states returns the local states of a product state of total charge target with a low diagonal energy: a beam search
// from left to right that completes only configurations which can still reach the target. Between equals, the charge that is
// spread most evenly wins.
func (b *starter) states(target block.Charge) ([]int, float64, error) {
	n := len(b.charges)
	beam := []configuration{{}}
	for i := range n {
		var next []configuration
		for p := range beam {
			next = b.extend(next, &beam[p], i, target)
		}
		if len(next) == 0 {
			return nil, 0, fmt.Errorf("dmrg: no product state of charge %v found: the sector seems out of reach", target)
		}
		beam = prune(next)
		for p := range beam {
			c := &beam[p]
			memory := make([]int32, len(b.keep[i]))
			for k, from := range b.keep[i] {
				memory[k] = c.state
				if from < len(c.before.memory) {
					memory[k] = c.before.memory[from]
				}
			}
			c.memory = memory
		}
	}
	out := make([]int, n)
	for c, i := &beam[0], n-1; i >= 0; c, i = c.before, i-1 {
		out[i] = int(c.state)
	}
	return out, beam[0].energy, nil
}

// extend appends the configurations of one more site.
func (b *starter) extend(next []configuration, c *configuration, i int, target block.Charge) []configuration {
	memory := append(slices.Clip(c.memory), 0)
	for k, q := range b.charges[i] {
		charge := b.group.Add(c.charge, q)
		if !b.reach.possible(i+1, b.group.Sub(target, charge)) {
			continue
		}
		memory[len(memory)-1] = int32(k)
		gain := 0.0
		for _, t := range b.closing[i] {
			gain += t.value(memory)
		}
		uneven := 1e-3 * b.scale * deviation(b.group, charge, target, float64(i+1)/float64(len(b.charges)))
		next = append(next, configuration{cost: c.cost + gain + uneven, energy: c.energy + gain, charge: charge, before: c, state: int32(k)})
	}
	return next
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

func (t diagonalTerm) value(memory []int32) float64 {
	v := t.coef
	for k, site := range t.sites {
		v *= t.diag[k][memory[site]]
	}
	return real(v)
}

// deviation is the squared distance of the partial U(1) charges from their even share.
func deviation(g block.Group, charge, target block.Charge, share float64) float64 {
	var d float64
	for k := range g.Len() {
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
	diagonals := make(map[*ladder.OpTable][][]complex128)
	for _, t := range s.Tables {
		if _, ok := diagonals[t]; !ok {
			diagonals[t] = tableDiagonals(t)
		}
	}
	for i, c := range s.Coef {
		factors := s.Factors[s.Start[i]:s.Start[i+1]]
		if len(factors) == 0 {
			continue
		}
		scale = max(scale, math.Hypot(real(c), imag(c)))
		t := diagonalTerm{coef: c}
		for _, f := range factors {
			d := diagonals[s.Tables[f.Site]][f.Op]
			if d == nil {
				t.sites = nil
				break
			}
			t.sites, t.diag = append(t.sites, int(f.Site)), append(t.diag, d)
		}
		if t.sites != nil {
			last := factors[len(factors)-1].Site
			closing[last] = append(closing[last], t)
		}
	}
	return closing, scale
}

// tableDiagonals returns the diagonal of every operator of a table, nil where it vanishes.
func tableDiagonals(t *ladder.OpTable) [][]complex128 {
	out := make([][]complex128, len(t.Matrices))
	for i, m := range t.Matrices {
		d := int(math.Round(math.Sqrt(float64(len(m)))))
		diag := make([]complex128, d)
		any := false
		for k := range diag {
			diag[k] = m[k*d+k]
			any = any || diag[k] != 0
		}
		if any {
			out[i] = diag
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

func suffixCharges(s *ladder.Strings) lookahead {
	n := len(s.Axes)
	r := lookahead{group: s.Group, exact: make([]map[block.Charge]bool, n+1), lo: make([]block.Charge, n+1), hi: make([]block.Charge, n+1)}
	r.exact[n] = map[block.Charge]bool{{}: true}
	total := 0
	for i := n - 1; i >= 0; i-- {
		for k := range s.Group.Len() {
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
	for k := range r.group.Len() {
		if r.group.Rule(k).Modulus == 0 && (c[k] < r.lo[i][k] || c[k] > r.hi[i][k]) {
			return false
		}
	}
	return true
}

// holds reports whether n basis states or more have charge target.
func (b *starter) holds(target block.Charge, n int) bool {
	var count func(i int, left block.Charge, n int) int
	count = func(i int, left block.Charge, n int) int {
		if i == len(b.charges) {
			return 1
		}
		found := 0
		for _, q := range b.charges[i] {
			if rest := b.group.Sub(left, q); found < n && b.reach.possible(i+1, rest) {
				found += count(i+1, rest, n-found)
			}
		}
		return found
	}
	return count(0, target, n) >= n
}
