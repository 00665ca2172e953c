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

	HeldBack bool // of neither half, see Half

	lattice lattice
	terms   []exact.Term // with their adjoints
	answer  func(*Model) (Answer, error)
}

// Answer is what is known of a ground state.
type Answer struct {
	Energy    float64
	Local     []complex128 // by site; nil: not known, or not unique
	Far       []complex128 // correlations of Model.far; nil: the same
	Entropies []float64    // by cut; nil: the same
	Loose     float64      // error of the answer itself, for those from a tenfold bond
}

// The parts of the set.
const (
	Tuning   = "tuning"    // sets constants
	Test     = "test"      // judges them
	HeldBack = "held back" // judges them, and was not looked at before they stood
)

// Half is the part of the set that the model belongs to. A hash of the name (FNV-1a, 32 bits) parts the halves: an even one tunes.
func (m *Model) Half() string {
	h := fnv.New32a()
	h.Write([]byte(m.Name)) // never fails
	switch {
	case m.HeldBack:
		return HeldBack
	case h.Sum32()%2 == 0:
		return Tuning
	default:
		return Test
	}
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

// far are the operators of a long correlation with a bound on their norm: the first on the site origin, the second on all sites of the same leg from the rung beyond the next on. There
// are none for electrons and clocks.
func (l lattice) far() (first, second string, norm float64) {
	switch l.site.Kind {
	case exact.KindFermion:
		return "c^+", "c", 1
	case exact.KindBoson:
		return "b^+", "b", float64(l.site.Param)
	case exact.KindSpin:
		return "S^+", "S^-", float64((l.site.Param + 1) * (l.site.Param + 1) / 4)
	default:
		return "", "", 0
	}
}

// origin is a rung near an end.
func (l lattice) origin() int { return l.rungs / 5 }

// farSites lists the second sites.
func (l lattice) farSites() []int {
	var out []int
	for j := l.origin() + 2; j < l.rungs; j++ {
		out = append(out, l.at(0, j))
	}
	return out
}
