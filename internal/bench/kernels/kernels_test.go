package main

import (
	"bytes"
	"encoding/json"
	"fmt"
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

// TestJudge: a limit is for its rows alone, and one row below it is named.
func TestJudge(t *testing.T) {
	rows := []row{
		{Routine: "dgemm", Op: "nn", M: 16, N: 16, K: 16, Ratio: 0.914, group: square},
		{Routine: "dgemm", Op: "tn", M: 16, N: 16, K: 16, Ratio: 1.8, group: square},
		{Routine: "dgemm", Op: "tt", M: 16, N: 16, K: 16, Ratio: 0.849, group: square},
		{Routine: "dgemm", Op: "nn", M: 16, N: 2, K: 16, Ratio: 0.9, group: skinny},
		{Routine: "dgesdd", M: 64, N: 64, K: 32, Ratio: 1.19, group: factors},
		{Routine: "zheevd", M: 64, N: 64, K: 64, Ratio: 1.01, group: eigen},
		{Routine: "dgemm", Op: "nt", M: 16, N: 16, K: 16, group: square}, // without a reference
		{Routine: "dgemm", Op: "nn", M: 1, N: 1, K: 1, Ratio: 0.1, group: tiny},
		{Routine: "dgemm", Op: "list", Ratio: 1.95, group: workers},
	}
	got := map[string]bool{}
	verdicts := judge(rows, limits(false))
	for _, v := range verdicts {
		got[fmt.Sprintf("%s %v %v %d", v.what, v.mean, v.least, v.rows)] = v.met()
	}
	assert.Equal(t, map[string]bool{
		"dgemm nn, tn, nt, square false 0.92 2":           false,
		"dgemm nn, tn, nt, square true 1 2":               true,
		"dgemm tt, square false 0.85 1":                   true, // 0.849 is 0.85 as printed
		"odd and skinny false 0.9 1":                      true,
		"dgesdd, half of the vectors, n = 64 false 1.2 1": false,
		"dsyevd, zheevd, n = 64 false 1 1":                true,
		"two threads, lists above 20 Mflop false 1.9 1":   true,
	}, got)
	var out bytes.Buffer
	assert.Equal(t, 2, printVerdicts(&out, "title", verdicts))
	assert.Contains(t, out.String(), "MISSED  (dgemm nn 16,16,16)")
	assert.Len(t, judge(rows, limits(true)), 2)
	out.Reset()
	assert.Zero(t, printBytes(&out, rows))
	rows[0].Bytes = 8
	assert.Equal(t, 1, printBytes(&out, rows))
}

// TestSummarize: AVX-512 is judged against AVX-512 alone, and lists by themselves.
func TestSummarize(t *testing.T) {
	rows := []row{{Routine: "dgemm", Op: "nn", Ratio: 0.5, Kernels: "avx512", group: square}, {Routine: "dgemm", Op: "list", Ratio: 1, Kernels: "avx2", group: workers}}
	var out bytes.Buffer
	want := 1 // the list
	if wideReference() {
		want = 3 // and the product, of itself and in the mean
	}
	assert.Equal(t, want, summarize(&out, []string{"avx512", "avx2", "go"}, rows))
}

// TestWorkers: the lists are as long as they say, and allocate nothing.
func TestWorkers(t *testing.T) {
	name, _ := dense.Kernels()
	defer func() { require.NoError(t, dense.UseKernels(name)) }()
	for _, l := range blockLists(true) {
		assert.Greater(t, l.flops, 20e6)
	}
	r := newList[float64]("dgemm", 1, 60, 24, 96, 1).measure(name, 1e-6)
	assert.Positive(t, r.Gflops)
	assert.Positive(t, r.Ratio)
}

func runWith(t *testing.T, args ...string) (string, error) {
	t.Helper()
	var out bytes.Buffer
	err := run(args, &out)
	return out.String(), err
}
