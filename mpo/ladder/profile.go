package ladder

import (
	"fmt"
	"hash/fnv"
	"math"
	"math/rand/v2"
	"strings"

	"rundle/mpo/ladder/formula"
)

// profile holds the numbers of a Profile: by rung, by site, or (random ones) both.
type profile struct {
	name   string
	byRung []float64
	bySite []float64
}

// newProfile evaluates p with the constants of s and the profiles before it.
func (s *Scope) newProfile(p Profile) (*profile, error) {
	fail := func(hint, format string, args ...any) error {
		return &Error{Term: p.Name, Part: "profile", Msg: fmt.Sprintf(format, args...), Hint: hint}
	}
	if !identifier(p.Name) {
		return nil, fail("a letter, then letters, digits and _", "profile name %q", p.Name)
	}
	if what := s.taken(p.Name); what != "" {
		return nil, fail("choose another name", "a profile named %q: that is %s", p.Name, what)
	}
	out := &profile{name: p.Name}
	var err error
	switch name, args, ok := distribution(p.Formula); {
	case p.Formula == "" && p.Values == nil:
		return nil, fail("give a formula or values", "an empty profile")
	case p.Formula != "" && p.Values != nil:
		return nil, fail("give one of them", "a profile with a formula and values")
	case p.Values != nil:
		rungs, sites := s.ladder.rungs, len(s.ladder.sites)
		switch len(p.Values) {
		case rungs:
			out.byRung = p.Values
		case sites:
			out.bySite = p.Values
		default:
			return nil, fail(fmt.Sprintf("one per rung (%d) or one per site (%d)", rungs, sites), "%s", plural(len(p.Values), "value"))
		}
	case ok:
		err = s.draw(out, p, name, args)
	default:
		err = s.tabulate(out, p)
	}
	if err != nil {
		return nil, err
	}
	for _, values := range [2][]float64{out.byRung, out.bySite} {
		for i, v := range values {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return nil, fail("profiles are finite numbers", "value %d is %v", i, v)
			}
		}
	}
	return out, nil
}

// distribution splits "uniform(lo, hi)" into the word and what stands between the parentheses.
func distribution(src string) (name, args string, ok bool) {
	t := strings.TrimSpace(src)
	for _, name := range [2]string{"uniform", "normal"} {
		if rest, found := strings.CutPrefix(t, name); found {
			rest = strings.TrimSpace(rest)
			if strings.HasPrefix(rest, "(") && strings.HasSuffix(rest, ")") {
				return name, rest[1 : len(rest)-1], true
			}
		}
	}
	return "", "", false
}

// draw fills a random profile: one stream for the sites, rung by rung, so that a longer ladder begins like a shorter one, and one for
// the rungs. The name enters the seed, so that profiles with one seed differ.
func (s *Scope) draw(out *profile, p Profile, name, args string) error {
	src := &source{term: p.Name, part: "profile", text: p.Formula}
	base := strings.Index(p.Formula, "(") + 1
	comma, depth := -1, 0
	for i := range len(args) {
		switch args[i] {
		case '(', '[':
			depth++
		case ')', ']':
			depth--
		case ',':
			if depth == 0 && comma < 0 {
				comma = i
			}
		}
	}
	meaning := map[string]string{"uniform": "uniform(lowest, highest)", "normal": "normal(mean, sigma)"}[name]
	if comma < 0 {
		return origin{src, base}.fail("write "+meaning, "%s needs two numbers", name)
	}
	a, err := s.numberAt(src, base, args[:comma])
	if err != nil {
		return err
	}
	b, err := s.numberAt(src, base+comma+1, args[comma+1:])
	if err != nil {
		return err
	}
	if name == "uniform" && a > b || name == "normal" && b < 0 {
		return origin{src, base}.fail("write "+meaning, "%s(%s, %s)", name, formatReal(a), formatReal(b))
	}
	h := fnv.New64a()
	h.Write([]byte(p.Name))
	sample := func(n int, stream uint64) []float64 {
		rng := rand.New(rand.NewPCG(p.Seed, h.Sum64()+stream))
		v := make([]float64, n)
		for i := range v {
			if name == "uniform" {
				v[i] = a + (b-a)*rng.Float64()
			} else {
				v[i] = a + b*rng.NormFloat64()
			}
		}
		return v
	}
	out.bySite = sample(len(s.ladder.sites), 0)
	if len(s.ladder.legs) == 1 && !s.ladder.legs[0].ragged {
		out.byRung = out.bySite
	} else {
		out.byRung = sample(s.ladder.rungs, 1)
	}
	return nil
}

// numberAt evaluates a piece of src that begins at offset.
func (s *Scope) numberAt(src *source, offset int, piece string) (float64, error) {
	v, err := s.number(&source{src.term, src.part, piece})
	if e, ok := err.(*Error); ok {
		e.Source, e.Offset = src.text, e.Offset+offset
	}
	return v, err
}

// tabulate fills a profile from a formula of j and leg.
func (s *Scope) tabulate(out *profile, p Profile) error {
	src := &source{term: p.Name, part: "profile", text: p.Formula}
	n, err := src.parsed(formula.Parse(p.Formula))
	if err != nil {
		return err
	}
	byLeg := false
	c := &compiler{source: src, scope: s, slots: 2, inProfile: true, indices: map[string]index{
		"j":   {slot: 0, moves: true, used: new(bool)},
		"leg": {slot: 1, moves: true, used: &byLeg},
	}}
	e, err := c.compile(n)
	if err != nil {
		return err
	}
	f := newFrame(s.ladder, c.slots)
	at := func(leg, rung int) (float64, error) {
		f.begin()
		f.vars[0], f.vars[1] = float64(rung), float64(leg)
		v, err := e.eval(f)
		if err == errAbsent {
			err = origin{src, 0}.fail("", "at rung %d the formula needs a place beyond the ladder", rung)
		}
		if err == nil && (v.ops != nil || imag(v.z) != 0) {
			err = origin{src, 0}.fail("profiles are real numbers", "the value at rung %d is %s", rung, formatNumber(v.z))
		}
		return real(v.z), err
	}
	if !byLeg {
		out.byRung = make([]float64, s.ladder.rungs)
		for r := range out.byRung {
			if out.byRung[r], err = at(0, r); err != nil {
				return err
			}
		}
		return nil
	}
	out.bySite = make([]float64, len(s.ladder.sites))
	for i, spot := range s.ladder.sites {
		if out.bySite[i], err = at(int(spot.leg), int(spot.rung)); err != nil {
			return err
		}
	}
	return nil
}
