package ladder

import (
	"fmt"
	"slices"
	"strings"

	"rundle/mpo/ladder/formula"
)

// Limits of a ladder.
const (
	MaxSites = 100_000
	MaxRungs = 100_000
)

// Boundary says how the ends are joined.
type Boundary uint8

// Open ends, or Periodic ones.
const (
	Open Boundary = iota
	Periodic
)

// String is "open" or "periodic".
func (b Boundary) String() string {
	if b == Periodic {
		return "periodic"
	}
	return "open"
}

// Part is an argument of New: a Leg or an option such as Across.
type Part interface{ apply(*plan) error }

// plan collects the parts of a ladder.
type plan struct {
	legs   []legPart
	across Boundary
}

// Ladder is a set of sites on legs and rungs. Sites are numbered rung by rung, legs in the order given; a leg may be
// missing on some rungs. A Ladder never changes and may be shared.
type Ladder struct {
	rungs    int
	boundary Boundary
	across   Boundary
	legs     []leg
	sites    []spot
	index    []int32 // [leg*rungs+rung]: site, or -1
}

type leg struct {
	name   string
	site   Site
	ragged bool
}

type spot struct{ leg, rung int32 }

// New returns a ladder with the given number of rungs; boundary joins the ends along the legs. Parts are legs (Leg) and Across.
func New(rungs int, boundary Boundary, parts ...Part) (*Ladder, error) {
	if rungs < 1 || rungs > MaxRungs {
		return nil, &Error{Msg: fmt.Sprintf("a ladder of %d rungs", rungs), Hint: fmt.Sprintf("expected 1 to %d", MaxRungs)}
	}
	if boundary > Periodic {
		return nil, &Error{Msg: "unknown boundary", Hint: "Open or Periodic"}
	}
	var p plan
	for _, part := range parts {
		if err := part.apply(&p); err != nil {
			return nil, err
		}
	}
	if len(p.legs) == 0 {
		return nil, &Error{Msg: "a ladder without legs", Hint: "give at least one leg"}
	}
	if len(p.legs) > MaxSites || rungs*len(p.legs) > MaxSites {
		return nil, &Error{Msg: fmt.Sprintf("a ladder of %d rungs and %d legs", rungs, len(p.legs)), Hint: fmt.Sprintf("at most %d sites", MaxSites)}
	}
	l := &Ladder{rungs: rungs, boundary: boundary, across: p.across, index: make([]int32, rungs*len(p.legs))}
	for i := range l.index {
		l.index[i] = -1
	}
	on := make([][]bool, len(p.legs))
	for k := range p.legs {
		var err error
		if on[k], err = l.addLeg(&p.legs[k]); err != nil {
			return nil, err
		}
	}
	for r := range rungs {
		for k := range l.legs {
			if on[k][r] {
				l.index[k*rungs+r] = int32(len(l.sites))
				l.sites = append(l.sites, spot{int32(k), int32(r)})
			}
		}
	}
	return l, nil
}

// addLeg checks a leg and returns the rungs it lives on.
func (l *Ladder) addLeg(p *legPart) ([]bool, error) {
	if err := checkLegName(p.name); err != nil {
		return nil, err
	}
	site := p.site
	for _, g := range l.legs {
		if g.name == p.name {
			return nil, &Error{Msg: fmt.Sprintf("two legs named %q", p.name), Hint: "give each leg its own name"}
		}
		if g.site.like(site) {
			site = g.site
		}
	}
	if err := site.check(); err != nil {
		return nil, &Error{Msg: fmt.Sprintf("leg %q: %v", p.name, err)}
	}
	on, err := p.where(l.rungs)
	if err != nil {
		return nil, err
	}
	l.legs = append(l.legs, leg{name: p.name, site: site, ragged: slices.Contains(on, false)})
	return on, nil
}

// Rungs returns the number of rungs.
func (l *Ladder) Rungs() int { return l.rungs }

// Boundary tells how the ends along the legs are joined.
func (l *Ladder) Boundary() Boundary { return l.boundary }

// AcrossBoundary tells whether the last leg neighbours the first.
func (l *Ladder) AcrossBoundary() Boundary { return l.across }

// Sites returns the number of sites.
func (l *Ladder) Sites() int { return len(l.sites) }

// Legs returns the names of the legs, in order.
func (l *Ladder) Legs() []string {
	names := make([]string, len(l.legs))
	for i, g := range l.legs {
		names[i] = g.name
	}
	return names
}

// LegSite returns the kind of site on a leg.
func (l *Ladder) LegSite(name string) (Site, bool) {
	k := l.legIndex(name)
	if k < 0 {
		return Site{}, false
	}
	return l.legs[k].site, true
}

func (l *Ladder) legIndex(name string) int {
	return slices.IndexFunc(l.legs, func(g leg) bool { return g.name == name })
}

// SiteIndex returns the number of the site on a leg and rung, false if there is none.
func (l *Ladder) SiteIndex(leg string, rung int) (int, bool) {
	k := l.legIndex(leg)
	if k < 0 || rung < 0 || rung >= l.rungs {
		return 0, false
	}
	i := l.index[k*l.rungs+rung]
	return int(i), i >= 0
}

// SiteAt returns where site i is and what it is.
func (l *Ladder) SiteAt(i int) (leg string, rung int, site Site) {
	s := l.sites[i]
	g := &l.legs[s.leg]
	return g.name, int(s.rung), g.site
}

// Site returns what site i is.
func (l *Ladder) Site(i int) Site { return l.legs[l.sites[i].leg].site }

// FormatOp writes an operator of site i: "b^+[a,3]".
func (l *Ladder) FormatOp(i int, op OpID) string {
	leg, rung, site := l.SiteAt(i)
	return site.Format(op, leg, rung)
}

// Equal reports whether two ladders have the same shape, names and site kinds.
func (l *Ladder) Equal(m *Ladder) bool {
	if l == m {
		return true
	}
	return l.rungs == m.rungs && l.boundary == m.boundary && l.across == m.across && slices.Equal(l.index, m.index) &&
		slices.EqualFunc(l.legs, m.legs, func(a, b leg) bool { return a.name == b.name && a.site.like(b.site) })
}

// Warnings names what is allowed but seldom meant.
func (l *Ladder) Warnings() []string {
	var w []string
	if l.boundary == Periodic && l.rungs < 3 {
		w = append(w, fmt.Sprintf("a ring of %s: %s; use boundary = \"open\" if that is not meant", plural(l.rungs, "rung"),
			map[int]string{1: "each site is its own neighbour", 2: "each pair of neighbours counts twice"}[l.rungs]))
	}
	if l.across == Periodic && len(l.legs) < 3 {
		w = append(w, fmt.Sprintf("a tube of %s: %s; use across = \"open\" if that is not meant", plural(len(l.legs), "leg"),
			map[int]string{1: "each site is its own neighbour", 2: "each pair of neighbours counts twice"}[len(l.legs)]))
	}
	return w
}

func plural(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	if stem, ok := strings.CutSuffix(what, "ex"); ok {
		return fmt.Sprintf("%d %sices", n, stem) // index
	}
	return fmt.Sprintf("%d %ss", n, what)
}

// reserved names cannot be given to legs, constants, profiles or indices.
func reserved(name string) bool {
	switch name {
	case "i", "j", "pi", "rungs", "legs", "leg", "sum", "prod", "and", "or", "not", "uniform", "normal", "b", "c", "n", "S", "Z", "X", "c_up", "c_down", "n_up", "n_down":
		return true
	}
	_, ok := formula.Functions[name]
	return ok
}
