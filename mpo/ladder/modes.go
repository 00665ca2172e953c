package ladder

import (
	"math"
	"math/cmplx"
)

// Modes is a Hamiltonian rewritten in modes that make it real where no choice of phases alone does. If the exchange of legs a and b
// times complex conjugation leaves the Hamiltonian alone, then
//
//	u = (a + b)/sqrt2,   v = i (a - b)/sqrt2
//
// are their own images, and all coefficients in them are real: a leg-symmetric flux ladder at every flux. The user's modes may first need
// phases, a -> a exp(-i angle), to show the symmetry. It works for fermions with all their states; bosons that are cut at an
// occupation of the legs are not cut so in u and v.
//
// The rewriting acts inside pairs of neighbouring sites, so that a state goes back by one Pair matrix a pair.
type Modes struct {
	Hamiltonian *Hamiltonian // u stands where a stood, v where b stood
	Pairs       []int        // first site of each pair, increasing

	lb     *labelling
	angles []float64 // of the phases, by variable
}

// Modes looks for an exchange of neighbouring legs that makes the Hamiltonian real in its modes; nil if there is none. The rewritten
// Hamiltonian has the scope of the old one and no formulas.
func (h *Hamiltonian) Modes() *Modes {
	if h.Poly.NumTerms() > maxModeTerms {
		return nil
	}
	lb := newLabelling(h.Ladder())
	for _, pairs := range exchanges(h.Ladder(), fullFermion) {
		x := exchange{lb: lb, partner: partners(h.Ladder().Sites(), pairs)}
		angles, ok := x.symmetricGauge(h.Poly)
		if !ok {
			continue
		}
		if m := (&Modes{Pairs: pairs, lb: lb, angles: angles}); m.rewrite(h, x) {
			return m
		}
	}
	return nil
}

// maxModeTerms bounds the Hamiltonians that are rewritten: beyond, the search would take longer than it saves.
const maxModeTerms = 200_000

// fullFermion reports whether a site is one of fermions with all their states.
func fullFermion(s Site) bool { return s.Kind() == KindFermion || s.Double() }

// rewrite fills in the Hamiltonian, and reports whether it is real.
func (m *Modes) rewrite(h *Hamiltonian, x exchange) bool {
	s := &substitution{ladder: h.Ladder(), partner: x.partner, known: make(map[Factor]*Polynomial)}
	b := NewBuilder(h.Ladder())
	for t := range h.Poly.NumTerms() {
		c, f := h.Poly.Term(t)
		angle := 0.0
		for _, g := range f {
			for a, n := range m.lb.at(int(g.Site)).site.Raise(g.Op) {
				angle += m.angles[m.lb.first[g.Site]+int32(a)] * float64(n)
			}
		}
		p, err := s.product(f)
		if err != nil {
			return false
		}
		b.AddPolynomial(c*cmplx.Rect(1, angle), p)
	}
	p := b.Polynomial().DropZeros(negligible).hermitianPart()
	out, tiny := NewBuilder(h.Ladder()), modeRounding*p.Largest()
	for t := range p.NumTerms() {
		c, f := p.Term(t)
		if math.Abs(imag(c)) > tiny {
			return false
		}
		if math.Abs(real(c)) > tiny {
			out.Add(complex(real(c), 0), f...)
		}
	}
	m.Hamiltonian = &Hamiltonian{Scope: h.Scope, Poly: out.Polynomial(), warnings: h.warnings}
	return true
}

// modeRounding is the part of the largest coefficient that rewriting may leave of what cancels.
const modeRounding = 1e-13

// substitution replaces modes by u and v.
type substitution struct {
	ladder  *Ladder
	partner []int32
	known   map[Factor]*Polynomial
}

// product rewrites a product of factors.
func (s *substitution) product(f []Factor) (*Polynomial, error) {
	p := One(s.ladder)
	for _, g := range f {
		q, err := s.factor(g)
		if err != nil {
			return nil, err
		}
		if p, err = p.Mul(q); err != nil {
			return nil, err
		}
	}
	return p, nil
}

