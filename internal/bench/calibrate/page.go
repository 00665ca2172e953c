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
		if models == 0 {
			continue
		}
		fmt.Fprintf(w, "%s, %d models: %s\n\n", strings.ToUpper(half[:1])+half[1:], models, judged(total))
	}
	fmt.Fprintf(w, `Printed by `+"`go run ./internal/bench/calibrate --markdown`"+`, each model counted once. "Held" is the part of the bars that cover the true error, averaged over the
models; "quoted/true" the median over the models of the median over a model's bars. Asked for: %.0f %% and at most %d. The constants come from the row
"tuning"; the figures of the models held back were looked at when they stood. "Values" are those of one site, or of neighbours along a leg; "far" are two-point functions from one site to all beyond
the next rung. True errors below 1e-12 of the size count as held and leave the median.

What forbids better: a scan of the constants on the tuning half holds %.0f %% of its values at a median of 7.2 at best, and the halves differ by more than what is left. A bar is made of what a search measures (the change since the
bond settled before, the excess of energy, the residual, the gap seen), and how much of these an operator feels differs from model to model: quotients go from 1 to 1e5.
Bars are too wide where the state is exact at a small bond and where weak links make the gap look narrow; too narrow for few bosons that repel strongly, for critical pairing, and
where a cap holds the search in a wrong state. Levels split by less than the precision (end modes of the dimerized chain, 7e-10) end in a mixture.

`, 100*coverage, mostRatio, 100*coverage)
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
