package ladder

import (
	"cmp"
	"math"
	"math/cmplx"
	"slices"
)

// The exchange of neighbouring legs times complex conjugation: where it leaves a Hamiltonian alone, the states and modes that are their
// own images make it real (Modes, Merged).

// exchanges lists the exchanges of neighbouring legs of fitting sites, those of most pairs first, as the first sites of the pairs.
func exchanges(l *Ladder, fit func(Site) bool) [][]int {
	var out [][]int
	for count := len(l.legs) / 2; count > 0; count-- {
		for _, legs := range disjoint(l, fit, 0, count) {
			var sites []int
			for r := range l.rungs {
				for _, a := range legs {
					if s := l.index[a*l.rungs+r]; s >= 0 {
						sites = append(sites, int(s))
					}
				}
			}
			out = append(out, sites)
		}
	}
	return out
}

// disjoint lists the choices of count pairs of neighbouring legs from a leg on, by their first legs.
func disjoint(l *Ladder, fit func(Site) bool, from, count int) [][]int {
	if count == 0 {
		return [][]int{nil}
	}
	var out [][]int
	for a := from; a+1 < len(l.legs); a++ {
		if !fit(l.legs[a].site) || !l.exchangeable(a) {
			continue
		}
		for _, rest := range disjoint(l, fit, a+2, count-1) {
			out = append(out, append([]int{a}, rest...))
		}
	}
	return out
}

// exchangeable reports whether leg a and the next have the same sites on the same rungs.
func (l *Ladder) exchangeable(a int) bool {
	if l.legs[a].site != l.legs[a+1].site {
		return false
	}
	for r := range l.rungs {
		if (l.index[a*l.rungs+r] >= 0) != (l.index[(a+1)*l.rungs+r] >= 0) {
			return false
		}
	}
	return true
}

// partners tells for each site which takes its place in an exchange.
func partners(n int, pairs []int) []int32 {
	p := make([]int32, n)
	for i := range p {
		p[i] = int32(i)
	}
	for _, a := range pairs {
		p[a], p[a+1] = int32(a+1), int32(a)
	}
	return p
}

// exchange is a permutation of sites that swaps neighbours.
type exchange struct {
	lb      *labelling
	partner []int32
}

// image returns a term with its sites exchanged and the sign that fermions give.
func (x *exchange) image(p *Polynomial, f []Factor, buf []Factor) ([]Factor, complex128) {
	out, sign := buf[:0], complex128(1)
	for i := 0; i < len(f); i++ {
		g := Factor{x.partner[f[i].Site], f[i].Op}
		if i+1 < len(f) && f[i+1].Site == g.Site && g.Site > f[i].Site {
			l := p.ladder
			if l.Site(int(f[i].Site)).Odd(f[i].Op) && l.Site(int(f[i+1].Site)).Odd(f[i+1].Op) {
				sign = -sign
			}
			out = append(out, Factor{f[i].Site, f[i+1].Op}, g)
			i++
			continue
		}
		out = append(out, g)
	}
	return out, sign
}

// symmetricGauge finds phases with which every term is the complex conjugate of its image: with angles 2 y, sum (n + n') y =
// -(phase + phase')/2 modulo pi, n and n' the steps of the term and of its image.
func (x *exchange) symmetricGauge(p *Polynomial) ([]float64, bool) {
	var relations []relation
	var buf []Factor
	steps := make(map[int32]int64)
	for t := range p.NumTerms() {
		c, f := p.Term(t)
		image, sign := x.image(p, f, buf)
		buf = image
		d := sign * p.find(image)
		if math.Abs(cmplx.Abs(d)-cmplx.Abs(c)) > hermitianTolerance*cmplx.Abs(c) {
			return nil, false
		}
		clear(steps)
		for _, list := range [2][]Factor{f, image} {
			for _, g := range list {
				for a, n := range x.lb.at(int(g.Site)).site.Raise(g.Op) {
					steps[x.lb.first[g.Site]+int32(a)] += int64(n)
				}
			}
		}
		relations = append(relations, relation{terms: sortedEntries(steps), rhs: phaseOf(-cmplx.Phase(c*d) / 2)})
	}
	s := solveRelations(x.lb.variables(), relations)
	if len(s.bad) > 0 {
		return nil, false
	}
	angles := make([]float64, x.lb.variables())
	for v := range angles {
		angles[v] = 2 * s.shift[v].angle
	}
	return angles, true
}

// sortedEntries lists the steps that are not zero by variable.
func sortedEntries(steps map[int32]int64) []entry {
	var out []entry
	for v, n := range steps {
		if n != 0 {
			out = append(out, entry{v, exactOf(n)})
		}
	}
	slices.SortFunc(out, func(a, b entry) int { return cmp.Compare(a.at, b.at) })
	return out
}

// Small square matrices, row-major.

func product(a, b []complex128) []complex128 {
	n := order(a)
	out := make([]complex128, n*n)
	for i := range n {
		for k := range n {
			if z := a[i*n+k]; z != 0 {
				for j := range n {
					out[i*n+j] += z * b[k*n+j]
				}
			}
		}
	}
	return out
}

func adjoint(a []complex128) []complex128 {
	n := order(a)
	out := make([]complex128, n*n)
	for i := range n {
		for j := range n {
			out[j*n+i] = cmplx.Conj(a[i*n+j])
		}
	}
	return out
}

func kronecker(a, b []complex128) []complex128 {
	m, d := order(a), order(b)
	n := m * d
	out := make([]complex128, n*n)
	for i := range n {
		for j := range n {
			out[i*n+j] = a[i/d*m+j/d] * b[i%d*d+j%d]
		}
	}
	return out
}

func order(a []complex128) int { return int(math.Round(math.Sqrt(float64(len(a))))) }
