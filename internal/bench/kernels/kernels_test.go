package main

import (
	"bytes"
	"encoding/json"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
)

// TestTasks: every row is named once, the quick ones are among all, and each routine stands there.
func TestTasks(t *testing.T) {
	seen := map[string]bool{}
	for _, x := range tasks(false) {
		assert.False(t, seen[x.name()], x.name())
		seen[x.name()] = true
		assert.Positive(t, x.flops, x.name())
	}
	routines := map[string]bool{}
	for _, x := range tasks(true) {
		assert.True(t, seen[x.name()], x.name())
		routines[x.routine] = true
	}
	assert.Len(t, routines, 6)
}

// TestMeasure runs one row of each routine.
func TestMeasure(t *testing.T) {
	name, _ := dense.Kernels()
	defer func() { require.NoError(t, dense.UseKernels(name)) }()
	done := map[string]bool{}
	for _, x := range tasks(true) {
		if done[x.routine] || x.m > 64 {
			continue
		}
		done[x.routine] = true
		for _, r := range x.measure([]string{"go"}, true) {
			assert.Positive(t, r.Gflops, x.name())
			assert.Equal(t, haveReference, r.Ratio > 0, x.name())
		}
	}
	assert.Len(t, done, 6)
}

func TestTable(t *testing.T) {
	var out bytes.Buffer
	table := newTable(&out, []string{"ours"})
	x := task{group: square, routine: "dgemm", op: "nn", m: 1, n: 2, k: 3}
	table.add(x, []row{{Gflops: 4, Reference: 2, Ratio: 2}})
	table.add(x, []row{{Gflops: 1, Reference: 2, Ratio: 0.5}})
	table.end()
	text := strings.Join(strings.Fields(out.String()), " ")
	assert.Contains(t, text, "dgemm nn, square OpenBLAS ours ratio")
	assert.Contains(t, text, "1,2,3 2.0 4.0 2.00")
	assert.Contains(t, text, "worst, geometric mean 0.50 1.00")
}

// TestRun: --json gives objects with the fields that scripts read; what cannot be done is said.
func TestRun(t *testing.T) {
	if haveReference {
		t.Skip("the command may start itself anew")
	}
	name, _ := dense.Kernels()
	defer func() { require.NoError(t, dense.UseKernels(name)) }()
	out, err := runWith(t, "--quick", "--json", "--only", "dgemm nn 4,4,4", "--kernels", "go")
	require.NoError(t, err)
	var r map[string]any
	require.NoError(t, json.Unmarshal([]byte(out), &r))
	for _, key := range []string{"routine", "op", "m", "n", "k", "gflops", "kernels"} {
		assert.Contains(t, r, key)
	}
	_, err = runWith(t, "--only", "nothing")
	assert.ErrorContains(t, err, "no row of that name")
	_, err = runWith(t, "--kernels", "fast")
	assert.ErrorContains(t, err, "unknown kernels")
	_, err = runWith(t, "--only", "(")
	assert.ErrorContains(t, err, "--only")
	_, err = runWith(t, "more")
	assert.ErrorContains(t, err, `"more"`)
}

func runWith(t *testing.T, args ...string) (string, error) {
	t.Helper()
	var out bytes.Buffer
	err := run(args, &out)
	return out.String(), err
}
