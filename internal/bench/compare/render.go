package main

import (
	"fmt"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"
)

// render makes the table of all rows.
func render(lines []line) string {
	w := table.NewWriter()
	w.SetStyle(table.StyleLight)
	w.Style().Format.Header = text.FormatDefault
	w.AppendHeader(table.Row{"row", "Rundle", "baseline", "figure", "target", "", "note"})
	right := func(name string) table.ColumnConfig {
		return table.ColumnConfig{Name: name, Align: text.AlignRight, AlignHeader: text.AlignRight}
	}
	w.SetColumnConfigs([]table.ColumnConfig{right("Rundle"), right("baseline"), right("figure"), right("target"), {Name: "note", WidthMax: 70}})
	for _, l := range lines {
		bound := "at least"
		if l.AtMost {
			bound = "at most"
		}
		w.AppendRow(table.Row{l.Row, l.Rundle, l.Baseline, fmt.Sprintf("%.2f", l.Figure), fmt.Sprintf("%s %g", bound, l.Target), l.verdict(), l.Note})
	}
	return w.Render() + "\n"
}
