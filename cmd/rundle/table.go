package main

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"
)

// grid is a plain table: a header, columns two spaces apart, no lines. Numbers stand right where the column is named in right.
func grid(header []string, rows [][]string, right ...string) string {
	w := table.NewWriter()
	style := table.StyleDefault
	style.Options = table.OptionsNoBordersAndSeparators
	style.Box.PaddingLeft, style.Box.PaddingRight = "  ", ""
	style.Format.Header = text.FormatDefault
	w.SetStyle(style)
	var columns []table.ColumnConfig
	for _, name := range right {
		columns = append(columns, table.ColumnConfig{Name: name, Align: text.AlignRight, AlignHeader: text.AlignRight})
	}
	w.SetColumnConfigs(columns)
	w.AppendHeader(rowOf(header))
	for _, r := range rows {
		w.AppendRow(rowOf(r))
	}
	lines := strings.Split(w.Render(), "\n")
	for i := range lines {
		lines[i] = strings.TrimRight(lines[i], " ")
	}
	return strings.Join(lines, "\n") + "\n"
}

func rowOf(cells []string) table.Row {
	r := make(table.Row, len(cells))
	for i, c := range cells {
		r[i] = c
	}
	return r
}

// withError writes a value to two digits of its error: "-3.141593 ± 2.1e-06".
func withError(v, err float64) string { return digits(v, err) + " ± " + shortError(err) }

// digits writes a value as far as its error lets it be known.
func digits(v, err float64) string {
	if a := math.Abs(v); a > err && (a < 1e-6 || a >= 1e15) {
		return strconv.FormatFloat(v, 'g', 12, 64)
	}
	places := 12
	if err > 0 && !math.IsInf(err, 0) {
		places = min(13, max(0, 1-int(math.Floor(math.Log10(err)))))
	}
	s := strconv.FormatFloat(v, 'f', places, 64)
	if strings.Trim(s, "-0.") == "" {
		return strings.TrimPrefix(s, "-")
	}
	return s
}

func shortError(err float64) string { return strconv.FormatFloat(err, 'e', 1, 64) }

// plain writes a number without needless digits.
func plain(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }

// memory writes an amount of memory.
func memory(n float64) string { return scaled(n, 1024, "B", "KiB", "MiB", "GiB", "TiB", "PiB") }

// operations writes a number of floating-point operations.
func operations(n float64) string {
	return scaled(n, 1000, "flop", "kflop", "Mflop", "Gflop", "Tflop", "Pflop", "Eflop")
}

func scaled(n, step float64, units ...string) string {
	k := 0
	for n >= step && k < len(units)-1 {
		n /= step
		k++
	}
	return fmt.Sprintf("%.3g %s", n, units[k])
}

// duration writes seconds.
func duration(s float64) string {
	switch {
	case s < 10:
		return fmt.Sprintf("%.2g s", s)
	case s < 200:
		return fmt.Sprintf("%.0f s", s)
	case s < 3600:
		return fmt.Sprintf("%.0f min", s/60)
	case s < 2*86400:
		return fmt.Sprintf("%.1f h", s/3600)
	}
	return fmt.Sprintf("%.0f days", s/86400)
}

func counted(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}
