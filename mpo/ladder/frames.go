package ladder

import (
	"encoding/json"
	"errors"
	"fmt"
	"slices"
	"strings"

	"rundle/mps/block"
)

// ChargeInfo says what a charge of the group means.
type ChargeInfo struct {
	Name        string
	Modulus     int    // 0: any integer; q: counted modulo q
	Halves      bool   // the stored integer is twice the value, as for S^z
	Description string // one line for people
}

// Frames says how every site's local basis is stored: rotated to the axis that makes the conserved charges diagonal, with phases that
// make the Hamiltonian real where that is possible, and sorted by charge. Operators pass through Strings, user's charges through
// Target and Values. Frames of a Hamiltonian know its ladder; those read from JSON must be bound to one before Target.
//
// The stored form of an operator A is U A U^+ with U = product of the site unitaries (see Unitary).
type Frames struct {
	Group   block.Group
	Sites   []block.Frame // Angles: one per label, the phase that an operator gains by raising the label by one step (S^+: one step)
	Real    bool          // the Hamiltonian is real in these frames
	Loop    string        // why not, if not
	Charges []ChargeInfo  // of the group, in order
	Missing bool          // more is conserved than the group's charges tell

	h       *Hamiltonian
	lb      *labelling
	rot     rotations
	charges []*charge // those of Charges
	others  []*charge // conserved as well
}

// FrameOptions changes the choice of frames. The zero value finds the best.
type FrameOptions struct {
	Charges    []string // names of the charges to use; nil: chosen, empty: none
	Complex    bool     // no real gauge: complex arithmetic although the Hamiltonian may be real
	NoRotation bool     // keep the user's local axes
}

// trial is one choice of rotations with what it conserves.
type trial struct {
	rot    rotations
	poly   *Polynomial
	x      *expansion
	moves  []move
	choice chosen
	angles []float64
	real   bool
	loop   string
}

// Frames finds the conserved charges, the rotation that exposes most of them and the real gauge. Charges asked for by name that are not
// conserved are an error.
func (h *Hamiltonian) Frames(opt FrameOptions) (*Frames, error) {
	lb := newLabelling(h.Poly.Ladder())
	plain := make(rotations, len(lb.classes))
	best, err := lb.try(h.Poly, plain, opt)
	if !opt.NoRotation {
		for _, rot := range lb.rotationsToTry(best, h.Poly) {
			t, failed := lb.try(h.Poly, rot, opt)
			if failed == nil && (err != nil || t.better(best)) {
				best, err = t, nil
			}
		}
	}
	if err != nil {
		return nil, h.explain(lb, err)
	}
	f := &Frames{
		Real: best.real, Loop: best.loop, Missing: best.choice.missing,
		h: h, lb: lb, rot: best.rot, charges: best.choice.charges, others: best.choice.left,
	}
	f.name()
	f.build(best.angles)
	return f, nil
}

// try works out what a choice of rotations gives.
func (lb *labelling) try(p *Polynomial, rot rotations, opt FrameOptions) (*trial, error) {
	t := &trial{rot: rot}
	var err error
	if t.poly, err = lb.spell(lb.rotate(p, rot), writeOut); err != nil {
		return nil, err
	}
	if t.x, err = expand(lb, t.poly, !opt.Complex); err != nil {
		return nil, err
	}
	t.moves = movesOf(t.x)
	relations := append(relationsOf(t.moves), lb.clockRelations()...)
	var named []*charge
	for _, c := range lb.namedCharges(rot) {
		if c.conserved(relations) {
			named = append(named, c)
		}
	}
	unnamed := lb.unnamedCharges(solveRelations(lb.variables(), withoutPhases(relations)))
	t.choice = lb.choose(named, unnamed, block.MaxCharges)
	numberUnnamed(t.choice)
	if opt.Charges != nil {
		if err := lb.ask(t, opt.Charges); err != nil {
			return nil, err
		}
	}
	if opt.Complex {
		t.loop = "complex arithmetic was asked for"
		return t, nil
	}
	t.angles, t.loop = gauge(t.x, t.moves)
	t.real = t.loop == ""
	return t, nil
}

// better prefers the larger group, then real arithmetic, then the earlier trial.
func (t *trial) better(u *trial) bool {
	if d := t.choice.entropy - u.choice.entropy; d > 1e-6 || d < -1e-6 {
		return d > 0
	}
	return t.real && !u.real
}

func withoutPhases(relations []relation) []relation {
	out := slices.Clone(relations)
	for i := range out {
		out[i].rhs = phase{}
	}
	return out
}

