package modelfile

import (
	"errors"
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
		s.fault(s.within(l.Source, l.Offset, at, near), l.Hint, "%s", l.Msg)
	default:
		s.fault(at, "", "%s", strings.TrimPrefix(err.Error(), "ladder: "))
	}
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
	_, err := parse(v.text)
	if err != nil {
		s.blame(err, v.at, v)
	}
	return err == nil
}
