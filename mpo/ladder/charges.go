package ladder

import (
	"fmt"
	"math"
	"strings"
)

// charge is a quantity that is a sum over sites: weight times label steps, plus base for each site's first state. Modulus 0: an
// integer; q: counted modulo q. Halves: the stored integer is twice the physicist's value.
type charge struct {
	name        string
	modulus     int
	halves      bool
	description string
	weight      []int32 // per variable of the labelling
	base        []int32 // per site; nil: zero
}

// largestCharge bounds the total of a charge, so that sums of a few stay inside int32.
const largestCharge = 1 << 28

// coarseModulus is used for unnamed integer charges whose totals would exceed largestCharge: they are kept modulo this number.
const coarseModulus = 1 << 20

// conserves reports whether all relations leave the charge unchanged.
func (c *charge) conserved(moves []relation) bool {
	m := exactOf(int64(c.modulus))
	for _, r := range moves {
		sum := exact{}
		for _, t := range r.terms {
			sum = sum.plus(t.n.times(exactOf(int64(c.weight[t.at]))))
		}
		if !sum.residue(m).isZero() {
			return false
		}
	}
	return true
}

// ofState returns the charge of a state of a site, not reduced.
func (c *charge) ofState(lb *labelling, site, state int) int32 {
	sum := int32(0)
	if c.base != nil {
		sum = c.base[site]
	}
	for a, x := range lb.at(site).steps[state] {
		sum += c.weight[int(lb.first[site])+a] * x
	}
	return sum
}

// rotations holds the basis rotation of each leg (see rotation.go).
type rotations []int

// spinAxis returns the user's axis along which stored S^z lies.
func spinAxis(rotation int) string { return [...]string{"z", "x", "y"}[rotation] }

// namedCharges lists the quantities that have a name, the preferred ones first. Whether they are conserved is another matter.
func (lb *labelling) namedCharges(rot rotations) []*charge {
	legs := lb.ladder.Legs()
	var totals, perLeg, parities, components []*charge
	all := func(int) bool { return true }
	add := func(list *[]*charge, c *charge) {
		if c != nil {
			*list = append(*list, c)
		}
	}
	add(&totals, lb.particles(all, "N", "number of particles"))
	add(&totals, lb.spins(all, rot, ""))
	add(&totals, lb.clocks(all, "Q", "sum of the clock positions"))
	add(&parities, lb.parity(all, rot, "P", ""))
	for leg := range legs {
		on := func(l int) bool { return l == leg }
		name := legs[leg]
		add(&perLeg, lb.particles(on, "N_"+name, fmt.Sprintf("number of particles on leg %q", name)))
		add(&perLeg, lb.spins(on, rot, name))
		add(&perLeg, lb.clocks(on, "Q_"+name, fmt.Sprintf("sum of the clock positions on leg %q", name)))
		add(&parities, lb.parity(on, rot, "P_"+name, fmt.Sprintf(" over leg %q", name)))
	}
	add(&components, lb.component(up, "N up", "number of up fermions"))
	add(&components, lb.component(down, "N down", "number of down fermions"))
	out := append(totals, perLeg...)
	out = append(out, components...)
	return append(out, parities...)
}

// weigh builds a charge from weights by species on the legs that pass; nil if no label has a weight.
func (lb *labelling) weigh(on func(leg int) bool, c charge, weight func(*siteClass, species) (w, base int32)) *charge {
	c.weight = make([]int32, lb.variables())
	bases := make([]int32, lb.sites())
	any, based := false, false
	for i := range lb.sites() {
		if !on(int(lb.class[i])) {
			continue
		}
		cl := lb.at(i)
		for a, s := range cl.species {
			w, b := weight(cl, s)
			c.weight[int(lb.first[i])+a] = w
			bases[i] += b
			any, based = any || w != 0, based || b != 0
		}
	}
	if !any {
		return nil
	}
	if based {
		c.base = bases
	}
	return &c
}

func (lb *labelling) particles(on func(int) bool, name, what string) *charge {
	return lb.weigh(on, charge{name: name, description: what}, func(_ *siteClass, s species) (int32, int32) {
		if s == particle || s == up || s == down {
			return 1, 0
		}
		return 0, 0
	})
}

func (lb *labelling) component(which species, name, what string) *charge {
	return lb.weigh(func(int) bool { return true }, charge{name: name, description: what}, func(_ *siteClass, s species) (int32, int32) {
		if s == which {
			return 1, 0
		}
		return 0, 0
	})
}

// spins is twice the spin component along the stored axis. Legs turned to different axes have no common one.
func (lb *labelling) spins(on func(int) bool, rot rotations, leg string) *charge {
	axis := -1
	for l, cl := range lb.classes {
		if !on(l) {
			continue
		}
		here := -1
		switch cl.species[0] {
		case spin:
			here = rot[l]
		case up:
			here = 0
		}
		if here < 0 {
			continue
		}
		if axis >= 0 && axis != here {
			return nil
		}
		axis = here
	}
	if axis < 0 {
		return nil
	}
	a := spinAxis(axis)
	name, what := "S"+a, fmt.Sprintf("total S^%s", a)
	if leg != "" {
		name, what = name+"_"+leg, fmt.Sprintf("S^%s of leg %q", a, leg)
	}
	return lb.weigh(on, charge{name: name, halves: true, description: what}, func(c *siteClass, s species) (int32, int32) {
		switch s {
		case spin:
			return 2, int32(c.twoS)
		case up:
			return 1, 0
		case down:
			return -1, 0
		}
		return 0, 0
	})
}

