package exact

import (
	"fmt"
	"math"
	"math/cmplx"
)

// A Quadratic is H = sum h_ij c_i^+ c_j + 1/2 sum (d_ij c_i^+ c_j^+ + h.c.)
// of n fermion modes, h Hermitian, d antisymmetric.
type Quadratic struct {
	n      int
	hop    []complex128
	pair   []complex128
	paired bool
}

// NewQuadratic returns H = 0 of n modes.
func NewQuadratic(n int) *Quadratic {
	return &Quadratic{n: n, hop: make([]complex128, n*n), pair: make([]complex128, n*n)}
}

// Energy adds e n_i.
func (q *Quadratic) Energy(i int, e float64) { q.hop[i*q.n+i] += complex(e, 0) }

// Hop adds t c_i^+ c_j + h.c., i and j different.
func (q *Quadratic) Hop(i, j int, t complex128) {
	if i == j {
		panic("exact: Hop from a mode to itself: use Energy")
	}
	q.hop[i*q.n+j] += t
	q.hop[j*q.n+i] += cmplx.Conj(t)
}

// Pair adds d c_i^+ c_j^+ + h.c., i and j different.
func (q *Quadratic) Pair(i, j int, d complex128) {
	if i == j {
		panic("exact: Pair of a mode with itself vanishes")
	}
	q.pair[i*q.n+j] += d
	q.pair[j*q.n+i] -= d
	q.paired = true
}

// Terms returns the same Hamiltonian as terms of fermion sites 0 .. n-1.
func (q *Quadratic) Terms() []Term {
	var out []Term
	for i := range q.n {
		for j := range q.n {
			if h := q.hop[i*q.n+j]; h != 0 {
				out = append(out, T(h, "c^+", i, "c", j))
			}
			if d := q.pair[i*q.n+j]; d != 0 {
				out = append(out, WithAdjoints(T(d/2, "c^+", i, "c^+", j))...)
			}
		}
	}
	return out
}

// Levels returns the single-particle energies; there must be no pairing.
func (q *Quadratic) Levels() ([]float64, error) {
	if q.paired {
		return nil, fmt.Errorf("exact: pairing terms: particle number is not conserved")
	}
	values, _, err := eigenHermitian(q.n, q.hop)
	return values, err
}

// Filled returns the ground state of the given number of particles; there must
// be no pairing.
func (q *Quadratic) Filled(particles int) (*Gaussian, error) {
	if q.paired {
		return nil, fmt.Errorf("exact: pairing terms: particle number is not conserved")
	}
	if particles < 0 || particles > q.n {
		return nil, fmt.Errorf("exact: %d particles in %d modes", particles, q.n)
	}
	values, vectors, err := eigenHermitian(q.n, q.hop)
	if err != nil {
		return nil, err
	}
	g := newGaussian(q.n)
	g.Gap, g.Odd = math.Inf(1), particles%2 == 1
	if particles > 0 && particles < q.n {
		g.Gap = values[particles] - values[particles-1]
	}
	for k := range particles {
		g.Energy += values[k]
		x := vectors[k*q.n : (k+1)*q.n]
		for i := range x {
			for j := range x { // <c_i^+ c_j> = sum conj(x_i) x_j
				g.hop[i*q.n+j] += cmplx.Conj(x[i]) * x[j]
			}
		}
	}
	return g, nil
}

// Lowest returns the ground state of the given parity of the particle number.
// A vanishing quasiparticle energy leaves it undefined and is an error.
func (q *Quadratic) Lowest(odd bool) (*Gaussian, error) {
	energies, u, v, err := q.quasiparticles()
	if err != nil {
		return nil, err
	}
	n := q.n
	if energies[0] < 1e-9 {
		return nil, fmt.Errorf("exact: quasiparticle energy %g: the vacuum is not unique", energies[0])
	}
	g := newGaussian(n)
	for i := range n {
		g.Energy += real(q.hop[i*n+i]) / 2
	}
	for _, e := range energies {
		g.Energy -= e / 2
	}
	g.Gap, g.Odd, g.paired = energies[0], odd, true
	if n > 1 {
		g.Gap += energies[1] // of the same parity: two more quasiparticles
	}
	if q.vacuumOdd() != odd { // fill the lowest quasiparticle
		g.Energy += energies[0]
		g.Gap = math.Inf(1)
		if n > 1 {
			g.Gap = energies[1] - energies[0]
		}
		for i := range n {
			u[i], v[i] = cmplx.Conj(v[i]), cmplx.Conj(u[i])
		}
	}
	// c_i = sum_k u_ki gamma_k + conj(v_ki) gamma_k^+ in the vacuum of gamma.
	for k := range n {
		uk, vk := u[k*n:(k+1)*n], v[k*n:(k+1)*n]
		for i := range n {
			for j := range n {
				g.hop[i*n+j] += vk[i] * cmplx.Conj(vk[j])
				g.pair[i*n+j] += uk[i] * cmplx.Conj(vk[j])
			}
		}
	}
	return g, nil
}

// quasiparticles returns the n nonnegative eigenvalues of
// ((h, d), (-d*, -h*)), ascending, and the parts (u, v) of the eigenvectors.
func (q *Quadratic) quasiparticles() (energies []float64, u, v []complex128, err error) {
	n := q.n
	m := make([]complex128, 4*n*n)
	for i := range n {
		for j := range n {
			m[i*2*n+j] = q.hop[i*n+j]
			m[i*2*n+n+j] = q.pair[i*n+j]
			m[(n+i)*2*n+j] = -cmplx.Conj(q.pair[i*n+j])
			m[(n+i)*2*n+n+j] = -cmplx.Conj(q.hop[i*n+j])
		}
	}
	values, vectors, err := eigenHermitian(2*n, m)
	if err != nil {
		return nil, nil, nil, err
	}
	for k := n; k < 2*n; k++ {
		u = append(u, vectors[k*2*n:k*2*n+n]...)
		v = append(v, vectors[k*2*n+n:(k+1)*2*n]...)
	}
	return values[n:], u, v, nil
}

// vacuumOdd tells the parity of the quasiparticle vacuum from the sign of a
// Pfaffian (Kitaev 2001): with c = (x + i y)/2, H is (i/4) sum A_ab w_a w_b in
// Majorana operators w, up to a constant, and the parity changes where Pf A
// does. The reference is H = sum n_i, whose vacuum is empty, hence even.
func (q *Quadratic) vacuumOdd() bool {
	reference := NewQuadratic(q.n)
	for i := range q.n {
		reference.Energy(i, 1)
	}
	return real(Pfaffian(2*q.n, q.majorana()))*real(Pfaffian(2*q.n, reference.majorana())) < 0
}

// majorana returns the real antisymmetric A, modes in the order x_0 y_0 x_1 ...
func (q *Quadratic) majorana() []complex128 {
	n := q.n
	a := make([]complex128, 4*n*n)
	set := func(i, j int, v float64) { a[i*2*n+j] = complex(v, 0) }
	for i := range n {
		for j := range n {
			h, d := q.hop[i*n+j], q.pair[i*n+j]
			set(2*i, 2*j, imag(h)+imag(d))
			set(2*i+1, 2*j+1, imag(h)-imag(d))
			set(2*i, 2*j+1, real(h)-real(d))
			set(2*i+1, 2*j, -real(h)-real(d))
		}
	}
	return a
}
