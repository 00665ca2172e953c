package solve

import (
	"math"
	"math/cmplx"

	"rundle/mpo/ladder"
)

// largestCoefficient is the largest coefficient of a sum of operator products.
func largestCoefficient(p *ladder.Polynomial) float64 {
	largest := 0.0
	for i := range p.NumTerms() {
		c, _ := p.Term(i)
		largest = max(largest, cmplx.Abs(c))
	}
	return largest
}

// looseBound bounds the distance of an energy from the ground energy, whatever the state: no eigenvalue lies below minus the sum of the norms
// of the terms.
func looseBound(h *ladder.Hamiltonian, f *ladder.Frames, energy float64) (float64, error) {
	norm, err := normBound(h.Poly, f)
	return max(0, energy+norm), err
}

// normBound bounds the norm of an operator by the sum of the norms of its terms.
func normBound(p *ladder.Polynomial, f *ladder.Frames) (float64, error) {
	parts, err := f.StringsByCharge(p)
	if err != nil {
		return 0, err
	}
	var sum float64
	for _, s := range parts {
		for t, c := range s.Coef {
			norm := cmplx.Abs(c)
			for _, x := range s.Factors[s.Start[t]:s.Start[t+1]] {
				norm *= matrixBound(s.Tables[x.Site].Matrices[x.Op])
			}
			sum += norm
		}
	}
	return sum, nil
}

// matrixBound bounds the spectral norm of a square matrix: the root of the largest row sum times the largest column sum of magnitudes.
func matrixBound(m []complex128) float64 {
	n := int(math.Round(math.Sqrt(float64(len(m)))))
	var row, column float64
	for i := range n {
		var r, c float64
		for k := range n {
			r += cmplx.Abs(m[i*n+k])
			c += cmplx.Abs(m[k*n+i])
		}
		row, column = max(row, r), max(column, c)
	}
	return math.Sqrt(row * column)
}
