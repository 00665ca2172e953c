package calibration

import (
	"math/rand/v2"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// dot is strength * S_a . S_b with the z part weighted by delta.
func dot(strength, delta float64, a, b int) []exact.Term {
	return append(exact.WithAdjoints(exact.T(complex(strength/2, 0), "S^+", a, "S^-", b)), exact.T(complex(strength*delta, 0), "S^z", a, "S^z", b))
}

// square is strength * (S_a . S_b)^2.
func square(strength float64, a, b int) []exact.Term {
	var out []exact.Term
	for _, x := range dot(1, 1, a, b) {
		for _, y := range dot(1, 1, a, b) {
			out = append(out, exact.Term{Coef: x.Coef * y.Coef * complex(strength, 0), Ops: append(append([]exact.Op{}, x.Ops...), y.Ops...)})
		}
	}
	return out
}

// bonds adds S . S of the given strength and anisotropy over a distance, on all sites of a chain.
func bonds(n, distance int, strength, delta float64) []exact.Term {
	var out []exact.Term
	for j := range n - distance {
		out = append(out, dot(strength, delta, j, j+distance)...)
	}
	return out
}

func join(parts ...[]exact.Term) []exact.Term {
	var out []exact.Term
	for _, p := range parts {
		out = append(out, p...)
	}
	return out
}

// known makes a model whose energy is a number that is worked out elsewhere.
func known(name, source string, l lattice, sector ladder.Sector, finest float64, terms []exact.Term, energy func() (float64, error)) Model {
	return Model{Name: name, Source: source, Sector: sector, Finest: finest, lattice: l, terms: terms,
		answer: func(*Model) (Answer, error) {
			e, err := energy()
			return Answer{Energy: e}, err
		}}
}

func closed(e float64) func() (float64, error) { return func() (float64, error) { return e, nil } }

// closedModels have ground energies in closed form, see internal/exact.
func closedModels() []Model {
	half := func(n int) lattice { return chain(exact.Spin(1), n) }
	ising := func(n int) []exact.Term {
		var out []exact.Term
		for j := range n {
			out = append(out, exact.T(-2, "S^z", j))
			if j+1 < n {
				out = append(out, exact.T(-4, "S^x", j, "S^x", j+1))
			}
		}
		return out
	}
	even, flat := ladder.Sector{"P": 0}, ladder.Sector{"Sz": 0}
	var aklt []exact.Term
	for j := range 15 {
		aklt = append(aklt, join(dot(1, 1, j, j+1), square(1.0/3, j, j+1))...)
	}
	pairing := exact.NewQuadratic(40)
	for j := range 39 {
		pairing.Hop(j, j+1, -1)
		pairing.Pair(j, j+1, 1)
	}
	all := []Model{
		known("critical Ising chain, 32 spins", "Pfeuty 1970", half(32), even, 1e-9, ising(32), closed(exact.IsingChain(32))),
		known("critical Ising chain, 80 spins", "Pfeuty 1970", half(80), even, 1e-7, ising(80), closed(exact.IsingChain(80))),
		known("exchange of x and y, 24 spins", "Lieb, Schultz, Mattis 1961", half(24), flat, 1e-8, bonds(24, 1, 1, 0), closed(exact.XXChain(24))),
		known("exchange of x and y, 64 spins", "Lieb, Schultz, Mattis 1961", half(64), flat, 1e-6, bonds(64, 1, 1, 0), closed(exact.XXChain(64))),
		known("pairing chain, end modes", "Kitaev 2001", chain(exact.Fermion(), 40), even, 1e-9, pairing.Terms(), closed(exact.PairingChain(40, 1))),
		known("Majumdar-Ghosh chain", "Majumdar, Ghosh 1969", half(24), flat, 1e-9, join(bonds(24, 1, 1, 1), bonds(24, 2, 0.5, 1)), closed(exact.MajumdarGhoshChain(24))),
		known("AKLT chain", "Affleck, Kennedy, Lieb, Tasaki 1987", chain(exact.Spin(2), 16), flat, 1e-9, aklt, closed(exact.AKLTChain(16))),
	}
	for _, i := range []int{4, 5, 6} { // degenerate, frustrated, degenerate
		all[i].Hard = true
	}
	return all
}

// betheModels are solved by their Bethe equations, see internal/exact.
func betheModels() []Model {
	half := func(n int) lattice { return chain(exact.Spin(1), n) }
	flat := ladder.Sector{"Sz": 0}
	ring := func(n int, delta float64) []exact.Term {
		return append(bonds(n, 1, 1, delta), dot(1, delta, 0, n-1)...)
	}
	heisenberg := func(n, down int) func() (float64, error) {
		return func() (float64, error) { return exact.HeisenbergChain(n, down) }
	}
	rounds := func(n int) func() (float64, error) {
		return func() (float64, error) { return exact.HeisenbergRing(n) }
	}
	hubbard := func(name string, n, up, down int, u, finest float64) Model {
		var terms []exact.Term
		for j := range n {
			terms = append(terms, exact.T(complex(u, 0), "n_up", j, "n_down", j))
			if j+1 < n {
				terms = append(terms, exact.WithAdjoints(exact.T(-1, "c_up^+", j+1, "c_up", j), exact.T(-1, "c_down^+", j+1, "c_down", j))...)
			}
		}
		return known(name, "Lieb-Wu equations (Schulz 1985)", chain(exact.Electron(true), n), ladder.Sector{"N": up + down, "Sz": float64(up-down) / 2}, finest, terms,
			func() (float64, error) { return exact.HubbardChain(n, up, down, 1, u) })
	}
	const open, closedRing = "Bethe equations (Alcaraz et al. 1987)", "Bethe equations (Bethe 1931)"
	return []Model{
		known("Heisenberg chain, 24 spins", open, half(24), flat, 1e-8, bonds(24, 1, 1, 1), heisenberg(24, 12)),
		known("Heisenberg chain, 48 spins", open, half(48), flat, 1e-6, bonds(48, 1, 1, 1), heisenberg(48, 24)),
		known("Heisenberg chain, 40 spins, Sz = 8", open, half(40), ladder.Sector{"Sz": 8}, 1e-6, bonds(40, 1, 1, 1), heisenberg(40, 12)),
		known("Heisenberg ring, 16 spins", closedRing, half(16), flat, 1e-7, ring(16, 1), rounds(16)),
		known("Heisenberg ring, 24 spins", closedRing, half(24), flat, 1e-4, ring(24, 1), rounds(24)),
		hubbard("Hubbard chain, 10 sites, half filled", 10, 5, 5, 4, 1e-6),
		hubbard("Hubbard chain, 12 sites, 7 electrons", 12, 4, 3, 8, 1e-6),
		hubbard("Hubbard chain, 14 sites, 8 electrons", 14, 4, 4, 2, 1e-4),
	}
}

// randomField adds a field between -w and w to every spin of a chain.
func randomField(n int, w float64, seed uint64) []exact.Term {
	rng := rand.New(rand.NewPCG(seed, 9))
	var out []exact.Term
	for j := range n {
		out = append(out, exact.T(complex(w*(2*rng.Float64()-1), 0), "S^z", j))
	}
	return out
}

// spinModels are diagonalized.
func spinModels() []Model {
	s := exact.Spin(1)
	n := 14
	var strip, crossed, tube, saw []exact.Term
	two, three := lattice{s, 2, 6}, lattice{s, 3, 4}
	for j := range 6 {
		strip = append(strip, dot(0.7, 1, 2*j, 2*j+1)...)
		crossed = append(crossed, dot(1.5, 1, 2*j, 2*j+1)...)
		if j+1 < 6 {
			strip = append(strip, join(dot(1, 1, 2*j, 2*j+2), dot(1, 1, 2*j+1, 2*j+3), dot(0.4, 1, 2*j, 2*j+3))...)
			crossed = append(crossed, join(dot(1, 1, 2*j, 2*j+2), dot(1, 1, 2*j+1, 2*j+3), dot(1, 1, 2*j, 2*j+3), dot(1, 1, 2*j+1, 2*j+2))...)
		}
	}
	for j := range 4 {
		for l := range 3 {
			tube = append(tube, dot(1, 1, 3*j+l, 3*j+(l+1)%3)...)
			if j+1 < 4 {
				tube = append(tube, dot(0.6, 1, 3*j+l, 3*j+3+l)...)
			}
		}
	}
	for j := 0; j+2 < 13; j += 2 {
		saw = append(saw, join(dot(1, 1, j, j+1), dot(1, 1, j+1, j+2), dot(1, 1, j, j+2))...)
	}
	halves := bonds(n, 1, 1, 1)
	for i := range halves {
		if o := halves[i].Ops; o[0].Site+o[1].Site == n-1 {
			halves[i].Coef *= 1e-3
		}
	}
	var biquadratic []exact.Term
	for j := range 7 {
		biquadratic = append(biquadratic, join(dot(0.7, 1, j, j+1), square(0.7, j, j+1))...)
	}
	one := exact.Spin(2)
	return []Model{
		spins("frustrated chain, J2 = 0.3", true, chain(s, n), 0, join(bonds(n, 1, 1, 1), bonds(n, 2, 0.3, 1))),
		spins("frustrated chain, J2 = 0.8", true, chain(s, n), 0, join(bonds(n, 1, 1, 1), bonds(n, 2, 0.8, 1))),
		spins("frustrated spin ladder", true, two, 0, strip),
		spins("crossed spin ladder", true, two, 0, crossed),
		spins("triangular tube", true, three, 0, tube),
		spins("saw-tooth chain", true, chain(s, 13), 1, saw),
		spins("disordered Heisenberg chain", true, chain(s, n), 0, join(bonds(n, 1, 1, 1), randomField(n, 2, 4))),
		spins("weakly coupled halves", true, chain(s, n), 0, halves),
		spins("easy-axis chain", false, chain(s, n), 0, bonds(n, 1, 1, 2)),
		spins("easy-plane chain near the ferromagnet", false, chain(s, n), 0, bonds(n, 1, 1, -0.9)),
		spins("spin-one chain", false, chain(one, 8), 0, bonds(8, 1, 1, 1)),
		spins("spin-one chain, frustrated", true, chain(one, 8), 0, join(bonds(8, 1, 1, 1), bonds(8, 2, 0.6, 1))),
		spins("spin-one chain, bilinear-biquadratic", true, chain(one, 8), 0, biquadratic),
		spins("spin-3/2 chain", false, chain(exact.Spin(3), 6), 0, bonds(6, 1, 1, 1)),
	}
}

// spins makes a model of spins in a sector of given 2 S^z.
func spins(name string, hard bool, l lattice, twoSz int, terms []exact.Term) Model {
	sites := l.all()
	m := diagonal(name, hard, l, terms, []string{"S^z", "S^z"}, []exact.Number{exact.TwiceSz(sites)}, []int{twoSz})
	m.Sector = ladder.Sector{"Sz": float64(twoSz) / 2}
	return m
}
