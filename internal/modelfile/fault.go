package modelfile

import (
	"bytes"
	"cmp"
	"errors"
	"fmt"
	"slices"
	"sort"
	"strings"
	"unicode/utf8"
)

// Error is one fault of a model file: where, what, and a way out.
type Error struct {
	File         string
	Line, Column int // from 1; columns count characters
	Msg          string
	Hint         string // may be empty
	text         string // the line at fault
}

// Error is one line: "vortex.toml:21:12: unknown key ... (hint)".
func (e *Error) Error() string {
	s := fmt.Sprintf("%s:%d:%d: %s", e.File, e.Line, e.Column, e.Msg)
	if e.Hint != "" {
		s += " (" + e.Hint + ")"
	}
	return s
}

// Caret shows the line at fault and, below it, a caret under the place; "" where the file has no such line, or it is no text.
func (e *Error) Caret() string {
	binary := func(r rune) bool { return r < ' ' && r != '\t' || r == utf8.RuneError }
	if e.text == "" || strings.ContainsFunc(e.text, binary) {
		return ""
	}
	runes := []rune(e.text)
	const width = 160 // a longer line is cut around the place
	from := 0
	if e.Column > width-40 {
		from = e.Column - width/2
	}
	from = min(from, len(runes))
	to := min(from+width, len(runes))
	line := strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f || r == utf8.RuneError {
			return ' '
		}
		return r
	}, string(runes[from:to]))
	return line + "\n" + strings.Repeat(" ", max(0, min(e.Column-1-from, width))) + "^"
}

// Faults returns the *Errors that err is made of, in the order of the file.
func Faults(err error) []*Error {
	if err == nil {
		return nil
	}
	if joined, ok := err.(interface{ Unwrap() []error }); ok {
		var all []*Error
		for _, e := range joined.Unwrap() {
			all = append(all, Faults(e)...)
		}
		return all
	}
	var e *Error
	if errors.As(err, &e) {
		return []*Error{e}
	}
	return nil
}

// maxFaults bounds what one run reports: the first faults tell the most.
const maxFaults = 20

// source is the text of a file and the faults found in it.
type source struct {
	file   string
	data   []byte
	lines  []int // offset of each line's first byte
	faults []*fault
	known  []string // names that formulas may use, for hints
}

type fault struct {
	at        int
	msg, hint string
}

func newSource(file string, data []byte) *source {
	s := &source{file: file, data: data, lines: []int{0}}
	for k := 0; ; {
		n := bytes.IndexByte(data[k:], '\n')
		if n < 0 {
			return s
		}
		k += n + 1
		s.lines = append(s.lines, k)
	}
}

// fault notes a fault at a byte offset.
func (s *source) fault(at int, hint, format string, args ...any) {
	s.faults = append(s.faults, &fault{at: at, hint: hint, msg: fmt.Sprintf(format, args...)})
}

// err joins the faults in the order of the file, nil if there are none.
func (s *source) err() error {
	if len(s.faults) == 0 {
		return nil
	}
	slices.SortStableFunc(s.faults, func(a, b *fault) int { return cmp.Compare(a.at, b.at) })
	s.faults = slices.CompactFunc(s.faults, func(a, b *fault) bool { return *a == *b })
	var all []error
	for i, f := range s.faults {
		if i == maxFaults {
			all = append(all, s.place(f.at, "", fmt.Sprintf("%d more faults follow", len(s.faults)-maxFaults)))
			break
		}
		all = append(all, s.place(f.at, f.hint, f.msg))
	}
	return errors.Join(all...)
}

// place turns an offset into a line and a column.
func (s *source) place(at int, hint, msg string) *Error {
	at = max(0, min(at, len(s.data)))
	line := sort.SearchInts(s.lines, at+1) // number of lines that begin at or before at
	start := s.lines[line-1]
	end := len(s.data)
	if line < len(s.lines) {
		end = s.lines[line] - 1
	}
	return &Error{
		File: s.file, Line: line, Column: utf8.RuneCount(s.data[start:at]) + 1,
		Msg: msg, Hint: hint, text: strings.TrimSuffix(string(s.data[start:max(start, end)]), "\r"),
	}
}
