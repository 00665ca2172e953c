package main

import (
	"fmt"
	"io"
	"math"
)

// table prints rows as they come and a summary of each group.
type table struct {
	w     io.Writer
	names []string
	group string
	sum   []summary
}

type summary struct {
	worst   float64
	logs    float64
	members int
}

func newTable(w io.Writer, names []string) *table { return &table{w: w, names: names} }

func (t *table) add(x task, rows []row) {
	if g := x.title() + ", " + string(x.group); g != t.group {
		t.end()
		t.group = g
		t.sum = make([]summary, len(t.names))
		against := "OpenBLAS"
		if x.group == workers {
			against = "one thread"
		}
		fmt.Fprintf(t.w, "%-30s %10s", g, against)
		for _, name := range t.names {
			fmt.Fprintf(t.w, " %8s %6s", name, "ratio")
		}
		fmt.Fprintln(t.w)
	}
	shape := fmt.Sprintf("  %d,%d,%d", x.m, x.n, x.k)
	if rows[0].Reference > 0 {
		fmt.Fprintf(t.w, "%-30s %10.1f", shape, rows[0].Reference)
	} else {
		fmt.Fprintf(t.w, "%-30s %10s", shape, "-")
	}
	for i, r := range rows {
		if r.Ratio == 0 {
			fmt.Fprintf(t.w, " %8.1f %6s", r.Gflops, "-")
			continue
		}
		fmt.Fprintf(t.w, " %8.1f %6.2f", r.Gflops, r.Ratio)
		s := &t.sum[i]
		if s.members == 0 || r.Ratio < s.worst {
			s.worst = r.Ratio
		}
		s.logs += math.Log(r.Ratio)
		s.members++
	}
	fmt.Fprintln(t.w)
}

// end prints the summary of the group in hand.
func (t *table) end() {
	switch {
	case t.group == "":
		return
	case t.sum[0].members == 0: // without a reference
		fmt.Fprintln(t.w)
		return
	}
	fmt.Fprintf(t.w, "%-30s %10s", "  worst, geometric mean", "")
	for _, s := range t.sum {
		fmt.Fprintf(t.w, " %8.2f %6.2f", s.worst, math.Exp(s.logs/float64(s.members)))
	}
	fmt.Fprint(t.w, "\n\n")
}
