package calibration

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// free makes a model of free fermions: with a number of particles, or with pairing in the sector of even parity (particles < 0).
// Densities and entropies follow from the two-point functions (Peschel 2003).
func free(name string, hard bool, l lattice, particles int, finest float64, fill func(q *exact.Quadratic)) Model {
	q := exact.NewQuadratic(l.sites())
	fill(q)
	m := Model{Name: name, Source: "free fermions", Hard: hard, Local: []string{"n", "n"}, Finest: finest, lattice: l, terms: q.Terms(),
		answer: func(m *Model) (Answer, error) { return gaussian(q, particles, l, len(m.Local) == 2) }}
	m.Sector = ladder.Sector{"N": particles}
	if particles < 0 {
		m.Sector = ladder.Sector{"P": 0}
	}
	return m
}

// uniqueGap is the gap below which a state of free fermions counts as degenerate: then the energy alone is known.
const uniqueGap = 1e-6

// gaussian knows densities, or those of neighbours along a leg multiplied.
func gaussian(q *exact.Quadratic, particles int, l lattice, pairs bool) (Answer, error) {
	n := l.sites()
	var g *exact.Gaussian
	var err error
	if particles < 0 {
		g, err = q.Lowest(false)
	} else {
		g, err = q.Filled(particles)
	}
	if err != nil {
		return Answer{}, err
	}
	a := Answer{Energy: g.Energy}
	if g.Gap < uniqueGap {
		return a, nil
	}
	for i := range n {
		if !pairs {
			a.Local = append(a.Local, complex(g.Density(i), 0))
		} else if i+l.legs < n {
			a.Local = append(a.Local, g.TwoPoint("n", i, "n", i+l.legs))
		}
	}
	if l.site.Kind == exact.KindFermion {
		for _, j := range l.farSites() {
			a.Far = append(a.Far, g.TwoPoint("c^+", l.at(0, l.origin()), "c", j))
		}
	}
	a.Entropies, err = blockEntropies(g, n)
	return a, err
}

// blockEntropies finds the entropies of some two dozen cuts in the left half; the others are NaN.
func blockEntropies(g *exact.Gaussian, n int) ([]float64, error) {
	out := make([]float64, n-1)
	stride := max(1, n/48)
	for cut := range out {
		out[cut] = math.NaN()
		if cut > n/2 || cut%stride != 0 {
			continue
		}
		modes := make([]int, cut+1)
		for i := range modes {
			modes[i] = i
		}
		var err error
		if out[cut], err = g.Entropy(modes); err != nil {
			return nil, err
		}
	}
	return out, nil
}

// line adds hoppings -1 to the given distance, of strength t(j).
func line(q *exact.Quadratic, n, distance int, t func(j int) float64) {
	for j := range n - distance {
		q.Hop(j+distance, j, complex(-t(j), 0))
	}
}

func one(int) float64 { return 1 }

// fluxRungs fills a ladder: hoppings -exp(+-i phi/2) on the outer legs and -k on the rungs.
func fluxRungs(q *exact.Quadratic, l lattice, phi, k float64) {
	for j := range l.rungs {
		for leg := range l.legs {
			if leg+1 < l.legs {
				q.Hop(l.at(leg, j), l.at(leg+1, j), complex(-k, 0))
			}
			if j+1 < l.rungs {
				angle := phi * (float64(leg) - float64(l.legs-1)/2)
				q.Hop(l.at(leg, j+1), l.at(leg, j), -cmplx.Exp(complex(0, angle)))
			}
		}
	}
}

// random energies between -w and w.
func disorder(q *exact.Quadratic, n int, w float64, seed uint64) {
	rng := rand.New(rand.NewPCG(seed, 7))
	for i := range n {
		q.Energy(i, w*(2*rng.Float64()-1))
	}
}

