package observables

import (
	"context"
	"fmt"

	"rundle/mpo/ladder"
	"rundle/mps"
)

// Field holds the expectation values of a formula at all its places.
type Field struct {
	Formula string
	At      [][]ladder.IndexValue // the free indices of each place, j first
	Values  []float64             // real parts
	Imag    []float64             // imaginary parts; nil where the formula is Hermitian
}

// Everywhere returns the expectation value of a formula at all places: the free index j runs over all rungs where every site
// exists, further indices as each says. A formula without free indices has one place.
func Everywhere(ctx context.Context, s *mps.State, formula string, each ladder.Each) (*Field, error) {
	return Observe(ctx, s, ladder.Term{Formula: formula, Each: each})
}

// Observe is Everywhere for a term with its name and restriction.
func Observe(ctx context.Context, s *mps.State, term ladder.Term) (*Field, error) {
	places, err := s.Scope().Places(term)
	if err != nil {
		return nil, err
	}
	f := &Field{Formula: term.Formula}
	polys := make([]*ladder.Polynomial, len(places))
	hermitian := true
	for i, p := range places {
		polys[i] = p.Poly
		f.At = append(f.At, p.At)
		if ok, _ := p.Poly.Hermitian(hermiticity); !ok {
			hermitian = false
		}
	}
	values, err := Expectations(ctx, s, polys)
	if err != nil {
		return nil, err
	}
	f.set(values, hermitian)
	return f, nil
}

// hermiticity is the relative size below which a formula's anti-Hermitian part is rounding.
const hermiticity = 1e-12

func (f *Field) set(values []complex128, hermitian bool) {
	f.Values = make([]float64, len(values))
	for i, v := range values {
		f.Values[i] = real(v)
	}
	if hermitian {
		return
	}
	f.Imag = make([]float64, len(values))
	for i, v := range values {
		f.Imag[i] = imag(v)
	}
}

// Pairs holds a two-point function over all pairs of places.
type Pairs struct {
	First, Second     string                // formulas
	AtFirst, AtSecond [][]ladder.IndexValue // places of the first and the second operator
	Hermitian         bool                  // every product A_x B_y is Hermitian: the values are real
	Values            [][]complex128        // Values[x][y] = <A_x B_y>
	FirstMean         []complex128          // <A_x>
	SecondMean        []complex128          // <B_y>
}

// Connected returns <A_x B_y> - <A_x><B_y>.
func (p *Pairs) Connected() [][]complex128 {
	out := make([][]complex128, len(p.Values))
	for x, row := range p.Values {
		out[x] = make([]complex128, len(row))
		for y, v := range row {
			out[x][y] = v - p.FirstMean[x]*p.SecondMean[y]
		}
	}
	return out
}

// AllPairs returns <A_x B_y> for the formulas first and second at all pairs of their places x and y, equal ones included.
func AllPairs(ctx context.Context, s *mps.State, first, second ladder.Term) (*Pairs, error) {
	a, err := s.Scope().Places(first)
	if err != nil {
		return nil, fmt.Errorf("first operator: %w", err)
	}
	b, err := s.Scope().Places(second)
	if err != nil {
		return nil, fmt.Errorf("second operator: %w", err)
	}
	p := &Pairs{First: first.Formula, Second: second.Formula, Hermitian: true}
	var polys []*ladder.Polynomial
	for _, x := range a {
		p.AtFirst = append(p.AtFirst, x.At)
		polys = append(polys, x.Poly)
	}
	for _, y := range b {
		p.AtSecond = append(p.AtSecond, y.At)
		polys = append(polys, y.Poly)
	}
	for _, x := range a {
		for _, y := range b {
			xy, err := x.Poly.Mul(y.Poly)
			if err != nil {
				return nil, err
			}
			if ok, _ := xy.Hermitian(hermiticity); !ok {
				p.Hermitian = false
			}
			polys = append(polys, xy)
		}
	}
	values, err := Expectations(ctx, s, polys)
	if err != nil {
		return nil, err
	}
	p.FirstMean, p.SecondMean = values[:len(a)], values[len(a):len(a)+len(b)]
	rest := values[len(a)+len(b):]
	for x := range a {
		p.Values = append(p.Values, rest[x*len(b):(x+1)*len(b)])
	}
	return p, nil
}
