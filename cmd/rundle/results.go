package main

import (
	"fmt"
	"io"
	"maps"
	"slices"
	"strings"

	"rundle/internal/runfolder"
)

// results prints a result: the document of result.json with --json, else a summary.
func (c *console) results(r *runfolder.Result, origin string) error {
	if c.json {
		text, err := runfolder.EncodeResult(r)
		if err != nil {
			return err
		}
		_, err = c.stdout.Write(text)
		return err
	}
	_, err := io.WriteString(c.stdout, summary(r, origin))
	return err
}

func summary(r *runfolder.Result, origin string) string {
	var b strings.Builder
	if r.Model.Title != "" {
		fmt.Fprintln(&b, r.Model.Title)
	}
	fmt.Fprintf(&b, "%s\n", origin)
	levelTable(&b, r)
	for _, s := range r.States {
		summarizeState(&b, r, &s)
	}
	return b.String()
}

// levelTable lists the levels of a run for several states, a multiplet that has several of them with its splitting.
func levelTable(b *strings.Builder, r *runfolder.Result) {
	if len(r.Multiplets) == 0 {
		return
	}
	var rows [][]string
	for k, s := range r.States {
		gap := ""
		if k > 0 && s.Gap != nil && s.GapError != nil {
			gap = withError(*s.Gap, *s.GapError)
		}
		rows = append(rows, []string{fmt.Sprint(k), fmt.Sprint(s.Multiplet), sectorText(s.Sector), withError(s.EnergyLimit, s.EnergyError), gap, string(s.Verdict)})
	}
	fmt.Fprintf(b, "\n%s", grid([]string{"level", "multiplet", "sector", "energy", "above the first", "verdict"}, rows, "level", "multiplet"))
	for k, m := range r.Multiplets {
		if m.Count > 1 {
			fmt.Fprintf(b, "multiplet %d: %d states at %s, split by at most %s\n", k, m.Count, withError(m.Energy, m.EnergyError), shortError(m.SplittingBound))
		}
	}
}

func summarizeState(b *strings.Builder, r *runfolder.Result, s *runfolder.State) {
	fmt.Fprintf(b, "\nsector:   %s\n", sectorText(s.Sector))
	fmt.Fprintf(b, "energy:   %s\n", withError(s.EnergyLimit, s.EnergyError))
	fmt.Fprintf(b, "verdict:  %s\n", s.Verdict)
	if s.Reason != "" {
		fmt.Fprintf(b, "          %s\n", s.Reason)
	}
	fmt.Fprintf(b, "state:    <H> = %.12g, bond dimension %d, %s, %s arithmetic, %s\n", s.Energy, s.LargestBond,
		counted(s.Sweeps, "sweep"), r.Model.Arithmetic, duration(s.Seconds))
	if s.Variance != nil {
		fmt.Fprintf(b, "variance: %.1e\n", *s.Variance)
	}
	if s.TopOccupation != nil {
		fmt.Fprintf(b, "largest probability of a full boson site: %.1e\n", *s.TopOccupation)
	}
	if cut := middleCut(s.Entanglement); cut != nil {
		fmt.Fprintf(b, "entropy:  %.6f nats at the cut after site %d\n", cut.Entropy, cut.AfterSite)
	}
	for _, name := range slices.Sorted(maps.Keys(s.Observations)) {
		fmt.Fprintf(b, "\n%s\n%s", name, observationTable(s.Observations[name]))
	}
}

func sectorText(n runfolder.Numbers) string {
	var parts []string
	for _, name := range slices.Sorted(maps.Keys(n)) {
		parts = append(parts, name+" = "+plain(n[name]))
	}
	if len(parts) == 0 {
		return "nothing conserved"
	}
	return strings.Join(parts, ", ")
}

// middleCut is the cut between rungs nearest to the middle, nil if there is none.
func middleCut(e *runfolder.Entanglement) *runfolder.Cut {
	if e == nil {
		return nil
	}
	var best *runfolder.Cut
	distance := func(c *runfolder.Cut) int { return max(2*c.AfterSite+1-len(e.Cuts), len(e.Cuts)-2*c.AfterSite-1) }
	for i := range e.Cuts {
		if c := &e.Cuts[i]; c.RungEdge && (best == nil || distance(c) < distance(best)) {
			best = c
		}
	}
	return best
}

// shownValues is how many values of an observation a summary shows; result.json has all.
const shownValues = 12

func observationTable(all []runfolder.Observation) string {
	if len(all) == 0 {
		return "  no place on this ladder\n"
	}
	names := slices.SortedFunc(maps.Keys(all[0].At), compareIndices)
	var rows [][]string
	for i, o := range all {
		if i == shownValues {
			break
		}
		var row []string
		for _, name := range names {
			row = append(row, fmt.Sprint(o.At[name]))
		}
		value := digits(o.Value.Re, o.Error)
		if o.Value.Complex {
			value = complexText(o)
		}
		rows = append(rows, append(row, value, shortError(o.Error)))
	}
	text := grid(append(slices.Clone(names), "value", "error"), rows, "value", "error")
	if n := len(all) - shownValues; n > 0 {
		text += fmt.Sprintf("  and %d more\n", n)
	}
	return text
}

func complexText(o runfolder.Observation) string {
	im := digits(o.Value.Im, o.Error)
	sign := "+"
	if strings.HasPrefix(im, "-") {
		sign, im = "-", im[1:]
	}
	return fmt.Sprintf("%s %s %si", digits(o.Value.Re, o.Error), sign, im)
}

// compareIndices orders the indices of the first operator of a pair before those of the second, j first.
func compareIndices(a, b string) int {
	rank := func(s string) string {
		mark := "0"
		if strings.HasSuffix(s, "'") {
			mark = "1"
		}
		if strings.TrimSuffix(s, "'") == "j" {
			return mark
		}
		return mark + s
	}
	return strings.Compare(rank(a), rank(b))
}
