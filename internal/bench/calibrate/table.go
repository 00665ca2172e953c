package main

import (
	"fmt"
	"io"
	"math"

	"github.com/jedib0t/go-pretty/v6/table"

	"rundle/internal/calibration"
)

// columns of the three kinds of bars.
var columns = table.Row{"energies held", "quoted/true", "values held", "quoted/true", "entropies held", "quoted/true"}

func newTable(w io.Writer, first ...any) table.Writer {
	t := table.NewWriter()
	t.SetOutputMirror(w)
	t.SetStyle(table.StyleLight)
	t.AppendHeader(append(table.Row(first), columns...))
	return t
}

func cells(s calibration.Scores) table.Row {
	var out table.Row
	for _, k := range []calibration.Score{s.Energy, s.Local, s.Entropy} {
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

// detailed prints a row for every model.
func detailed(w io.Writer, records []calibration.Record) {
	t := newTable(w, "model", "answer", "hard", "half", "searches")
	for i := range records {
		r := &records[i]
		hard, half := "", "test"
		if r.Hard {
			hard = "hard"
		}
		if r.Tunes {
			half = "tuning"
		}
		t.AppendRow(append(table.Row{r.Name, r.Source, hard, half, len(r.Cases)}, cells(r.Scores())...))
	}
	t.Render()
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

// summary prints the halves, and the hard models among them.
func summary(w io.Writer, records []calibration.Record) {
	t := newTable(w, "half", "models", "searches")
	row := func(name string, keep func(*calibration.Record) bool) {
		models, total := calibration.Total(records, keep)
		t.AppendRow(append(table.Row{name, models, total.Energy.Bars}, cells(total)...))
	}
	row("tuning", func(r *calibration.Record) bool { return r.Tunes })
	row("test", func(r *calibration.Record) bool { return !r.Tunes })
	row("test, hard", func(r *calibration.Record) bool { return !r.Tunes && r.Hard })
	row("all", func(*calibration.Record) bool { return true })
	t.Render()
}
