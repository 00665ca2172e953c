package formula

import (
	"fmt"
	"strings"
	"unicode/utf8"
)

// Error is a fault in a formula: what is wrong, where, and a way out.
type Error struct {
	Source string // the whole formula
	Offset int    // in bytes, 0 to len(Source)
	Msg    string
	Hint   string // may be empty
}

// Errorf makes an Error; evaluators use it for faults that only they can see.
func Errorf(source string, offset int, hint, format string, args ...any) *Error {
	return &Error{Source: source, Offset: offset, Msg: fmt.Sprintf(format, args...), Hint: hint}
}

// Column counts characters from 1, in the line of the source that holds the fault.
func (e *Error) Column() int {
	before := e.Source[:e.clamped()]
	before = before[strings.LastIndexByte(before, '\n')+1:]
	return utf8.RuneCountInString(before) + 1
}

// Error is one line: the column, what is wrong, the hint.
func (e *Error) Error() string {
	s := fmt.Sprintf("column %d: %s", e.Column(), e.Msg)
	if e.Hint != "" {
		s += " (" + e.Hint + ")"
	}
	return s
}

// Caret shows the line that holds the fault and, below it, a caret under the place.
func (e *Error) Caret() string {
	at := e.clamped()
	start := strings.LastIndexByte(e.Source[:at], '\n') + 1
	end := len(e.Source)
	if k := strings.IndexByte(e.Source[at:], '\n'); k >= 0 {
		end = at + k
	}
	return clean(e.Source[start:end]) + "\n" + strings.Repeat(" ", utf8.RuneCountInString(e.Source[start:at])) + "^"
}

func (e *Error) clamped() int { return max(0, min(e.Offset, len(e.Source))) }

// clean replaces what would disturb a terminal, one character for one.
func clean(s string) string {
	return strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f || r == utf8.RuneError {
			return '?'
		}
		return r
	}, s)
}
