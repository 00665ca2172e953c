package solve

import (
	"fmt"
	"maps"
	"slices"

	"rundle/internal/modelfile"
	"rundle/mpo/ladder"
	"rundle/mps"
)

// rebound returns a state that reads formulas in another scope, of an equal ladder, through given frames, which must equal its own. It
// shares the state's memory.
func rebound(s *mps.State, f *ladder.Frames, scope *ladder.Scope) (*mps.State, error) {
	if c, ok := s.Real(); ok {
		return mps.NewReal(c, f, scope)
	}
	c, _ := s.Complex()
	return mps.NewComplex(c, f, scope)
}

// differing names the constants that a model and a saved state understand differently.
func differing(m *modelfile.Model, saved *ladder.Scope) []string {
	var notes []string
	here, there := m.Scope.Constants(), saved.Constants()
	for _, name := range slices.Sorted(maps.Keys(here)) {
		if old, ok := there[name]; ok && old != here[name] {
			notes = append(notes, fmt.Sprintf("constant %s is %v in %s, but the states were found with %v; formulas are read with %v", name, here[name], m.File, old, here[name]))
		}
	}
	return notes
}