// numberUnnamed gives the unnamed charges numbers, those in use first.
func numberUnnamed(c chosen) {
	n := 0
	for _, list := range [][]*charge{c.charges, c.left} {
		for _, x := range list {
			if x.name == "" || strings.HasPrefix(x.name, "charge ") {
				n++
				x.name = fmt.Sprintf("charge %d", n)
			}
		}
	}
}

// unknownCharge reports a charge asked for that a trial does not conserve.
type unknownCharge struct {
	name string
	have []string
	bad  string // another fault than its absence
}

func (e *unknownCharge) Error() string { return e.name }

// ask replaces the choice by the charges with the given names.
func (lb *labelling) ask(t *trial, names []string) error {
	all := append(append([]*charge(nil), t.choice.charges...), t.choice.left...)
	have := namesOf(all)
	if len(names) > block.MaxCharges {
		return &unknownCharge{name: strings.Join(names, ", "), bad: fmt.Sprintf("at most %d charges can be used at once", block.MaxCharges)}
	}
	var pick []*charge
	for _, n := range names {
		i := slices.IndexFunc(all, func(c *charge) bool { return c.name == n })
		switch {
		case i < 0:
			return &unknownCharge{name: n, have: have}
		case contains(pick, all[i]):
			return &unknownCharge{name: n, bad: "it is named twice"}
		case !adds(pick, all[i]):
			return &unknownCharge{name: n, bad: "it follows from the charges named before it"}
		}
		pick = append(pick, all[i])
	}
	c := chosen{charges: lb.pruned(pick)}
	if len(c.charges) < len(pick) {
		c.charges = pick // a finer charge after a coarser one: keep the user's list
	}
	for _, x := range all {
		if !contains(pick, x) {
			c.left = append(c.left, x)
			c.missing = c.missing || adds(pick, x)
		}
	}
	c.entropy = lb.entropy(c.charges)
	t.choice = c
	return nil
}

func namesOf(list []*charge) []string {
	out := make([]string, len(list))
	for i, c := range list {
		out[i] = c.name
	}
	return out
}

// explain turns an unknownCharge into the user's words.
func (h *Hamiltonian) explain(lb *labelling, err error) error {
	var u *unknownCharge
	if !errors.As(err, &u) {
		return err
	}
	if u.bad != "" {
		return &Error{Msg: fmt.Sprintf("charge %q cannot be used: %s", u.name, u.bad)}
	}
	return &Error{Msg: fmt.Sprintf("charge %q cannot be used: %s", u.name, h.whyNot(lb, make(rotations, len(lb.classes)), u.name)), Hint: conservedHint(u.have)}
}

func conservedHint(names []string) string {
	if len(names) == 0 {
		return "nothing is conserved"
	}
	return "conserved: " + strings.Join(names, ", ")
}

// whyNot says which term changes a charge, or that the name is unknown.
func (h *Hamiltonian) whyNot(lb *labelling, rot rotations, name string) string {
	var c *charge
	for _, x := range lb.namedCharges(rot) {
		if x.name == name {
			c = x
		}
	}
	if c == nil {
		return fmt.Sprintf("this ladder has no charge %q", name)
	}
	for i, term := range h.Terms {
		p, err := h.Scope.Polynomial(term)
		if err != nil {
			continue
		}
		if p, err = lb.spell(lb.rotate(p, rot), writeOut); err != nil {
			continue
		}
		x, err := expand(lb, p, false)
		if err != nil {
			continue
		}
		if !c.conserved(relationsOf(movesOf(x))) {
			called := term.Name
			if called == "" {
				called = term.Formula
			}
			if called == "" {
				called = fmt.Sprint("number ", i+1)
			}
			return fmt.Sprintf("%s is not conserved: term %q changes it", name, called)
		}
	}
	return name + " is not conserved"
}

// name fills the group and the descriptions.
func (f *Frames) name() {
	var rules []block.Rule
	for _, c := range f.charges {
		rules = append(rules, block.Rule{Name: c.name, Modulus: c.modulus})
		f.Charges = append(f.Charges, ChargeInfo{Name: c.name, Modulus: c.modulus, Halves: c.halves, Description: c.description})
	}
	g, err := block.NewGroup(rules...)
	if err != nil {
		panic("ladder: " + err.Error())
	}
	f.Group = g
}

