package main

import (
	"fmt"
	"io"
	"strings"

	"rundle/internal/calibration"
)

// What is asked for.
const (
	coverage  = 0.95
	mostRatio = 10
)

// page prints results.md.
func page(w io.Writer, records []calibration.Record) {
	fmt.Fprint(w, "# How far the error bars can be trusted\n\n")
	for _, half := range []string{calibration.Test, calibration.HeldBack} {
		models, total := calibration.Total(records, func(r *calibration.Record) bool { return r.Half == half })
		fmt.Fprintf(w, "%s, %d models: %s\n\n", strings.ToUpper(half[:1])+half[1:], models, judged(total))
	}
	fmt.Fprintf(w, `Printed by `+"`go run ./internal/bench/calibrate --markdown`"+`, each model counted once. "Held" is the part of the bars that cover the true error, averaged over the
models; "quoted/true" the median over the models of the median over a model's bars. Asked for: %.0f %% and at most %d. The constants come from the row
"tuning"; the models held back were written after them. "Values" are those of one site, or of neighbours along a leg; "far" are two-point functions from one site to all beyond
the next rung. True errors below 1e-12 count as held and leave the median.

`, 100*coverage, mostRatio)
	summary(w, records).RenderMarkdown()
	fmt.Fprint(w, "\n\n")
	detailed(w, records).RenderMarkdown()
	fmt.Fprint(w, "\n\nSearches whose energy is off by more than quoted:\n\n")
	missed(indented{w}, records)
}

// judged says which of the figures are met.
func judged(s calibration.Scores) string {
	var out []string
	for _, k := range []struct {
		name  string
		score calibration.Score
	}{{"energies", s.Energy}, {"values", s.Local}, {"far correlations", s.Far}, {"entropies", s.Entropy}} {
		verdict := "met"
		switch covered, narrow := k.score.Covered >= coverage, !(k.score.Ratio > mostRatio); {
		case !covered && !narrow:
			verdict = "both missed"
		case !covered:
			verdict = "coverage missed"
		case !narrow:
			verdict = "median missed"
		}
		out = append(out, fmt.Sprintf("%s %s (%.1f %%, %s)", k.name, verdict, 100*k.score.Covered, ratio(k.score.Ratio)))
	}
	return strings.Join(out, "; ") + "."
}

// indented makes a list of lines.
type indented struct{ io.Writer }

func (w indented) Write(line []byte) (int, error) {
	if _, err := io.WriteString(w.Writer, "- "); err != nil {
		return 0, err
	}
	return w.Writer.Write(line)
}
