package main

import (
	"fmt"
	"io"
	"math"
	"slices"
)

// A limit is a figure to reach: a ratio, by each row that it is for or by their geometric mean.
type limit struct {
	what  string
	least float64
	mean  bool
	holds func(r *row) bool // whether it is for that row
}

// limits are for our kernels against OpenBLAS with the same vectors; narrow says whether these are AVX2's, on a machine that may have more.
func limits(narrow bool) []limit {
	products := func(g group, routine string, ops ...string) func(r *row) bool {
		return func(r *row) bool {
			return r.group == g && r.Routine == routine && (len(ops) == 0 || slices.Contains(ops, r.Op))
		}
	}
	two := limit{"two threads, lists above 20 Mflop", 1.9, false, func(r *row) bool { return r.group == workers }}
	if narrow {
		return []limit{
			{"products at AVX2", 0.85, false, func(r *row) bool { return r.group == square || r.group == skinny }},
			two,
		}
	}
	out := []limit{
		{"dgemm nn, tn, nt, square", 0.92, false, products(square, "dgemm", "nn", "tn", "nt")},
		{"dgemm nn, tn, nt, square", 1, true, products(square, "dgemm", "nn", "tn", "nt")},
		{"dgemm tt, square", 0.85, false, products(square, "dgemm", "tt")},
		{"zgemm, square", 1, false, products(square, "zgemm")},
		{"zgemm, square", 1.15, true, products(square, "zgemm")},
		{"odd and skinny", 0.9, false, func(r *row) bool { return r.group == skinny }},
	}
	for _, d := range []struct {
		what     string
		routines []string
		least    []float64 // at 32, 64, 128, 256, 512
	}{
		{"dgesdd, half of the vectors", []string{"dgesdd"}, []float64{0.95, 1.2, 1.4, 1.7, 2}},
		{"zgesdd, half of the vectors", []string{"zgesdd"}, []float64{1, 1.2, 1.5, 1.7, 1.8}},
		{"dsyevd, zheevd", []string{"dsyevd", "zheevd"}, []float64{0.9, 1, 1.2, 1.3, 1.4}},
	} {
		for i, least := range d.least {
			n := 32 << i
			out = append(out, limit{fmt.Sprintf("%s, n = %d", d.what, n), least, false, func(r *row) bool {
				return r.N == n && slices.Contains(d.routines, r.Routine) && (r.group == factors || r.group == eigen)
			}})
		}
	}
	return append(out, two)
}

// A verdict is what the rows say about a limit.
type verdict struct {
	limit
	got   float64
	where string // of the row that is worst
	rows  int
}

func (v *verdict) met() bool { return v.got >= v.least }

// judge compares rows with the limits; those that no row is for are left out. Ratios count as printed, to two digits.
func judge(rows []row, all []limit) []verdict {
	var out []verdict
	for _, l := range all {
		v := verdict{limit: l, got: math.Inf(1)}
		logs := 0.0
		for i := range rows {
			r := &rows[i]
			if r.Ratio == 0 || !l.holds(r) {
				continue
			}
			v.rows++
			logs += math.Log(r.Ratio)
			if r.Ratio < v.got {
				v.got, v.where = r.Ratio, fmt.Sprintf("%s %s %d,%d,%d", r.Routine, r.Op, r.M, r.N, r.K)
			}
		}
		if v.rows == 0 {
			continue
		}
		if l.mean {
			v.got, v.where = math.Exp(logs/float64(v.rows)), ""
		}
		v.got = math.Round(100*v.got) / 100
		out = append(out, v)
	}
	return out
}

// printVerdicts writes a line for each limit and returns how many are missed.
func printVerdicts(w io.Writer, title string, verdicts []verdict) (missed int) {
	if len(verdicts) == 0 {
		return 0
	}
	fmt.Fprintf(w, "%-50s %5s %6s %6s\n", title, "rows", "reach", "got")
	for _, v := range verdicts {
		what, word := v.what, "met"
		if v.mean {
			what += ", geometric mean"
		}
		if !v.met() {
			word = "MISSED"
			missed++
		}
		if v.where != "" {
			word += "  (" + v.where + ")"
		}
		fmt.Fprintf(w, "  %-48s %5d %6.2f %6.2f  %s\n", what, v.rows, v.least, v.got, word)
	}
	fmt.Fprintln(w)
	return missed
}

// mostBytes is what a call may allocate once it has run.
const mostBytes = 0

// printBytes writes which rows allocate more than they may and returns how many do.
func printBytes(w io.Writer, rows []row) (missed int) {
	for i := range rows {
		if r := &rows[i]; r.Bytes > mostBytes {
			fmt.Fprintf(w, "  %s %s %d,%d,%d (%s) allocates %d bytes a call: MISSED\n", r.Routine, r.Op, r.M, r.N, r.K, r.Kernels, r.Bytes)
			missed++
		}
	}
	if missed == 0 {
		fmt.Fprintf(w, "  no allocation a call after the first, in all of %d rows: met\n", len(rows))
	}
	return missed
}