// build writes the frame of every site; equal frames share their slices.
func (f *Frames) build(angles []float64) {
	lb := f.lb
	f.Sites = make([]block.Frame, lb.sites())
	shared := make(map[string]block.Frame)
	for i := range f.Sites {
		fr := block.Frame{Rotation: f.rot[lb.class[i]]}
		raw := make([]block.Charge, len(lb.at(i).steps))
		for s := range raw {
			for k, c := range f.charges {
				raw[s][k] = c.ofState(lb, i, s)
			}
			raw[s] = f.Group.Normalize(raw[s])
			fr.Order = append(fr.Order, s)
		}
		slices.SortStableFunc(fr.Order, func(a, b int) int { return raw[a].Compare(raw[b]) })
		for _, s := range fr.Order {
			fr.Charges = append(fr.Charges, raw[s])
		}
		key := fmt.Sprint(fr.Charges, fr.Order)
		if old, ok := shared[key]; ok {
			fr.Charges, fr.Order = old.Charges, old.Order
		} else {
			shared[key] = fr
		}
		if angles != nil {
			fr.Angles = slices.Clone(angles[lb.first[i]:lb.first[i+1]])
		}
		f.Sites[i] = fr
	}
}

// Bind joins frames read from a file to their Hamiltonian, so that sectors can be named; an error if it is not theirs.
func (f *Frames) Bind(h *Hamiltonian) error {
	l := h.Poly.Ladder()
	if err := f.check(l); err != nil {
		return err
	}
	lb := newLabelling(l)
	rot, err := f.rotationsOn(lb)
	if err != nil {
		return err
	}
	names := make([]string, len(f.Charges))
	for i, c := range f.Charges {
		names[i] = c.Name
	}
	t, err := lb.try(h.Poly, rot, FrameOptions{Charges: names, Complex: true})
	if err != nil {
		return h.explain(lb, err)
	}
	g := &Frames{h: h, lb: lb, rot: rot, charges: t.choice.charges, others: t.choice.left}
	g.name()
	g.build(nil)
	for i, s := range g.Sites {
		if g.Group != f.Group || !slices.Equal(s.Charges, f.Sites[i].Charges) || !slices.Equal(s.Order, f.Sites[i].Order) {
			return fmt.Errorf("the frame of site %d belongs to another Hamiltonian: its charges differ", i)
		}
	}
	f.h, f.lb, f.rot, f.charges, f.others = g.h, g.lb, g.rot, g.charges, g.others
	return nil
}

// UnmarshalJSON reads frames and checks that they hang together.
func (f *Frames) UnmarshalJSON(data []byte) error {
	type plain Frames
	var p plain
	if err := json.Unmarshal(data, &p); err != nil {
		return err
	}
	if p.Group.Len() != len(p.Charges) {
		return fmt.Errorf("frames of a group with %d charges describe %d", p.Group.Len(), len(p.Charges))
	}
	for i, s := range p.Sites {
		if err := checkFrame(p.Group, s); err != nil {
			return fmt.Errorf("frame of site %d: %w", i, err)
		}
	}
	*f = Frames(p)
	return nil
}

func checkFrame(g block.Group, s block.Frame) error {
	if len(s.Order) != len(s.Charges) || len(s.Order) == 0 {
		return fmt.Errorf("%d charges for %d states", len(s.Charges), len(s.Order))
	}
	seen := make([]bool, len(s.Order))
	for i, k := range s.Order {
		if k < 0 || k >= len(seen) || seen[k] {
			return fmt.Errorf("the order %v is no permutation", s.Order)
		}
		seen[k] = true
		c := s.Charges[i]
		if g.Normalize(c) != c || i > 0 && s.Charges[i-1].Compare(c) > 0 {
			return fmt.Errorf("charges %v are not normalized and sorted", s.Charges)
		}
		for k := g.Len(); k < block.MaxCharges; k++ {
			if c[k] != 0 {
				return fmt.Errorf("charge %v has more places than the group", c)
			}
		}
	}
	return nil
}

// check compares the frames with a ladder.
func (f *Frames) check(l *Ladder) error {
	if l.Sites() != len(f.Sites) {
		return fmt.Errorf("frames of %d sites do not fit a ladder of %d", len(f.Sites), l.Sites())
	}
	for i, s := range f.Sites {
		site := l.Site(i)
		if site.Dim() != s.Dim() || s.Rotation < 0 || s.Rotation >= rotationsOf(site.Kind()) || s.Angles != nil && len(s.Angles) != len(site.Labels()) {
			return fmt.Errorf("frame of site %d does not fit a %v site", i, site)
		}
	}
	return nil
}

// Unitary returns the matrix <stored|user> of a site, Dim×Dim row-major: rows in the order of the stored states, columns in that of the
// site's own.
func (f *Frames) Unitary(l *Ladder, i int) []complex128 {
	s, site := f.Sites[i], l.Site(i)
	rotated := newRotation(site, s.Rotation).unitary()
	c := newSiteClass(site)
	d := site.Dim()
	out := make([]complex128, d*d)
	for r, state := range s.Order {
		turn := turnOf(s.Angles, c.steps[state])
		for k := range d {
			out[r*d+k] = turn * rotated[state*d+k]
		}
	}
	return out
}
