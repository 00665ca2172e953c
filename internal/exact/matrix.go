package exact

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"
)

// An Op is an elementary operator on a site: by name, or diagonal with given
// values of the local states (which for bosons go past the cut).
type Op struct {
	Name     string
	Site     int
	Diagonal func(state int) complex128
}

// A Term is a coefficient times an ordered product; the rightmost acts first.
type Term struct {
	Coef complex128
	Ops  []Op
}

// T writes a term: T(-1, "c^+", 0, "c", 1) is -c^+_0 c_1.
func T(coef complex128, namesAndSites ...any) Term {
	t := Term{Coef: coef}
	for i := 0; i < len(namesAndSites); i += 2 {
		t.Ops = append(t.Ops, Op{Name: namesAndSites[i].(string), Site: namesAndSites[i+1].(int)})
	}
	return t
}

// adjoints maps a name to that of its Hermitian conjugate, if another one.
var adjoints = map[string]string{
	"c": "c^+", "c_up": "c_up^+", "c_down": "c_down^+", "b": "b^+",
	"S^+": "S^-", "Z": "Z^+", "X": "X^+",
	"c^+": "c", "c_up^+": "c_up", "c_down^+": "c_down", "b^+": "b",
	"S^-": "S^+", "Z^+": "Z", "X^+": "X",
}

// Adjoint returns the Hermitian conjugate.
func (t Term) Adjoint() Term {
	out := Term{Coef: cmplx.Conj(t.Coef)}
	for _, op := range slices.Backward(t.Ops) {
		if name, ok := adjoints[op.Name]; ok {
			op.Name = name
		}
		if f := op.Diagonal; f != nil {
			op.Diagonal = func(state int) complex128 { return cmplx.Conj(f(state)) }
		}
		out.Ops = append(out.Ops, op)
	}
	return out
}

// WithAdjoints returns the terms and their Hermitian conjugates.
func WithAdjoints(terms ...Term) []Term {
	out := slices.Clone(terms)
	for _, t := range terms {
		out = append(out, t.Adjoint())
	}
	return out
}

// A word is a term resolved into steps.
type word struct {
	coef  complex128
	steps []step
}

func (b *Basis) words(terms []Term) ([]word, error) {
	var out []word
	for _, t := range terms {
		ws := []word{{coef: t.Coef}}
		for _, op := range t.Ops {
			if op.Site < 0 || op.Site >= len(b.Sites) {
				return nil, fmt.Errorf("exact: operator %q on site %d of %d", op.Name, op.Site, len(b.Sites))
			}
			choices, err := b.Sites[op.Site].steps(op)
			if err != nil {
				return nil, err
			}
			var longer []word
			for _, w := range ws {
				for _, c := range choices {
					longer = append(longer, word{w.coef * c.coef, append(slices.Clone(w.steps), c.step)})
				}
			}
			ws = longer
		}
		out = append(out, ws...)
	}
	return out, nil
}

// act applies the word to the state in place and returns the factor.
func (b *Basis) act(w word, state []int) complex128 {
	coef := w.coef
	for _, s := range slices.Backward(w.steps) {
		if s.odd {
			before := b.Sites[s.site].fermions(state[s.site] & s.mode)
			for k := range s.site {
				before += b.Sites[k].fermions(state[k])
			}
			if before%2 == 1 {
				coef = -coef
			}
		}
		to, c := s.act(state[s.site])
		if c == 0 {
			return 0
		}
		state[s.site], coef = to, coef*c
	}
	return coef
}

// A Matrix is a sparse Hermitian matrix, by columns.
type Matrix struct {
	dim   int
	start []int
	row   []int
	val   []complex128
	real  []float64 // the values, when all are real; else nil
}

// Matrix returns the sum of the terms in the basis. It must be Hermitian and
// keep the sector.
func (b *Basis) Matrix(terms ...Term) (*Matrix, error) {
	words, err := b.words(terms)
	if err != nil {
		return nil, err
	}
	m := &Matrix{dim: b.Dim(), start: []int{0}}
	from, to := make([]int, len(b.Sites)), make([]int, len(b.Sites))
	column := make(map[int]complex128)
	for j := range b.Dim() {
		b.decode(from, j)
		clear(column)
		for _, w := range words {
			copy(to, from)
			c := b.act(w, to)
			if c == 0 {
				continue
			}
			i, where := b.find(to)
			if where == outside {
				return nil, fmt.Errorf("exact: the terms take state %v to %v, out of the sector", from, to)
			}
			if where == inside {
				column[i] += c
			}
		}
		m.push(column)
	}
	return m, m.settle()
}

func (m *Matrix) push(column map[int]complex128) {
	rows := make([]int, 0, len(column))
	for i, v := range column {
		if v != 0 {
			rows = append(rows, i)
		}
	}
	slices.Sort(rows)
	for _, i := range rows {
		m.row = append(m.row, i)
		m.val = append(m.val, column[i])
	}
	m.start = append(m.start, len(m.row))
}

// settle checks Hermiticity and finds out whether the matrix is real.
func (m *Matrix) settle() error {
	allReal := true
	for j := range m.dim {
		for k := m.start[j]; k < m.start[j+1]; k++ {
			i, v := m.row[k], m.val[k]
			if back := cmplx.Conj(m.At(j, i)); cmplx.Abs(v-back) > 1e-12*(1+cmplx.Abs(v)) {
				return fmt.Errorf("exact: not Hermitian: element (%d,%d) is %v, conjugate of (%d,%d) is %v", i, j, v, j, i, back)
			}
			allReal = allReal && math.Abs(imag(v)) <= 1e-15*cmplx.Abs(v)
		}
	}
	if allReal {
		m.real = make([]float64, len(m.val))
		for k, v := range m.val {
			m.real[k] = real(v)
		}
	}
	return nil
}

// Dim returns the dimension.
func (m *Matrix) Dim() int { return m.dim }

// Real tells whether every element is real.
func (m *Matrix) Real() bool { return m.real != nil }

// At returns element (i, j).
func (m *Matrix) At(i, j int) complex128 {
	rows := m.row[m.start[j]:m.start[j+1]]
	if k, ok := slices.BinarySearch(rows, i); ok {
		return m.val[m.start[j]+k]
	}
	return 0
}

func (m *Matrix) dense() []complex128 {
	a := make([]complex128, m.dim*m.dim)
	for j := range m.dim {
		for k := m.start[j]; k < m.start[j+1]; k++ {
			a[m.row[k]*m.dim+j] = m.val[k]
		}
	}
	return a
}

func multiply[N number](m *Matrix, val []N) func(dst, src []N) {
	return func(dst, src []N) {
		clear(dst)
		for j, x := range src {
			for k := m.start[j]; k < m.start[j+1]; k++ {
				dst[m.row[k]] += val[k] * x
			}
		}
	}
}
