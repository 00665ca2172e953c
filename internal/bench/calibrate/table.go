package main

import (
	"fmt"
	"io"
	"math"

	"github.com/jedib0t/go-pretty/v6/table"

	"rundle/internal/calibration"
)

// columns of the kinds of bars.
var columns = table.Row{"energies held", "quoted/true", "values held", "quoted/true", "far held", "quoted/true", "entropies held", "quoted/true"}

func newTable(w io.Writer, first ...any) table.Writer {
	t := table.NewWriter()
	t.SetOutputMirror(w)
	t.SetStyle(table.StyleLight)
	t.AppendHeader(append(table.Row(first), columns...))
	return t
}

func cells(s calibration.Scores) table.Row {
	var out table.Row
	for _, k := range []calibration.Score{s.Energy, s.Local, s.Far, s.Entropy} {
		if k.Bars == 0 {
			out = append(out, "", "")
			continue
		}
		out = append(out, fmt.Sprintf("%.1f %%", 100*k.Covered), ratio(k.Ratio))
	}
	return out
}

// ratio is a dash where all errors are rounding.
func ratio(x float64) string {
	if math.IsNaN(x) {
		return "-"
	}
	return fmt.Sprintf("%.3g", x)
}

// detailed has a row for every model.
func detailed(w io.Writer, records []calibration.Record) table.Writer {
	t := newTable(w, "model", "answer", "hard", "half", "searches")
	for i := range records {
		r := &records[i]
		hard := ""
		if r.Hard {
			hard = "hard"
		}
		t.AppendRow(append(table.Row{r.Name, r.Source, hard, r.Half, len(r.Cases)}, cells(r.Scores())...))
	}
	return t
}

// missed lists the searches whose energy is off by more than quoted.
func missed(w io.Writer, records []calibration.Record) {
	for i := range records {
		r := &records[i]
		for _, c := range r.Cases {
			if !r.Holds(c.Energy) {
				fmt.Fprintf(w, "%s: precision %.0e, cap %d, bond %d, %s: off by %.2g, quoted %.2g\n", r.Name, c.Precision, c.Bond, c.Reached, c.Verdict, c.Energy.True, c.Energy.Quoted)
			}
		}
	}
}

// summary has the halves, and the hard models among them.
func summary(w io.Writer, records []calibration.Record) table.Writer {
	t := newTable(w, "half", "models", "searches")
	row := func(name string, keep func(*calibration.Record) bool) {
		models, total := calibration.Total(records, keep)
		t.AppendRow(append(table.Row{name, models, total.Energy.Bars}, cells(total)...))
	}
	tunes := func(r *calibration.Record) bool { return r.Half == calibration.Tuning }
	for _, half := range []string{calibration.Tuning, calibration.Test, calibration.HeldBack} {
		row(half, func(r *calibration.Record) bool { return r.Half == half })
	}
	row("not tuning", func(r *calibration.Record) bool { return !tunes(r) })
	row("not tuning, hard", func(r *calibration.Record) bool { return !tunes(r) && r.Hard })
	row("all", func(*calibration.Record) bool { return true })
	return t
}
