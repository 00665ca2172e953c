package ladder

import (
	"math"
	"sort"
)

// Choosing charges. Everything conserved together forms a group that may need more charges than a block.Group holds, and the same group
// has many sets of generators. Named charges go first; where they do not tell all sectors apart, unnamed generators complete them. If
// more than four are needed, the four are chosen greedily by the cut they make in the blocks, measured as the entropy of
// the total charge when every basis state of the ladder has the same weight (in the Gaussian limit for integer charges): a large
// entropy means many sectors of comparable size.

// lattice is the set of values that the label steps give to a list of charges, as a Hermite normal form: basis[i] is zero before
// place i, and nil or positive at place i.
type lattice struct {
	basis [][]exact
}

func newLattice(dims int) *lattice { return &lattice{basis: make([][]exact, dims)} }

// insert adds an integer vector to the lattice.
func (l *lattice) insert(v []exact) {
	v = append([]exact(nil), v...)
	for i := range l.basis {
		for !v[i].isZero() {
			b := l.basis[i]
			if b == nil || v[i].cmpAbs(b[i]) < 0 {
				l.basis[i], v = v, b
				if v == nil {
					return
				}
				continue
			}
			addTo(v, v[i].nearest(b[i]).neg(), b)
		}
	}
}

func addTo(v []exact, k exact, b []exact) {
	for i := range v {
		v[i] = v[i].plus(k.times(b[i]))
	}
}

// pivot returns the diagonal element at place i, or zero.
func (l *lattice) pivot(i int) exact {
	if l.basis[i] == nil {
		return exact{}
	}
	p := l.basis[i][i]
	if p.sign() < 0 {
		return p.neg()
	}
	return p
}

// latticeOf spans the values of the charges, the moduli included.
func latticeOf(charges []*charge) *lattice {
	l := newLattice(len(charges))
	if len(charges) == 0 {
		return l
	}
	row := make([]exact, len(charges))
	seen := make(map[[maxTogether]int32]bool)
	for v := range charges[0].weight {
		var key [maxTogether]int32
		for i, c := range charges {
			key[i] = c.weight[v]
			row[i] = exactOf(int64(c.weight[v]))
		}
		if !seen[key] {
			seen[key] = true
			l.insert(row)
		}
	}
	for i, c := range charges {
		if c.modulus != 0 {
			clear(row)
			row[i] = exactOf(int64(c.modulus))
			l.insert(row)
		}
	}
	return l
}

// maxTogether is the largest number of charges weighed at once.
const maxTogether = 6

// adds reports whether c tells apart states that the charges chosen do not.
func adds(chosen []*charge, c *charge) bool {
	h := latticeOf(append(append([]*charge(nil), chosen...), c)).pivot(len(chosen))
	return !h.residue(exactOf(int64(c.modulus))).isZero()
}

// entropy measures how finely the charges cut the space of states; see above. Charges must not be redundant.
func (lb *labelling) entropy(charges []*charge) float64 {
	var sorted []*charge
	for _, c := range charges {
		if c.modulus == 0 {
			sorted = append(sorted, c)
		}
	}
	integers := len(sorted)
	for _, c := range charges {
		if c.modulus != 0 {
			sorted = append(sorted, c)
		}
	}
	l := latticeOf(sorted)
	h := 0.5 * lb.logDeterminant(sorted[:integers])
	for i, c := range sorted {
		p := l.pivot(i).float()
		if c.modulus == 0 {
			h += 0.5*math.Log(2*math.Pi*math.E) - math.Log(p)
		} else {
			h += math.Log(float64(c.modulus) / p)
		}
	}
	return h
}

// logDeterminant of the covariance of integer charges, by elimination without pivoting (the matrix is positive definite).
func (lb *labelling) logDeterminant(charges []*charge) float64 {
	n := len(charges)
	m := make([][]float64, n)
	for i := range m {
		m[i] = make([]float64, n)
		for j := range i + 1 {
			m[i][j] = lb.correlation(charges[i], charges[j])
			m[j][i] = m[i][j]
		}
	}
	sum := 0.0
	for i := range m {
		if !(m[i][i] > 0) {
			return math.Inf(-1)
		}
		sum += math.Log(m[i][i])
		for r := i + 1; r < n; r++ {
			f := m[r][i] / m[i][i]
			for c := i; c < n; c++ {
				m[r][c] -= f * m[i][c]
			}
		}
	}
	return sum
}

