package modelfile

import (
	"errors"
	"strconv"
	"strings"

	"rundle/mpo/ladder"
	"rundle/mpo/ladder/formula"
)

// blame notes an error of another package at its place: inside the string among near that holds the formula at fault, else at
// the given offset.
func (s *source) blame(err error, at int, near ...*value) {
	var f *formula.Error
	var l *ladder.Error
	switch {
	case errors.As(err, &f):
		s.fault(s.within(f.Source, f.Offset, at, near), f.Hint, "%s", f.Msg)
	case errors.As(err, &l):
		s.fault(s.within(l.Source, l.Offset, at, near), s.guess(l), "%s", l.Msg)
	default:
		s.fault(at, "", "%s", strings.TrimPrefix(err.Error(), "ladder: "))
	}
}

// guess adds to the hint of an error about an unknown name the known one that it resembles.
func (s *source) guess(l *ladder.Error) string {
	_, after, ok := strings.Cut(l.Msg, "unknown ")
	if !ok {
		return l.Hint
	}
	parts := strings.SplitN(after, "\"", 3)
	if len(parts) < 3 {
		return l.Hint
	}
	n := nearest(parts[1], s.known)
	switch {
	case n == "" || n == parts[1]:
		return l.Hint
	case l.Hint == "":
		return "did you mean " + strconv.Quote(n) + "?"
	}
	return "did you mean " + strconv.Quote(n) + "? " + l.Hint
}

// within finds the string that holds a formula; at stands in where there is none.
func (s *source) within(formula string, offset, at int, near []*value) int {
	for _, v := range near {
		if v.kind == text && v.text == formula && formula != "" {
			return s.inside(v, offset)
		}
	}
	return at
}

// syntax notes the fault of a formula that does not parse and reports whether it does.
func (s *source) syntax(v *value, parse func(string) (formula.Node, error)) bool {
	n, err := parse(v.text)
	if err != nil {
		s.blame(err, v.at, v)
		return false
	}
	return s.noRandom(v, n)
}

// noRandom refuses random numbers, which only profiles can hold.
func (s *source) noRandom(v *value, n formula.Node) bool {
	good := true
	formula.Walk(n, func(n formula.Node) bool {
		if c, ok := n.(*formula.Call); ok && (c.Name == "uniform" || c.Name == "normal") {
			s.fault(s.inside(v, c.At), "give it a name in [profile], as in h = \""+c.Name+"(-W, W)\", and use h[leg,rung] here", "random number outside [profile]")
			good = false
		}
		return true
	})
	return good
}
