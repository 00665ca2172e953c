package ladder

import (
	"encoding/json"
	"fmt"
	"math"
	"sort"
	"strings"

	"rundle/mps/block"
)

// Sector gives wanted values of conserved charges by name: whole numbers, halves ("1/2", 0.5) for S^z, or formulas such as "rungs/2". What is
// not named is free.
type Sector map[string]any

// Target is a sector in terms of the group's charges. Where it leaves charges open, Totals lists what they may be: the wanted values may also tie
// open charges together (N_b where the group holds N and N_a).
type Target struct {
	Charge block.Charge // zero where free
	Free   []bool       // per charge of the group: the sector leaves it open

	wanted []wanted
}

// wanted is a value asked of a charge, of the group or not.
type wanted struct {
	*charge
	value int32 // as stored
}

// Target checks names and values, and that the ladder holds such a state. Frames read from a file must have been bound.
func (f *Frames) Target(s Sector) (Target, error) {
	t := Target{Free: make([]bool, f.Group.Len())}
	if f.lb == nil {
		return t, fmt.Errorf("frames read from a file must be bound to their Hamiltonian before a sector is named")
	}
	names := make([]string, 0, len(s))
	for name := range s {
		names = append(names, name)
	}
	sort.Strings(names)
	for _, name := range names {
		c := f.find(name)
		if c == nil {
			msg := fmt.Sprintf("sector: %s", f.h.whyNot(f.lb, f.rot, name))
			return t, &Error{Msg: msg, Hint: conservedHint(f.conservedNames())}
		}
		if adds(f.charges, c) {
			return t, &Error{Msg: fmt.Sprintf("sector: %s is conserved, but it is not among the charges in use and does not follow from them", name),
				Hint: "in use: " + strings.Join(namesOf(f.charges), ", ") + "; choose others with charges"}
		}
		v, err := f.value(c, s[name])
		if err != nil {
			return t, err
		}
		t.wanted = append(t.wanted, wanted{c, v})
	}
	if err := f.checkReach(t.wanted); err != nil {
		return t, err
	}
	f.settle(&t)
	return t, nil
}

// find returns the conserved charge of a name.
func (f *Frames) find(name string) *charge {
	for _, list := range [][]*charge{f.charges, f.others} {
		for _, c := range list {
			if c.name == name {
				return c
			}
		}
	}
	return nil
}

// conservedNames lists the group's charges, then what else has a name.
func (f *Frames) conservedNames() []string {
	out := namesOf(f.charges)
	for _, c := range f.others {
		if !strings.HasPrefix(c.name, "charge ") {
			out = append(out, c.name)
		}
	}
	return out
}

// value turns what the user wrote into the stored integer.
func (f *Frames) value(c *charge, v any) (int32, error) {
	x, err := f.number(v)
	if err != nil {
		return 0, &Error{Msg: fmt.Sprintf("sector %s = %v: %v", c.name, v, err)}
	}
	expected := "a whole number"
	if c.modulus != 0 {
		expected = fmt.Sprintf("a whole number from 0 to %d", c.modulus-1)
	}
	if c.halves {
		expected = "a multiple of 1/2"
		x *= 2
	}
	n := math.Round(x)
	if !(math.Abs(x-n) < 1e-9) || math.Abs(n) > largestCharge || c.modulus != 0 && (n < 0 || n >= float64(c.modulus)) {
		return 0, &Error{Msg: fmt.Sprintf("sector %s = %v: expected %s", c.name, v, expected)}
	}
	return int32(n), nil
}

func (f *Frames) number(v any) (float64, error) {
	switch x := v.(type) {
	case int:
		return float64(x), nil
	case int32:
		return float64(x), nil
	case int64:
		return float64(x), nil
	case float64:
		return x, nil
	case json.Number:
		return x.Float64()
	case string:
		return f.h.Scope.Number(x)
	}
	return 0, fmt.Errorf("a %T; expected a number or a formula", v)
}

// Values returns the user's numbers of a charge, by name.
func (f *Frames) Values(c block.Charge) map[string]float64 {
	out := make(map[string]float64, len(f.Charges))
	for i, info := range f.Charges {
		out[info.Name] = float64(c[i])
		if info.Halves {
			out[info.Name] /= 2
		}
	}
	return out
}

// info returns what people are told about a charge.
func (c *charge) info() ChargeInfo {
	return ChargeInfo{Name: c.name, Modulus: c.modulus, Halves: c.halves, Description: c.description}
}

// checkReach reports a combination of values that no state of the ladder has, with the nearest ones that exist.
func (f *Frames) checkReach(want []wanted) error {
	if len(want) == 0 {
		return nil
	}
	charges := make([]*charge, len(want))
	point := make([]int64, len(want))
	for i, w := range want {
		charges[i], point[i] = w.charge, int64(w.value)
	}
	r := newReach(f.lb, charges)
	if r.holds(point) {
		return nil
	}
	hint := "no state has these values"
	if near := r.nearest(point, 3); len(near) > 0 {
		var texts []string
		for _, p := range near {
			texts = append(texts, showPoint(charges, p))
		}
		hint = "nearest: " + strings.Join(texts, "; or ")
	}
	return &Error{Msg: fmt.Sprintf("sector %s cannot be reached on this ladder", showPoint(charges, point)), Hint: hint}
}