func (lb *labelling) correlation(c, d *charge) float64 {
	sum := 0.0
	for i := range lb.sites() {
		f := int(lb.first[i])
		for a, row := range lb.at(i).covariance {
			for b, x := range row {
				sum += float64(c.weight[f+a]) * float64(d.weight[f+b]) * x
			}
		}
	}
	return sum
}

// mean of a charge when all basis states have the same weight.
func (lb *labelling) mean(c *charge) float64 {
	sum := 0.0
	for i := range lb.sites() {
		if c.base != nil {
			sum += float64(c.base[i])
		}
		for a, x := range lb.at(i).mean {
			sum += float64(c.weight[int(lb.first[i])+a]) * x
		}
	}
	return sum
}

// chosen is the result of choosing.
type chosen struct {
	charges []*charge
	left    []*charge // conserved, not needed or without a place; named ones first
	missing bool      // the charges do not tell all sectors apart
	entropy float64
}

// choose picks at most most charges from named and unnamed ones, all conserved.
func (lb *labelling) choose(named, unnamed []*charge, most int) chosen {
	pick := lb.greedy(nil, named, most+1)
	if len(pick) <= most {
		pick = lb.greedy(pick, unnamed, most+1)
	}
	if len(pick) > most {
		pick = lb.greedy(nil, append(append([]*charge(nil), named...), unnamed...), most)
	}
	out := chosen{charges: lb.inOrder(lb.pruned(pick), named, unnamed)}
	for _, list := range [][]*charge{named, unnamed} {
		for _, c := range list {
			if !contains(out.charges, c) {
				out.left = append(out.left, c)
				out.missing = out.missing || adds(out.charges, c)
			}
		}
	}
	out.entropy = lb.entropy(out.charges)
	return out
}

// greedy extends pick by the candidates that cut most, up to most charges in all. Of equals the earlier candidate wins.
func (lb *labelling) greedy(pick, candidates []*charge, most int) []*charge {
	pick = append([]*charge(nil), pick...)
	for len(pick) < most {
		var best *charge
		top := math.Inf(-1)
		for _, c := range candidates {
			if contains(pick, c) || !adds(pick, c) {
				continue
			}
			if h := lb.entropy(append(pick[:len(pick):len(pick)], c)); best == nil || h > top+1e-9 {
				best, top = c, h
			}
		}
		if best == nil {
			break
		}
		pick = append(pick, best)
	}
	return pick
}

// pruned drops charges that follow from the others.
func (lb *labelling) pruned(pick []*charge) []*charge {
	for i := len(pick) - 1; i >= 0; i-- {
		others := append(append([]*charge(nil), pick[:i]...), pick[i+1:]...)
		if !adds(others, pick[i]) {
			pick = others
		}
	}
	return pick
}

// inOrder sorts the picked charges as their lists have them, named ones first.
func (lb *labelling) inOrder(pick, named, unnamed []*charge) []*charge {
	place := make(map[*charge]int)
	for i, c := range append(append([]*charge(nil), named...), unnamed...) {
		place[c] = i
	}
	out := append([]*charge(nil), pick...)
	sort.Slice(out, func(i, j int) bool { return place[out[i]] < place[out[j]] })
	return out
}

func contains(list []*charge, c *charge) bool {
	for _, x := range list {
		if x == c {
			return true
		}
	}
	return false
}

// bySupport returns the indices of the columns, those with most entries first.
func bySupport(columns [][]entry) []int {
	order := make([]int, len(columns))
	for i := range order {
		order[i] = i
	}
	sort.SliceStable(order, func(a, b int) bool { return len(columns[order[a]]) > len(columns[order[b]]) })
	return order
}

// siteOf returns the site of a variable.
func (lb *labelling) siteOf(v int) int {
	return sort.Search(lb.sites(), func(i int) bool { return int(lb.first[i+1]) > v })
}

func commonDivisor(a, b int) int {
	for b != 0 {
		a, b = b, a%b
	}
	return a
}