// factor rewrites a basis element: that of a two-component site is one of the mode up times one of the mode down.
func (s *substitution) factor(g Factor) (*Polynomial, error) {
	if int(s.partner[g.Site]) == int(g.Site) {
		return Local(s.ladder, int(g.Site), g.Op), nil
	}
	if p := s.known[g]; p != nil {
		return p, nil
	}
	sum := Zero(s.ladder)
	for _, w := range s.ladder.Site(int(g.Site)).Parts(g.Op) {
		up, err := s.mode(g.Site, w.Op%4, 1)
		if err != nil {
			return nil, err
		}
		down, err := s.mode(g.Site, w.Op/4, 4)
		if err != nil {
			return nil, err
		}
		p, err := up.Mul(down)
		if err != nil {
			return nil, err
		}
		sum = sum.Add(p.Scale(w.Coef))
	}
	s.known[g] = sum
	return sum, nil
}

// mode rewrites an element of one mode; unit is 4 for the mode down. a = (u - i v)/sqrt2, b = (u + i v)/sqrt2.
func (s *substitution) mode(site int32, op, unit OpID) (*Polynomial, error) {
	first, half := min(site, s.partner[site]), complex(math.Sqrt2/2, 0)
	sign := -1i
	if site != first {
		sign = 1i
	}
	lower := Local(s.ladder, int(first), modeLower*unit).Add(Local(s.ladder, int(first)+1, modeLower*unit).Scale(sign)).Scale(half)
	switch op {
	case modeOne:
		return One(s.ladder), nil
	case modeLower:
		return lower, nil
	case modeRaise:
		return lower.Adjoint(), nil
	}
	return lower.Adjoint().Mul(lower)
}

// Between returns Pair between the stored states of frames of the rewritten Hamiltonian and those of the user's.
func (m *Modes) Between(first int, user, modes *Frames) []complex128 {
	l := m.Hamiltonian.Ladder()
	return product(kronecker(user.Unitary(l, first), user.Unitary(l, first+1)),
		product(m.Pair(first), adjoint(kronecker(modes.Unitary(l, first), modes.Unitary(l, first+1)))))
}

// Pair returns the matrix that takes a pair of sites from the modes' basis states to the user's, with the phases: element
// ((sa*d + sb)*d + su)*d + sv is <sa sb|su sv>, d the dimension of a site, first the first site of the pair.
func (m *Modes) Pair(first int) []complex128 {
	site := m.lb.at(first).site
	d := site.Dim()
	a, b := pairRaising(site)
	out := make([]complex128, d*d*d*d)
	for u := range d {
		for v := range d {
			state := make([]complex128, d*d)
			state[0] = 1
			state = raiseModes(state, site.StateLabels(v), a, b, -math.Sqrt2/2*1i, math.Sqrt2/2*1i)
			state = raiseModes(state, site.StateLabels(u), a, b, math.Sqrt2/2, math.Sqrt2/2)
			for k, z := range state {
				out[k*d*d+u*d+v] = z * m.turn(first, k/d) * m.turn(first+1, k%d)
			}
		}
	}
	return out
}

// turn is the phase by which a state of a site goes back: the Hamiltonian was turned by exp(i angle) a step.
func (m *Modes) turn(site, state int) complex128 {
	angles := m.angles[m.lb.first[site]:m.lb.first[site+1]]
	return cmplx.Conj(turnOf(angles, m.lb.at(site).steps[state]))
}

// pairRaising returns the matrices of the raising operators on two neighbouring sites, by mode.
func pairRaising(site Site) (a, b [][]complex128) {
	d := site.Dim()
	for mode := range site.Labels() {
		op := modeRaise
		if mode == 1 {
			op *= 4
		}
		m := site.Matrix(op)
		left, right := make([]complex128, d*d*d*d), make([]complex128, d*d*d*d)
		for i := range d {
			for j := range d {
				for k := range d {
					left[((i*d+k)*d+j)*d+k] = m[i*d+j]
					right[((k*d+i)*d+k)*d+j] = m[i*d+j] * complex(parity(site, k), 0)
				}
			}
		}
		a, b = append(a, left), append(b, right)
	}
	return a, b
}

func parity(site Site, state int) float64 {
	n := 0
	for _, x := range site.StateLabels(state) {
		n += x
	}
	return float64(1 - 2*(n%2))
}

// raiseModes applies the raising operators alpha a + beta b of the occupied modes to a state, the last mode first.
func raiseModes(state []complex128, occupied []int, a, b [][]complex128, alpha, beta complex128) []complex128 {
	n := len(state)
	for mode := len(occupied) - 1; mode >= 0; mode-- {
		if occupied[mode] == 0 {
			continue
		}
		next := make([]complex128, n)
		for i := range n {
			for j := range n {
				next[i] += (alpha*a[mode][i*n+j] + beta*b[mode][i*n+j]) * state[j]
			}
		}
		state = next
	}
	return state
}