func showPoint(charges []*charge, p []int64) string {
	var parts []string
	for i, c := range charges {
		parts = append(parts, c.name+" = "+c.info().show(int32(p[i])))
	}
	return strings.Join(parts, ", ")
}

// settle fills in the charges that the wanted values determine.
func (f *Frames) settle(t *Target) {
	open := 0
	for i, c := range f.charges {
		t.Free[i] = true
		for _, w := range t.wanted {
			if w.charge == c {
				t.Charge[i], t.Free[i] = w.value, false
			}
		}
		if t.Free[i] {
			open++
		}
	}
	if open == 0 {
		return
	}
	const enough = 1 << 16 // totals looked at
	first := true
	same := append([]bool(nil), t.Free...)
	var value block.Charge
	complete := f.scan(*t, enough, func(c block.Charge) bool {
		if first {
			first, value = false, c
			return true
		}
		more := false
		for i := range same {
			same[i] = same[i] && c[i] == value[i]
			more = more || same[i]
		}
		return more
	})
	for i := range same {
		if complete && !first && same[i] {
			t.Charge[i], t.Free[i] = value[i], false
		}
	}
}

// Totals lists the total charges within a target that the ladder can hold, at most limit of them, those first that most basis states have:
// nearest to the mean, given what the target fixes, in units of the spread. Whether they are all is reported.
func (f *Frames) Totals(t Target, limit int) (totals []block.Charge, all bool) {
	const most = 1 << 20
	all = f.scan(t, most, func(c block.Charge) bool {
		totals = append(totals, c)
		return true
	})
	mean, spread := f.expected(t)
	distance := make(map[block.Charge]float64, len(totals))
	for _, c := range totals {
		d := 0.0
		for i, x := range f.charges {
			if x.modulus == 0 && t.Free[i] && spread[i] > 0 {
				y := (float64(c[i]) - mean[i]) / spread[i]
				d += y * y
			}
		}
		distance[c] = d
	}
	sort.Slice(totals, func(a, b int) bool {
		x, y := totals[a], totals[b]
		if dx, dy := distance[x], distance[y]; math.Abs(dx-dy) > 1e-9 {
			return dx < dy
		}
		return x.Compare(y) < 0
	})
	if len(totals) > limit {
		return totals[:limit], false
	}
	return totals, all
}

// scan visits the totals within a target, without repetition, until visit returns false; it reports whether it saw all or was stopped by
// visit, not by the limit.
func (f *Frames) scan(t Target, limit int, visit func(block.Charge) bool) bool {
	if f.Group.Len() == 0 {
		visit(block.Charge{})
		return true
	}
	charges := append([]*charge(nil), f.charges...)
	fixed := make([]*int64, len(charges))
	for _, w := range t.wanted {
		v := int64(w.value)
		at := -1
		for i, c := range charges {
			if c == w.charge {
				at = i
			}
		}
		if at < 0 {
			charges, fixed = append(charges, w.charge), append(fixed, nil)
			at = len(charges) - 1
		}
		fixed[at] = &v
	}
	for i := range f.charges {
		if fixed[i] == nil && !t.Free[i] {
			v := int64(t.Charge[i])
			fixed[i] = &v
		}
	}
	seen := make(map[block.Charge]bool)
	sawAll := true
	exhausted := newReach(f.lb, charges).visit(fixed, func(p []int64) bool {
		var c block.Charge
		for i := range f.charges {
			c[i] = int32(p[i])
		}
		if seen[c] {
			return true
		}
		if len(seen) == limit {
			sawAll = false
			return false
		}
		seen[c] = true
		return visit(c)
	})
	return sawAll && exhausted
}

// expected returns mean and spread of the charges over all basis states with equal weight, shifted by linear regression to what
// the target fixes.
func (f *Frames) expected(t Target) (mean, spread []float64) {
	n := len(f.charges)
	mean, spread = make([]float64, n), make([]float64, n)
	for i, c := range f.charges {
		mean[i] = f.lb.mean(c)
		spread[i] = math.Sqrt(f.lb.correlation(c, c))
	}
	// Condition on one fixed charge after the other: each step removes its part from charges and wanted values alike.
	given := append([]wanted(nil), t.wanted...)
	for i, c := range f.charges {
		if !t.Free[i] && !wants(given, c) {
			given = append(given, wanted{c, t.Charge[i]})
		}
	}
	all := append([]*charge(nil), f.charges...)
	centre := append([]float64(nil), mean...)
	for _, w := range given {
		all, centre = append(all, w.charge), append(centre, f.lb.mean(w.charge))
	}
	cov := make([][]float64, len(all))
	for i := range cov {
		cov[i] = make([]float64, len(all))
		for j := range all {
			cov[i][j] = f.lb.correlation(all[i], all[j])
		}
	}
	for k, w := range given {
		g := n + k
		v := cov[g][g]
		if w.modulus != 0 || v < 1e-9 {
			continue
		}
		shift := (float64(w.value) - centre[g]) / v
		column := make([]float64, len(all))
		for i := range all {
			column[i] = cov[i][g]
			centre[i] += column[i] * shift
		}
		for i := range all {
			for j := range all {
				cov[i][j] -= column[i] * column[j] / v
			}
		}
	}
	return centre[:n], spread
}

func wants(list []wanted, c *charge) bool {
	for _, w := range list {
		if w.charge == c {
			return true
		}
	}
	return false
}
