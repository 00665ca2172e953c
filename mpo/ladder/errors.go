package ladder

import (
	"errors"
	"fmt"
	"strings"

	"rundle/mpo/ladder/formula"
)

// Error is a fault in what the user wrote: which term, where in which of its formulas, and a way out.
type Error struct {
	Term   string // name of the term or profile; "" if the fault is in none
	Part   string // "formula", "where", `each "l"`, ...; "" if the fault is in no formula
	Source string // the formula at fault
	Offset int    // in bytes into Source
	Msg    string
	Hint   string // may be empty
}

// Error is one line: the term, the column, what is wrong, the hint.
func (e *Error) Error() string {
	var b strings.Builder
	if e.Term != "" {
		fmt.Fprintf(&b, "%q: ", e.Term)
	}
	if e.Part != "" && e.Part != "formula" {
		b.WriteString(e.Part + ": ")
	}
	if e.Source != "" {
		fmt.Fprintf(&b, "column %d: ", e.at().Column())
	}
	b.WriteString(e.Msg)
	if e.Hint != "" {
		fmt.Fprintf(&b, " (%s)", e.Hint)
	}
	return b.String()
}

// Caret shows the line of the formula with a caret under the place, "" if the fault is in no formula.
func (e *Error) Caret() string {
	if e.Source == "" {
		return ""
	}
	return e.at().Caret()
}

func (e *Error) at() *formula.Error { return &formula.Error{Source: e.Source, Offset: e.Offset} }

// fromFormula takes over an error of the parser.
func fromFormula(src string, err error) *Error {
	var f *formula.Error
	if errors.As(err, &f) {
		return &Error{Part: "formula", Source: src, Offset: f.Offset, Msg: f.Msg, Hint: f.Hint}
	}
	return &Error{Part: "formula", Source: src, Msg: err.Error()}
}
