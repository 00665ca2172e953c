package calibration

import (
	"fmt"
	"hash/fnv"
	"slices"
	"strconv"
	"strings"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// Model is a Hamiltonian with a ground state that is known.
type Model struct {
	Name   string
	Source string // of the answer
	Hard   bool   // frustrated, with a flux, disordered or degenerate
	Sector ladder.Sector
	Local  []string // operators whose product is measured: one, on every site, or two, on neighbours along a leg; none: nothing
	Finest float64  // smallest wish that is searched for; finer ones cost too much here
	Caps   []int    // bond dimensions at which searches are stopped

	lattice lattice
	terms   []exact.Term // with their adjoints
	answer  func(*Model) (Answer, error)
}

// Answer is what is known of a ground state.
type Answer struct {
	Energy    float64
	Local     []complex128 // by site; nil: not known, or not unique
	Entropies []float64    // by cut; nil: the same
	Loose     float64      // error of the answer itself, for those from a tenfold bond
}

// Tunes tells whether the model is of the half that sets constants: an even hash (FNV-1a, 32 bits) of its name.
func (m *Model) Tunes() bool {
	h := fnv.New32a()
	h.Write([]byte(m.Name)) // never fails
	return h.Sum32()%2 == 0
}

// Answer works out the ground state.
func (m *Model) Answer() (Answer, error) {
	a, err := m.answer(m)
	if err != nil {
		return a, fmt.Errorf("%s: %w", m.Name, err)
	}
	return a, nil
}

// lattice is a number of rungs of equal sites; site = rung * legs + leg. The boundary is always open: rings close by their terms.
type lattice struct {
	site  exact.Site
	legs  int
	rungs int
}

func chain(site exact.Site, n int) lattice { return lattice{site, 1, n} }
func (l lattice) sites() int               { return l.legs * l.rungs }
func (l lattice) at(leg, rung int) int     { return rung*l.legs + leg }
func (l lattice) all() []exact.Site        { return slices.Repeat([]exact.Site{l.site}, l.sites()) }

const legNames = "abd" // c is an operator

// Hamiltonian spells the terms out in formulas, one for each.
func (m *Model) Hamiltonian() (*ladder.Hamiltonian, error) {
	var parts []ladder.Part
	for l := range m.lattice.legs {
		parts = append(parts, ladder.Leg(legNames[l:l+1], ladderSite(m.lattice.site)))
	}
	lad, err := ladder.New(m.lattice.rungs, ladder.Open, parts...)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", m.Name, err)
	}
	terms := make([]ladder.Term, len(m.terms))
	for i, t := range m.terms {
		terms[i].Formula = m.spell(t)
	}
	h, err := lad.Hamiltonian(nil, terms...)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", m.Name, err)
	}
	return h, nil
}

// spell writes a term of the oracle as a formula.
func (m *Model) spell(t exact.Term) string {
	var b strings.Builder
	number := func(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }
	fmt.Fprintf(&b, "(%s", number(real(t.Coef)))
	if imag(t.Coef) != 0 {
		fmt.Fprintf(&b, " + i*(%s)", number(imag(t.Coef)))
	}
	b.WriteByte(')')
	for _, o := range t.Ops {
		leg := o.Site % m.lattice.legs
		fmt.Fprintf(&b, " %s[%s,%d]", o.Name, legNames[leg:leg+1], o.Site/m.lattice.legs)
	}
	return b.String()
}

func ladderSite(s exact.Site) ladder.Site {
	switch s.Kind {
	case exact.KindFermion:
		return ladder.Fermion()
	case exact.KindElectron:
		return ladder.Electron()
	case exact.KindBoson:
		return ladder.Boson(s.Param)
	case exact.KindSpin:
		return ladder.Spin(s.Param)
	default:
		return ladder.Clock(s.Param)
	}
}