// clocks counts clock positions modulo the greatest common divisor of the clocks' q.
func (lb *labelling) clocks(on func(int) bool, name, what string) *charge {
	q := 0
	for l, cl := range lb.classes {
		if on(l) && cl.modulus != 0 {
			q = commonDivisor(q, cl.modulus)
		}
	}
	if q < 2 {
		return nil
	}
	return lb.weigh(on, charge{name: name, modulus: q, description: fmt.Sprintf("%s, modulo %d", what, q)}, func(_ *siteClass, s species) (int32, int32) {
		if s == clock {
			return 1, 0
		}
		return 0, 0
	})
}

// parity counts particles, and spin steps below full alignment, modulo two.
func (lb *labelling) parity(on func(int) bool, rot rotations, name, where string) *charge {
	var factors []string
	add := func(f string) {
		for _, g := range factors {
			if f == g {
				return
			}
		}
		factors = append(factors, f)
	}
	c := lb.weigh(on, charge{name: name, modulus: 2}, func(_ *siteClass, s species) (int32, int32) {
		if s == clock {
			return 0, 0
		}
		return 1, 0
	})
	if c == nil {
		return nil
	}
	for l, cl := range lb.classes {
		if !on(l) {
			continue
		}
		switch cl.species[0] {
		case spin:
			add(fmt.Sprintf("exp(i pi (s - S^%s))", spinAxis(rot[l])))
		case particle, up:
			add("exp(i pi n)")
		}
	}
	c.description = fmt.Sprintf("parity: 0 where the product of %s%s is +1", strings.Join(factors, " and "), where)
	return c
}

// unnamedCharges are the generators of the group of all conserved charges, as the elimination found them.
func (lb *labelling) unnamedCharges(s *solution) []*charge {
	most := min(64, max(4, (1<<22)/(lb.variables()+1))) // candidates for at most four places
	var out []*charge
	columns := make([][]entry, len(s.moduli)) // entries (variable, weight) of each generator
	for v, terms := range s.image {
		for _, t := range terms {
			columns[t.at] = append(columns[t.at], entry{int32(v), t.n})
		}
	}
	for _, g := range bySupport(columns) {
		if len(out) == most {
			break
		}
		if c := lb.unnamed(columns[g], s.moduli[g]); c != nil {
			out = append(out, c)
		}
	}
	return out
}

// unnamed turns a generator into a charge; nil if it does not fit into the numbers at hand.
func (lb *labelling) unnamed(column []entry, modulus exact) *charge {
	q, ok := modulus.int64()
	if !ok || q > largestCharge {
		return nil
	}
	c := &charge{modulus: int(q), weight: make([]int32, lb.variables())}
	if q == 0 && !lb.fits(column) {
		c.modulus = coarseModulus
	}
	m := exactOf(int64(c.modulus))
	for _, t := range column {
		w, ok := t.n.residue(m).int64()
		if !ok {
			return nil
		}
		c.weight[t.at] = int32(w)
	}
	c.makeMostlyPositive()
	c.description = lb.describe(c)
	return c
}

// fits reports whether an integer charge stays below largestCharge.
func (lb *labelling) fits(column []entry) bool {
	total := 0.0
	for _, t := range column {
		total += math.Abs(t.n.float()) * float64(lb.span(int(t.at)))
	}
	return total <= largestCharge
}

// span returns the largest number of steps of a variable.
func (lb *labelling) span(v int) int32 {
	site := lb.siteOf(v)
	most := int32(0)
	for _, s := range lb.at(site).steps {
		x := s[v-int(lb.first[site])]
		most = max(most, x, -x)
	}
	return most
}

// makeMostlyPositive turns the sign of an integer charge so that its weights sum to a positive number.
func (c *charge) makeMostlyPositive() {
	if c.modulus != 0 {
		return
	}
	sum, first := int64(0), int32(0)
	for _, w := range c.weight {
		sum += int64(w)
		if first == 0 {
			first = w
		}
	}
	if sum > 0 || sum == 0 && first > 0 {
		return
	}
	for v := range c.weight {
		c.weight[v] = -c.weight[v]
	}
}

// describe lists the first weights with their sites.
func (lb *labelling) describe(c *charge) string {
	const shown = 6
	var parts []string
	for v, w := range c.weight {
		if w == 0 {
			continue
		}
		if len(parts) == shown {
			parts = append(parts, "...")
			break
		}
		parts = append(parts, fmt.Sprintf("%d × %s", w, lb.variableName(v)))
	}
	text := "sum of " + strings.Join(parts, ", ")
	if c.modulus != 0 {
		text += fmt.Sprintf(", modulo %d", c.modulus)
	}
	return text
}

// variableName names a label with its place, as in "n_up[a,3]".
func (lb *labelling) variableName(v int) string {
	site := lb.siteOf(v)
	leg, rung, _ := lb.ladder.SiteAt(site)
	what := "n"
	switch lb.at(site).species[v-int(lb.first[site])] {
	case up:
		what = "n_up"
	case down:
		what = "n_down"
	case spin:
		what = "(S^z - s)"
	case clock:
		what = "m"
	}
	return fmt.Sprintf("%s[%s,%d]", what, leg, rung)
}