// freeModels are chains and ladders of fermions without interaction.
func freeModels() []Model {
	f := exact.Fermion()
	dimers := func(strong, weak float64) func(int) float64 {
		return func(j int) float64 {
			if j%2 == 0 {
				return strong
			}
			return weak
		}
	}
	two := func(rungs int) lattice { return lattice{f, 2, rungs} }
	three := lattice{f, 3, 8}
	pairs := func(n int, mu, delta float64) func(q *exact.Quadratic) {
		return func(q *exact.Quadratic) {
			line(q, n, 1, one)
			for j := range n {
				q.Energy(j, -mu)
				if j+1 < n {
					q.Pair(j, j+1, complex(delta, 0))
				}
			}
		}
	}
	out := []Model{
		free("free chain, 200 sites", false, chain(f, 200), 92, 1e-4, func(q *exact.Quadratic) { line(q, 200, 1, one) }),
		free("free chain, 100 sites, a third filled", false, chain(f, 100), 33, 1e-5, func(q *exact.Quadratic) { line(q, 100, 1, one) }),
		free("free chain, 40 sites", false, chain(f, 40), 17, 1e-7, func(q *exact.Quadratic) { line(q, 40, 1, one) }),
		free("dimerized chain, 120 sites", false, chain(f, 120), 60, 1e-9, func(q *exact.Quadratic) { line(q, 120, 1, dimers(1, 0.5)) }),
		free("dimerized chain, end modes", true, chain(f, 60), 30, 1e-9, func(q *exact.Quadratic) { line(q, 60, 1, dimers(0.5, 1)) }),
		free("two hopping ranges, 40 sites", false, chain(f, 40), 20, 1e-5, func(q *exact.Quadratic) {
			line(q, 40, 1, one)
			line(q, 40, 2, func(int) float64 { return 0.8 })
		}),
		free("trapped chain, 60 sites", false, chain(f, 60), 24, 1e-7, func(q *exact.Quadratic) {
			line(q, 60, 1, one)
			for j := range 60 {
				q.Energy(j, 0.005*math.Pow(float64(j)-29.5, 2))
			}
		}),
		free("weak link, 40 sites", true, chain(f, 40), 20, 1e-7, func(q *exact.Quadratic) {
			line(q, 40, 1, func(j int) float64 {
				if j == 19 {
					return 1e-2
				}
				return 1
			})
		}),
		free("incommensurate potential, 55 sites", true, chain(f, 55), 21, 1e-8, func(q *exact.Quadratic) {
			line(q, 55, 1, one)
			for j := range 55 {
				q.Energy(j, 1.6*math.Cos(2*math.Pi*float64(j)*(math.Sqrt(5)-1)/2))
			}
		}),
		free("disordered chain, 64 sites", true, chain(f, 64), 32, 1e-8, func(q *exact.Quadratic) { line(q, 64, 1, one); disorder(q, 64, 1.5, 1) }),
		free("disordered ladder", true, two(14), 14, 1e-7, func(q *exact.Quadratic) { fluxRungs(q, two(14), 0, 0.7); disorder(q, 28, 2, 2) }),
		free("free ladder, strong rungs", false, two(24), 24, 1e-9, func(q *exact.Quadratic) { fluxRungs(q, two(24), 0, 2.5) }),
		free("free ladder, weak rungs", false, two(16), 12, 1e-5, func(q *exact.Quadratic) { fluxRungs(q, two(16), 0, 0.4) }),
		free("flux ladder, two Fermi seas", true, two(16), 16, 1e-5, func(q *exact.Quadratic) { fluxRungs(q, two(16), 1.2, 0.8) }),
		free("flux ladder, gapped", true, two(20), 20, 1e-8, func(q *exact.Quadratic) {
			fluxRungs(q, two(20), 0.8*math.Pi, 1)
			for i := range 40 {
				q.Energy(i, 1.5*float64(1-2*((i/2+i%2)%2)))
			}
		}),
		free("three legs with flux", true, three, 12, 1e-5, func(q *exact.Quadratic) { fluxRungs(q, three, 0.7, 0.6) }),
		free("flat bands, crossed ladder", true, two(16), 16, 1e-9, func(q *exact.Quadratic) {
			fluxRungs(q, two(16), math.Pi, 0.3)
			for j := range 15 {
				q.Hop(2*j+2, 2*j+1, -1)
				q.Hop(2*j+3, 2*j, -1)
			}
		}),
		free("pairing chain, 60 sites", false, chain(f, 60), -1, 1e-9, pairs(60, 3, 0.6)),
		free("pairing chain, critical", false, chain(f, 40), -1, 1e-7, pairs(40, 2, 0.8)),
		free("pairing ladder", false, two(12), -1, 1e-8, func(q *exact.Quadratic) {
			fluxRungs(q, two(12), 0.5, 0.6)
			for j := range 11 {
				q.Pair(2*j+2, 2*j, 0.5)
				q.Pair(2*j+3, 2*j+1, complex(0.3, 0.2))
			}
			for i := range 24 {
				q.Energy(i, 1.7)
			}
		}),
	}
	return append(out, spinsAsFermions()...)
}

// asSpins rewrites a chain of free fermions as a chain of spins one-half (Jordan, Wigner 1928): c^+ is S^+ on neighbours, n is S^z + 1/2.
func asSpins(name string, hard bool, n, particles int, finest float64, fill func(q *exact.Quadratic), terms []exact.Term) Model {
	m := free(name, hard, chain(exact.Spin(1), n), particles, finest, fill)
	m.Source, m.Local, m.terms = "free fermions (Jordan, Wigner 1928)", []string{"S^z"}, terms
	if particles >= 0 {
		m.Sector = ladder.Sector{"Sz": fmt.Sprintf("%d/2", 2*particles-n)}
	}
	fermions := m.answer
	m.answer = func(m *Model) (Answer, error) {
		a, err := fermions(m)
		for i := range a.Local {
			a.Local[i] -= 0.5
		}
		return a, err
	}
	return m
}

// spinsAsFermions are chains of spins that are free fermions in disguise.
func spinsAsFermions() []Model {
	const n = 32
	rng := rand.New(rand.NewPCG(3, 8))
	couplings := make([]float64, n-1)
	for j := range couplings {
		couplings[j] = math.Pow(rng.Float64(), 1.5)
	}
	var exchange []exact.Term
	for j, c := range couplings {
		exchange = append(exchange, exact.WithAdjoints(exact.T(complex(c/2, 0), "S^+", j, "S^-", j+1))...)
	}
	return []Model{asSpins("random exchange of x and y, 32 spins", true, n, n/2, 1e-7, func(q *exact.Quadratic) {
		for j, c := range couplings {
			q.Hop(j, j+1, complex(c/2, 0))
		}
	}, exchange)}
}
