package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"

	"rundle/internal/modelfile"
	"rundle/internal/solve"
)

func TestCodeOf(t *testing.T) {
	_, faulty := modelfile.Parse("m.toml", []byte("x = 1"))
	for _, c := range []struct {
		name string
		err  error
		want int
	}{
		{"none", nil, 0},
		{"usage", &usageError{"no", ""}, 2},
		{"refusal", fmt.Errorf("wrapped: %w", &solve.Refusal{Err: errors.New("full")}), 2},
		{"model file", faulty, 2},
		{"signal", errors.Join(errStopped, context.Canceled), 75},
		{"other", errors.New("svd"), 1},
	} {
		t.Run(c.name, func(t *testing.T) { assert.Equal(t, c.want, codeOf(c.err)) })
	}
}

// TestPanic: a panic anywhere ends in exit code 1 with a short report.
func TestPanic(t *testing.T) {
	var stderr bytes.Buffer
	code, err := guard(&stderr, func() (int, error) {
		var broken []int
		return broken[3], nil
	})
	assert.Equal(t, exitInternal, code)
	assert.ErrorContains(t, err, "internal error: runtime error: index out of range [3]")
	report := stderr.String()
	assert.Contains(t, report, "rundle: internal error: runtime error: index out of range [3]")
	assert.Contains(t, report, "not in your model")
	assert.Contains(t, report, "rundle "+release)
	assert.Less(t, strings.Index(report, "exit_test.go:"), strings.Index(report, "exit.go:"), "the frames of the recovery go before the fault")
	assert.LessOrEqual(t, strings.Count(report, "\n"), reportLines+4)
}

// TestPanicDocument: with --json a panic leaves one document on standard output.
func TestPanicDocument(t *testing.T) {
	var stdout, stderr bytes.Buffer
	c := &console{stdout: &stdout, stderr: &stderr, json: true}
	code := c.finish(guard(&stderr, func() (int, error) { panic("blocks [2 3] and [3 3]\nmore") }))
	assert.Equal(t, exitInternal, code)
	assert.JSONEq(t, `{"format": "rundle-error/1", "exit": 1, "errors": [{"message": "internal error: blocks [2 3] and [3 3]"}]}`, stdout.String())
	assert.NotContains(t, stderr.String(), "more\n")
}

// TestEachErrorOnce: an error is shown once, whatever its kind.
func TestEachErrorOnce(t *testing.T) {
	var stdout, stderr bytes.Buffer
	assert.Equal(t, exitInput, run([]string{"melt"}, &stdout, &stderr))
	assert.Equal(t, 1, strings.Count(stderr.String(), "unknown command"))
	assert.Empty(t, stdout.String())
}
