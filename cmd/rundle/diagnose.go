package main

import (
	"errors"
	"fmt"
	"strings"

	"rundle/internal/modelfile"
)

// diagnose prints an error for people: faults of a model file with the line and a caret under the place.
func (c *console) diagnose(err error) {
	if faults := modelfile.Faults(err); len(faults) > 0 {
		for _, f := range faults {
			c.say("%s:%d:%d: %s", f.File, f.Line, f.Column, f.Msg)
			if caret := f.Caret(); caret != "" {
				c.say("    %s", strings.ReplaceAll(caret, "\n", "\n    "))
			}
			if f.Hint != "" {
				c.say("  %s", f.Hint)
			}
		}
		return
	}
	c.say("rundle: %s", err)
	var usage *usageError
	if errors.As(err, &usage) && usage.hint != "" {
		c.say("  %s", usage.hint)
	}
}

// errorDocument is the JSON document of a command that failed.
type errorDocument struct {
	Format string       `json:"format"`
	Exit   int          `json:"exit"`
	Errors []errorPlace `json:"errors"`
}

type errorPlace struct {
	File    string `json:"file,omitempty"`
	Line    int    `json:"line,omitempty"`
	Column  int    `json:"column,omitempty"`
	Message string `json:"message"`
	Hint    string `json:"hint,omitempty"`
}

func (c *console) documentError(code int, err error) {
	d := errorDocument{Format: "rundle-error/1", Exit: code}
	for _, f := range modelfile.Faults(err) {
		d.Errors = append(d.Errors, errorPlace{f.File, f.Line, f.Column, f.Msg, f.Hint})
	}
	if len(d.Errors) == 0 {
		place := errorPlace{Message: err.Error()}
		var usage *usageError
		if errors.As(err, &usage) {
			place.Hint = usage.hint
		}
		d.Errors = append(d.Errors, place)
	}
	if err := c.document(d); err != nil {
		fmt.Fprintln(c.stderr, "rundle: standard output:", err)
	}
}
