package ladder

import (
	"fmt"
	"slices"
)

// Hamiltonian is a Hermitian, fermion-even sum of terms.
type Hamiltonian struct {
	Scope    *Scope
	Terms    []Term
	Poly     *Polynomial
	warnings []string
}

const (
	hermitianTolerance = 1e-12 // of the largest coefficient
	negligible         = 1e-15 // coefficients below this part of the largest are rounding
)

// Hamiltonian sums the terms on the ladder.
func (l *Ladder) Hamiltonian(c Constants, terms ...Term) (*Hamiltonian, error) {
	s, err := NewScope(l, c)
	if err != nil {
		return nil, err
	}
	return s.Hamiltonian(terms...)
}

// Hamiltonian sums the terms. A sum that is not Hermitian, empty, or holds an odd number of fermion operators is an error that shows the term.
func (s *Scope) Hamiltonian(terms ...Term) (*Hamiltonian, error) {
	if len(terms) == 0 {
		return nil, &Error{Msg: "a Hamiltonian without terms", Hint: "give at least one"}
	}
	h := &Hamiltonian{Scope: s, Terms: slices.Clone(terms), warnings: s.ladder.Warnings()}
	b := NewBuilder(s.ladder)
	for _, t := range terms {
		p, warnings, err := s.sum(t)
		if err != nil {
			return nil, err
		}
		if bad, odd := p.Odd(); odd {
			return nil, termError(t, "terms of a Hamiltonian hold an even number of fermion operators", "fermion-odd term %s", bad)
		}
		h.warnings = append(h.warnings, warnings...)
		b.AddPolynomial(1, p)
		if err := b.list.full(); err != nil {
			return nil, termError(t, "", "%s", err.Error())
		}
	}
	h.Poly = b.Polynomial().DropZeros(negligible)
	if h.Poly.NumTerms() == 0 {
		return nil, &Error{Msg: "the Hamiltonian is zero: its terms cancel or have no place on the ladder"}
	}
	if ok, offending := h.Poly.Hermitian(hermitianTolerance); !ok {
		return nil, s.notHermitian(terms, offending)
	}
	h.Poly = h.Poly.hermitianPart()
	return h, nil
}

func termError(t Term, hint, format string, args ...any) *Error {
	return &Error{Term: t.title(), Part: "formula", Source: t.Formula, Msg: fmt.Sprintf(format, args...), Hint: hint}
}

// notHermitian finds the term to blame: the first that is not Hermitian by itself.
func (s *Scope) notHermitian(terms []Term, offending string) error {
	const hint = "add \"+ h.c.\", or the conjugate as a term of its own"
	for _, t := range terms {
		p, err := s.Polynomial(t)
		if err != nil {
			return err
		}
		if ok, bad := p.Hermitian(hermitianTolerance); !ok {
			return termError(t, hint, "not Hermitian: %s has no conjugate", bad)
		}
	}
	return &Error{Msg: fmt.Sprintf("not Hermitian: %s has no conjugate", offending), Hint: hint}
}

// hermitianPart removes what rounding left of p - p^+.
func (p *Polynomial) hermitianPart() *Polynomial {
	if ok, _ := p.Hermitian(0); ok {
		return p
	}
	return p.Add(p.Adjoint()).Scale(0.5)
}

// Warnings names what is allowed but seldom meant, such as a pair that a ring counts twice.
func (h *Hamiltonian) Warnings() []string { return slices.Clone(h.warnings) }

// Ladder returns the ladder.
func (h *Hamiltonian) Ladder() *Ladder { return h.Scope.ladder }
