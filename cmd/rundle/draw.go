package main

import (
	"fmt"
	"slices"
	"strings"

	"rundle/internal/solve"
)

// drawnLinks is how many links that do not fit the drawing are listed.
const drawnLinks = 12

// drawCell draws two rungs of a ladder: a leg a line, with the links along it, to the next leg on the same rung and across the plaquette. All other
// links are listed below.
func drawCell(c solve.Cell) string {
	at := map[string]int{}
	width := 0
	for k, name := range c.Legs {
		at[name] = k
		width = max(width, len([]rune(name)))
	}
	along := make([]bool, len(c.Legs))
	rung, down, up := make([]bool, len(c.Legs)), make([]bool, len(c.Legs)), make([]bool, len(c.Legs))
	var rest []string
	for _, l := range c.Links {
		from, to := at[l.From], at[l.To]
		switch {
		case l.Shift == 1 && from == to:
			along[from] = true
		case l.Shift == 0 && to == from+1:
			rung[from] = true
		case l.Shift == 1 && to == from+1:
			down[from] = true
		case l.Shift == 1 && from == to+1:
			up[to] = true
		default:
			rest = append(rest, linkName(l))
		}
	}
	if len(c.Legs) > 40 {
		return fmt.Sprintf("  %d legs: too many to draw\n", len(c.Legs)) + listLinks(rest)
	}
	var b strings.Builder
	margin := strings.Repeat(" ", width+4)
	fmt.Fprintf(&b, "%sj     j+1\n", margin)
	for k, name := range c.Legs {
		line := "o     o"
		if along[k] {
			line = "o-----o--"
		}
		fmt.Fprintf(&b, "  %-*s  %s\n", width, name, line)
		if k == len(c.Legs)-1 {
			break
		}
		b.WriteString(strings.TrimRight(margin+between(rung[k], down[k], up[k]), " ") + "\n")
	}
	return b.String() + listLinks(rest)
}

// between draws the links from one leg to the next.
func between(rung, down, up bool) string {
	side, middle := " ", " "
	if rung {
		side = "|"
	}
	switch {
	case down && up:
		middle = "X"
	case down:
		middle = "\\"
	case up:
		middle = "/"
	}
	return side + "  " + middle + "  " + side
}

func linkName(l solve.Link) string {
	if l.Shift == 0 {
		return fmt.Sprintf("%s,j - %s,j", l.From, l.To)
	}
	return fmt.Sprintf("%s,j - %s,j+%d", l.From, l.To, l.Shift)
}

func listLinks(rest []string) string {
	if len(rest) == 0 {
		return ""
	}
	more := ""
	if n := len(rest) - drawnLinks; n > 0 {
		rest, more = slices.Clone(rest[:drawnLinks]), fmt.Sprintf("; and %d more", n)
	}
	return "  also linked: " + strings.Join(rest, "; ") + more + "\n"
}
