package main

import (
	"bytes"
	"strings"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"

	"rundle/internal/runfolder"
	"rundle/internal/solve"
)

func TestDrawCell(t *testing.T) {
	for _, c := range []struct {
		name string
		cell solve.Cell
		want string
	}{
		{"chain", solve.Cell{Legs: []string{"a"}, Links: []solve.Link{{From: "a", To: "a", Shift: 1}}}, `
     j     j+1
  a  o-----o--
`},
		{"rungs alone", solve.Cell{Legs: []string{"a", "b"}, Links: []solve.Link{{From: "a", To: "b"}}}, `
     j     j+1
  a  o     o
     |     |
  b  o     o
`},
		{"both diagonals", solve.Cell{Legs: []string{"a", "b"}, Links: []solve.Link{{From: "a", To: "b", Shift: 1}, {From: "b", To: "a", Shift: 1}}}, `
     j     j+1
  a  o     o
        X
  b  o     o
`},
		{"all of three legs, and far ones", solve.Cell{Legs: []string{"top", "m", "low"}, Links: []solve.Link{
			{From: "top", To: "m"}, {From: "m", To: "low"}, {From: "top", To: "low"}, {From: "m", To: "m", Shift: 1},
			{From: "top", To: "m", Shift: 1}, {From: "low", To: "m", Shift: 1}, {From: "top", To: "top", Shift: 2}}}, `
       j     j+1
  top  o     o
       |  \  |
  m    o-----o--
       |  /  |
  low  o     o
  also linked: top,j - low,j; top,j - top,j+2
`},
	} {
		t.Run(c.name, func(t *testing.T) { assert.Equal(t, strings.TrimPrefix(c.want, "\n"), drawCell(c.cell)) })
	}
	many := solve.Cell{Legs: []string{"a"}}
	for s := 2; s < 40; s++ {
		many.Links = append(many.Links, solve.Link{From: "a", To: "a", Shift: s})
	}
	assert.Contains(t, drawCell(many), "a,j - a,j+13; and 26 more\n")
}

func TestNumbers(t *testing.T) {
	for _, c := range []struct{ got, want string }{
		{withError(-3.14159265358979, 2.1e-6), "-3.1415927 ± 2.1e-06"},
		{withError(-3.14159265358979, 0), "-3.141592653590 ± 0.0e+00"},
		{withError(-20, 13), "-20 ± 1.3e+01"},
		{digits(-1e-15, 1e-9), "0.0000000000"},
		{digits(-3.5e-200, 1e-215), "-3.5e-200"},
		{digits(3.5e200, 1e190), "3.5e+200"},
		{digits(-0.25, 0.9), "-0.25"},
		{memory(3 << 20), "3 MiB"},
		{memory(1), "1 B"},
		{operations(1.75e9), "1.75 Gflop"},
		{duration(0.176), "0.18 s"},
		{duration(89.4), "89 s"},
		{duration(1870), "31 min"},
		{duration(8000), "2.2 h"},
		{duration(8e5), "9 days"},
		{counted(1, "sweep"), "1 sweep"},
		{counted(0, "sweep"), "0 sweeps"},
	} {
		assert.Equal(t, c.want, c.got)
	}
}

func TestObservationTable(t *testing.T) {
	pairs := []runfolder.Observation{
		{At: runfolder.At{"j": 0, "l": "a", "j'": 1, "l'": "b"}, Value: runfolder.Pair(complex(0.25, -0.125)), Error: 1e-4},
		{At: runfolder.At{"j": 10, "l": "a", "j'": 1, "l'": "b"}, Value: runfolder.Pair(complex(-0.25, 0)), Error: 1e-4},
	}
	assert.Equal(t, `  j   l  j'  l'                value    error
  0   a  1   b    0.25000 - 0.12500i  1.0e-04
  10  a  1   b   -0.25000 + 0.00000i  1.0e-04
`, observationTable(pairs))
	long := make([]runfolder.Observation, shownValues+5)
	for i := range long {
		long[i] = runfolder.Observation{At: runfolder.At{"j": i}, Value: runfolder.Number(1), Error: 1e-2}
	}
	assert.Contains(t, observationTable(long), "and 5 more")
	assert.Contains(t, observationTable(nil), "no place")
}

func TestMiddleCut(t *testing.T) {
	assert.Nil(t, middleCut(nil))
	assert.Nil(t, middleCut(&runfolder.Entanglement{Cuts: []runfolder.Cut{{}}}))
	e := &runfolder.Entanglement{}
	for b := range 11 { // twelve sites, rungs of three: cuts between rungs after 2, 5, 8
		e.Cuts = append(e.Cuts, runfolder.Cut{AfterSite: b, RungEdge: b%3 == 2})
	}
	assert.Equal(t, 5, middleCut(e).AfterSite)
}

// TestLines: a line at each change of phase, and then no more than one every few seconds.
func TestLines(t *testing.T) {
	var out bytes.Buffer
	now := time.Unix(0, 0)
	l := &lines{w: &out, now: func() time.Time { return now }}
	l.update(solve.Progress{Phase: solve.Preparing})
	for i := range 100 {
		l.update(solve.Progress{Phase: solve.Sweeping, Sweep: i, Energy: -1.5, LargestBond: 20, Discarded: 1e-9})
		now = now.Add(lineEvery / 10)
	}
	l.update(solve.Progress{Phase: solve.Observing})
	l.close()
	text := out.String()
	assert.Equal(t, 12, strings.Count(text, "\n"), text)
	assert.Contains(t, text, "sweep 10, bond dimension 20, energy -1.5, discarded weight 1.0e-09\n")
}

func TestNewDisplay(t *testing.T) {
	assert.IsType(t, &lines{}, newDisplay(&bytes.Buffer{}))
}
