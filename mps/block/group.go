package block

import (
	"encoding/json"
	"fmt"
	"strings"
)

// MaxCharges is the largest number of charges of a group.
const MaxCharges = 4

// Charge holds the values of a group's charges; places beyond the group's length are zero. Z_q values lie in 0..q-1.
type Charge [MaxCharges]int32

// Compare orders charges lexicographically: -1, 0 or +1.
func (c Charge) Compare(d Charge) int {
	for i, x := range c {
		if x != d[i] {
			if x < d[i] {
				return -1
			}
			return 1
		}
	}
	return 0
}

// Rule says how one charge adds: Modulus 0 is U(1), Modulus q >= 2 is Z_q.
type Rule struct {
	Name    string
	Modulus int
}

// String returns the name with the kind of charge, as in "N: U(1)".
func (r Rule) String() string {
	kind := "U(1)"
	if r.Modulus != 0 {
		kind = fmt.Sprintf("Z_%d", r.Modulus)
	}
	if r.Name == "" {
		return kind
	}
	return r.Name + ": " + kind
}

// Group is a product of up to four abelian charges. It is comparable; the zero value is the trivial group, whose only charge is zero.
type Group struct {
	names  string // joined by nameEnd: small values are passed by copy in inner loops
	moduli [MaxCharges]int32
	n      int8
}

const nameEnd = "\x00"

// maxModulus keeps sums of two charges inside int32.
const maxModulus = 1 << 30

// NewGroup returns the group with the given rules, at most four, or an error that names the wrong one.
func NewGroup(rules ...Rule) (Group, error) {
	var g Group
	if len(rules) > MaxCharges {
		return g, fmt.Errorf("%d charges given; at most %d are supported", len(rules), MaxCharges)
	}
	for i, r := range rules {
		if r.Modulus < 0 || r.Modulus == 1 || r.Modulus > maxModulus {
			return Group{}, fmt.Errorf("charge %q has modulus %d; expected 0 for U(1) or 2..%d for Z_q", r.Name, r.Modulus, maxModulus)
		}
		if strings.Contains(r.Name, nameEnd) {
			return Group{}, fmt.Errorf("charge name %q contains a NUL byte", r.Name)
		}
		g.names += r.Name + nameEnd
		g.moduli[i] = int32(r.Modulus)
	}
	g.n = int8(len(rules))
	return g, nil
}

// Len returns the number of charges.
func (g Group) Len() int { return int(g.n) }

// Rule returns the rule of charge i.
func (g Group) Rule(i int) Rule {
	if i < 0 || i >= int(g.n) {
		panic(fmt.Sprintf("block: rule %d of a group with %d charges", i, g.n))
	}
	return Rule{Name: strings.Split(g.names, nameEnd)[i], Modulus: int(g.moduli[i])}
}

// Add returns a + b.
func (g Group) Add(a, b Charge) Charge {
	for i := range a {
		a[i] += b[i]
	}
	return g.Normalize(a)
}

// Sub returns a - b.
func (g Group) Sub(a, b Charge) Charge {
	for i := range a {
		a[i] -= b[i]
	}
	return g.Normalize(a)
}

// Neg returns -a.
func (g Group) Neg(a Charge) Charge { return g.Sub(Charge{}, a) }

// Normalize brings the Z_q parts into 0..q-1.
func (g Group) Normalize(c Charge) Charge {
	for i, q := range g.moduli {
		if q != 0 {
			if c[i] %= q; c[i] < 0 {
				c[i] += q
			}
		}
	}
	return c
}

// signed returns a + f*b.
func (g Group) signed(a Charge, f Flow, b Charge) Charge {
	if f == Out {
		return g.Sub(a, b)
	}
	return g.Add(a, b)
}

// valid reports whether c is normalized and zero beyond the group's length.
func (g Group) valid(c Charge) bool {
	for i := int(g.n); i < MaxCharges; i++ {
		if c[i] != 0 {
			return false
		}
	}
	return g.Normalize(c) == c
}

// String lists the rules, as in "N: U(1) × P: Z_2"; the trivial group is "1".
func (g Group) String() string {
	if g.n == 0 {
		return "1"
	}
	parts := make([]string, g.n)
	for i := range parts {
		parts[i] = g.Rule(i).String()
	}
	return strings.Join(parts, " × ")
}

// MarshalJSON writes the group as the list of its rules.
func (g Group) MarshalJSON() ([]byte, error) {
	rules := make([]Rule, g.n)
	for i := range rules {
		rules[i] = g.Rule(i)
	}
	return json.Marshal(rules)
}

// UnmarshalJSON reads a list of rules and checks it as NewGroup does.
func (g *Group) UnmarshalJSON(data []byte) error {
	var rules []Rule
	if err := json.Unmarshal(data, &rules); err != nil {
		return err
	}
	read, err := NewGroup(rules...)
	if err != nil {
		return err
	}
	*g = read
	return nil
}
