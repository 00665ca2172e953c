package ladder

import (
	"fmt"
	"slices"

	"rundle/mpo/ladder/formula"
)

// legPart is a leg as given to New.
type legPart struct {
	name   string
	site   Site
	list   []int
	some   bool
	span   string
	ranged bool
}

// LegOption restricts a leg.
type LegOption func(*legPart)

// Leg is a leg with a name and a kind of site, on all rungs unless an option says otherwise.
func Leg(name string, site Site, options ...LegOption) Part {
	p := legPart{name: name, site: site}
	for _, o := range options {
		o(&p)
	}
	return p
}

// OnRungs puts a leg on the listed rungs only.
func OnRungs(rungs ...int) LegOption {
	return func(p *legPart) { p.list, p.some = slices.Clone(rungs), true }
}

// OnRange puts a leg on a range of rungs such as "0..rungs-2", both ends included.
func OnRange(span string) LegOption {
	return func(p *legPart) { p.span, p.ranged = span, true }
}

func (p legPart) apply(to *plan) error {
	to.legs = append(to.legs, p)
	return nil
}

type acrossPart Boundary

// Across joins the last leg to the first (Periodic: a tube) for shifts of legs; Open is the default.
func Across(b Boundary) Part { return acrossPart(b) }

func (a acrossPart) apply(to *plan) error {
	if Boundary(a) > Periodic {
		return &Error{Msg: "unknown boundary across", Hint: "Open or Periodic"}
	}
	to.across = Boundary(a)
	return nil
}

// where tells on which rungs the leg has a site.
func (p *legPart) where(rungs int) ([]bool, error) {
	on := make([]bool, rungs)
	switch {
	case p.ranged:
		from, to, err := constantRange(p.span, rungs)
		if err != nil {
			err.Part = fmt.Sprintf("rungs of leg %q", p.name)
			return nil, err
		}
		if from < 0 || to >= rungs || from > to {
			return nil, p.outside(fmt.Sprintf("%d..%d", from, to), rungs)
		}
		for r := from; r <= to; r++ {
			on[r] = true
		}
	case p.some:
		if len(p.list) == 0 {
			return nil, &Error{Msg: fmt.Sprintf("leg %q has no rungs", p.name), Hint: "list at least one"}
		}
		for _, r := range p.list {
			if r < 0 || r >= rungs {
				return nil, p.outside(fmt.Sprint(r), rungs)
			}
			if on[r] {
				return nil, &Error{Msg: fmt.Sprintf("leg %q: rung %d is listed twice", p.name, r)}
			}
			on[r] = true
		}
	default:
		for r := range on {
			on[r] = true
		}
	}
	return on, nil
}

func (p *legPart) outside(what string, rungs int) error {
	return &Error{Msg: fmt.Sprintf("leg %q: rungs %s out of range", p.name, what), Hint: fmt.Sprintf("rungs are 0..%d", rungs-1)}
}

// checkLegName accepts identifiers that no formula reads otherwise.
func checkLegName(name string) error {
	if !identifier(name) {
		return &Error{Msg: fmt.Sprintf("leg name %q", name), Hint: "a letter, then letters, digits and _"}
	}
	if reserved(name) && name != "b" && name != "c" && name != "n" && name != "S" && name != "Z" && name != "X" {
		return &Error{Msg: fmt.Sprintf("leg name %q is reserved", name), Hint: "choose another"}
	}
	return nil
}

// identifier reports whether a formula reads name as one name.
func identifier(name string) bool {
	if len(name) > 64 {
		return false
	}
	n, err := formula.Parse(name)
	if err != nil {
		return false
	}
	id, ok := n.(*formula.Name)
	return ok && id.Ident == name
}
