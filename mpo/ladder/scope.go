package ladder

import (
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"

	"rundle/mpo/ladder/formula"
)

const pi = complex(math.Pi, 0)

// Constants are the named numbers of formulas.
type Constants map[string]float64

// Scope is what the names in formulas mean: a ladder, constants and profiles. It never changes and may be shared.
type Scope struct {
	ladder    *Ladder
	constants Constants
	profiles  []Profile
	tables    []*profile
}

// Profile gives numbers that depend on the place, used in formulas as h[rung] or h[leg,rung].
type Profile struct {
	Name string `json:"name"`
	// Formula is a formula of j, leg (its position, from 0) and constants, or "uniform(lowest, highest)" or "normal(mean, sigma)": independent numbers
	// for all sites, and others for the rungs where it is used with a rung alone. Empty: Values.
	Formula string    `json:"formula,omitempty"`
	Values  []float64 `json:"values,omitempty"` // one per rung, or one per site in the order of the sites
	Seed    uint64    `json:"seed,omitempty"`   // of a random profile
}

// NewScope checks the constants and evaluates the profiles, each of which may use those before it.
func NewScope(l *Ladder, constants Constants, profiles ...Profile) (*Scope, error) {
	s := &Scope{ladder: l, constants: Constants{}}
	for _, name := range slices.Sorted(maps.Keys(constants)) {
		v := constants[name]
		switch what := s.taken(name); {
		case !identifier(name):
			return nil, &Error{Msg: fmt.Sprintf("constant name %q", name), Hint: "a letter, then letters, digits and _"}
		case what != "":
			return nil, &Error{Msg: fmt.Sprintf("a constant named %q: that is %s", name, what), Hint: "choose another name"}
		case math.IsNaN(v) || math.IsInf(v, 0):
			return nil, &Error{Msg: fmt.Sprintf("constant %q is %v", name, v), Hint: "expected a finite number"}
		}
		s.constants[name] = v
	}
	for _, p := range profiles {
		t, err := s.newProfile(p)
		if err != nil {
			return nil, err
		}
		p.Values = slices.Clone(p.Values)
		s.profiles, s.tables = append(s.profiles, p), append(s.tables, t)
	}
	return s, nil
}

// Ladder returns the ladder.
func (s *Scope) Ladder() *Ladder { return s.ladder }

// Constants returns a copy of the constants.
func (s *Scope) Constants() Constants { return maps.Clone(s.constants) }

// Profiles returns a copy of the profiles.
func (s *Scope) Profiles() []Profile { return slices.Clone(s.profiles) }

// Number evaluates a formula of constants; it must be real.
func (s *Scope) Number(src string) (float64, error) {
	return s.number(&source{part: "formula", text: src})
}

func (s *Scope) number(src *source) (float64, error) {
	n, err := src.parsed(formula.Parse(src.text))
	if err != nil {
		return 0, err
	}
	c := &compiler{source: src, scope: s, indices: map[string]index{}}
	e, err := c.compile(n)
	if err != nil {
		return 0, err
	}
	v, err := e.eval(newFrame(s.ladder, c.slots))
	if err != nil {
		return 0, err
	}
	at := origin{src, 0}
	switch {
	case v.ops != nil:
		return 0, at.fail("", "an operator where a number is expected")
	case math.Abs(imag(v.z)) > 1e-14*math.Abs(real(v.z)): // roots of negative numbers leave rounding
		return 0, at.fail("", "expected a real number, got %s", formatNumber(v.z))
	case !finite(v.z):
		return 0, at.fail("", "the result is not a finite number")
	}
	return real(v.z), nil
}

// constantRange evaluates "0..rungs-2".
func constantRange(span string, rungs int) (from, to int, err *Error) {
	s := &Scope{ladder: &Ladder{rungs: rungs}}
	src := &source{part: "range", text: span}
	var bounds [2]int
	a, b, perr := formula.ParseRange(span)
	if perr != nil {
		return 0, 0, src.located(perr).(*Error)
	}
	c := &compiler{source: src, scope: s, indices: map[string]index{}}
	for k, n := range []formula.Node{a, b} {
		w, err := c.whole(n)
		if err == nil {
			bounds[k], err = w.eval(newFrame(s.ladder, c.slots))
		}
		if err != nil {
			return 0, 0, origin{src, 0}.wrap(err).(*Error)
		}
	}
	return bounds[0], bounds[1], nil
}

// taken tells what a name already means, "" if nothing.
func (s *Scope) taken(name string) string {
	switch {
	case reserved(name):
		return "a reserved name"
	case s.ladder.legIndex(name) >= 0:
		return "a leg"
	case s.profile(name) != nil:
		return "a profile"
	}
	if _, ok := s.constants[name]; ok {
		return "a constant"
	}
	return ""
}

func (s *Scope) profile(name string) *profile {
	for _, p := range s.tables {
		if p.name == name {
			return p
		}
	}
	return nil
}

// isOperator reports whether some leg has the operator.
func (s *Scope) isOperator(name, super string) bool {
	return slices.ContainsFunc(s.ladder.legs, func(g leg) bool {
		_, ok := g.site.Symbol(name, super)
		return ok
	})
}

func (l *Ladder) legNames() string { return strings.Join(l.Legs(), ", ") }

func rungHint(n int) string {
	if n == 1 {
		return "the only rung is 0"
	}
	return fmt.Sprintf("rungs are 0..%d", n-1)
}
