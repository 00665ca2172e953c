package acceptance

import (
	"fmt"
	"math/cmplx"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// twice writes a Hamiltonian on an open ladder down twice, term by term: as formulas and as operators for the oracle.
type twice struct {
	legs  []string
	rungs int
	terms []ladder.Term
	exact []exact.Term
	top   float64 // largest coupling
}

// newTwice has legs a, b, ... in the order of the oracle's sites: rung by rung.
func newTwice(legs, rungs int) *twice {
	return &twice{legs: []string{"a", "b", "d"}[:legs], rungs: rungs}
}

func (w *twice) sites() int { return len(w.legs) * w.rungs }

// at writes the indices of a site.
func (w *twice) at(site int) string {
	return fmt.Sprintf("[%s,%d]", w.legs[site%len(w.legs)], site/len(w.legs))
}

// diagonal tells the operators that need no conjugate.
func diagonal(op string) bool { return op[0] == 'n' || op == "S^z" }

// add writes z times the operators (name, site, ...), and the conjugate unless all are diagonal.
func (w *twice) add(z complex128, ops ...any) {
	hermitian := true
	var text []string
	for k := 0; k < len(ops); k += 2 {
		op, site := ops[k].(string), ops[k+1].(int)
		hermitian = hermitian && diagonal(op)
		text = append(text, op+w.at(site))
	}
	f := formulaOf(z) + " " + strings.Join(text, " ")
	t := exact.T(z, ops...)
	if hermitian {
		w.exact = append(w.exact, t)
	} else {
		f += " + h.c."
		w.exact = append(w.exact, exact.WithAdjoints(t)...)
	}
	w.terms = append(w.terms, ladder.Term{Formula: f})
	w.top = max(w.top, cmplx.Abs(z))
}

// formulaOf writes a number so that it is read back to the last bit.
func formulaOf(z complex128) string { return fmt.Sprintf("(%v + i*(%v))", real(z), imag(z)) }

func (w *twice) hamiltonian(t *testing.T, site ladder.Site) *ladder.Hamiltonian {
	t.Helper()
	var parts []ladder.Part
	for _, l := range w.legs {
		parts = append(parts, ladder.Leg(l, site))
	}
	lad, err := ladder.New(w.rungs, ladder.Open, parts...)
	require.NoError(t, err)
	h, err := lad.Hamiltonian(nil, w.terms...)
	require.NoError(t, err)
	return h
}

// ground is the exact ground state in a sector, with its gap.
func (w *twice) ground(t *testing.T, site exact.Site, number func([]exact.Site) ([]exact.Number, []int)) (*exact.Basis, exact.Level, float64) {
	t.Helper()
	sites := make([]exact.Site, w.sites())
	for i := range sites {
		sites[i] = site
	}
	numbers, values := number(sites)
	b, err := exact.NewBasis(sites, numbers, values)
	require.NoError(t, err)
	m, err := b.Matrix(w.exact...)
	require.NoError(t, err)
	ground, gap, err := m.Ground()
	require.NoError(t, err)
	return b, ground, gap
}

// oneNumber is a sector of one number for the oracle.
func oneNumber(f func(sites []exact.Site) exact.Number, value int) func([]exact.Site) ([]exact.Number, []int) {
	return func(sites []exact.Site) ([]exact.Number, []int) { return []exact.Number{f(sites)}, []int{value} }
}

// particles counts the particles on all sites.
func particles(sites []exact.Site) exact.Number { return exact.Particles(sites) }
