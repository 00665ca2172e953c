package main

import (
	"fmt"
	"io"
	"slices"
	"strings"

	"rundle/internal/solve"
)

type checkCommand struct {
	File string `arg:"" help:"Model file (TOML)."`
}

func (k checkCommand) run(c *console) (int, error) {
	m, err := load(k.File)
	if err != nil {
		return 0, err
	}
	e, err := solve.Explain(m)
	if err != nil {
		return 0, err
	}
	if c.json {
		return exitDone, c.document(e)
	}
	_, err = io.WriteString(c.stdout, explanation(e))
	return exitDone, err
}

// explanation lays out what a model means.
func explanation(e *solve.Explanation) string {
	var b strings.Builder
	if e.Title != "" {
		fmt.Fprintln(&b, e.Title)
	}
	fmt.Fprintf(&b, "%s, hash %.12s\n\n", e.File, e.Hash)
	fmt.Fprintf(&b, "unit cell\n%s\n", drawCell(e.Cell))
	fmt.Fprintf(&b, "%s: %s, %s along the legs, %s across\n%s\n", counted(e.Sites, "site"), counted(e.Rungs, "rung"), e.Boundary, e.Across, legTable(e.Legs))
	fmt.Fprintf(&b, "terms, %s of site operators in all\n%s\n", counted(e.Products, "product"), termTable(e.Terms))
	b.WriteString(chargeLines(e))
	b.WriteString(arithmeticLine(e))
	for _, leg := range e.RotatedLegs() {
		fmt.Fprintf(&b, "rotation: on leg %q %s\n", leg, e.Rotations[leg])
	}
	fmt.Fprintf(&b, "operator: bond dimensions up to %d\n\n", slices.Max(e.MPOBonds))
	fmt.Fprintf(&b, "forecast\n%s", forecastTable(e.Forecast))
	if len(e.Observations) > 0 {
		fmt.Fprintf(&b, "\nobservations\n%s", observedTable(e.Observations))
	}
	if len(e.Warnings) > 0 {
		b.WriteString("\n")
	}
	for _, w := range e.Warnings {
		fmt.Fprintf(&b, "warning: %s\n", w)
	}
	return b.String()
}

func legTable(legs []solve.LegFacts) string {
	var rows [][]string
	for _, l := range legs {
		rows = append(rows, []string{l.Name, l.Site, fmt.Sprint(l.Sites), fmt.Sprint(l.Dim)})
	}
	return grid([]string{"leg", "site", "sites", "states"}, rows, "sites", "states")
}

func termTable(terms []solve.TermFacts) string {
	var rows [][]string
	for _, t := range terms {
		name := t.Name
		if name == "" {
			name = t.Formula
		}
		example := t.Example
		if t.At != "" {
			example = t.At + ": " + example
		}
		rows = append(rows, []string{name, fmt.Sprint(t.Places), fmt.Sprint(t.Products), example})
	}
	return grid([]string{"term", "places", "products", "example"}, rows, "places", "products")
}

func chargeLines(e *solve.Explanation) string {
	if len(e.Charges) == 0 {
		return "charges: nothing is conserved\n"
	}
	var parts []string
	for _, c := range e.Charges {
		value := "free"
		if c.Value != nil {
			value = "= " + plain(*c.Value)
		}
		parts = append(parts, fmt.Sprintf("%s %s (%s)", c.Name, value, c.Meaning))
	}
	line := "charges: " + strings.Join(parts, ", ") + "\n"
	if e.Undivided {
		line += "  more is conserved than these tell apart\n"
	}
	return line
}

func arithmeticLine(e *solve.Explanation) string {
	if e.Rewritten != "" {
		return fmt.Sprintf("arithmetic: real, %s\n", e.Rewritten)
	}
	if e.Arithmetic == "real" {
		return "arithmetic: real\n"
	}
	if e.Loop == "" {
		return "arithmetic: complex\n"
	}
	return fmt.Sprintf("arithmetic: complex; %s\n", e.Loop)
}

// forecastRate is the speed, in operations a second, that the forecast of times assumes.
const forecastRate = 10e9

// diskRate is the speed, in bytes a second, that the forecast of the time to save assumes.
const diskRate = 200e6

func forecastTable(all []solve.Forecast) string {
	var rows [][]string
	for _, f := range all {
		rows = append(rows, []string{fmt.Sprint(f.Bond), memory(f.State), memory(f.Environments), operations(f.Flops), duration(f.Flops / forecastRate), duration(f.State / diskRate)})
	}
	columns := []string{"bond dimension", "state", "environments", "a sweep", "at 10 Gflop/s", "to save at 200 MB/s"}
	return grid(columns, rows, columns...)
}

func observedTable(all []solve.ObservedFacts) string {
	var rows [][]string
	for _, o := range all {
		rows = append(rows, []string{o.Name, o.Kind, fmt.Sprint(o.Values)})
	}
	return grid([]string{"name", "kind", "values"}, rows, "values")
}
