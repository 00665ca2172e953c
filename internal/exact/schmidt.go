package exact

import (
	"cmp"
	"errors"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// A SchmidtValue is a Schmidt coefficient of a cut, with the conserved numbers
// of the states left of it.
type SchmidtValue struct {
	Left  []int // by the basis' Numbers
	Value float64
}

// Schmidt returns the Schmidt values of psi for the cut after the given site,
// decreasing; blocks of the two parts give all their values, zeros included.
func (b *Basis) Schmidt(psi []complex128, site int) ([]SchmidtValue, error) {
	var out []SchmidtValue
	for left, block := range b.split(psi, site) {
		values, err := block.singularValues()
		if err != nil {
			return nil, err
		}
		for _, v := range values {
			out = append(out, SchmidtValue{slices.Clone(left[:len(b.Numbers)]), v})
		}
	}
	slices.SortFunc(out, func(x, y SchmidtValue) int {
		if c := cmp.Compare(y.Value, x.Value); c != 0 {
			return c
		}
		return slices.Compare(x.Left, y.Left)
	})
	return out, nil
}

// Entropies returns the entanglement entropy in nats of every cut; cut k lies
// after site k.
func (b *Basis) Entropies(psi []complex128) ([]float64, error) {
	return b.overCuts(psi, func(weights []float64) float64 {
		var s float64
		for _, p := range weights {
			if p > 0 {
				s -= p * math.Log(p)
			}
		}
		return s
	})
}

// Renyi2 returns -ln sum p^2 of every cut.
func (b *Basis) Renyi2(psi []complex128) ([]float64, error) {
	return b.overCuts(psi, func(weights []float64) float64 {
		var s float64
		for _, p := range weights {
			s += p * p
		}
		return -math.Log(s)
	})
}

func (b *Basis) overCuts(psi []complex128, measure func(weights []float64) float64) ([]float64, error) {
	out := make([]float64, len(b.Sites)-1)
	for cut := range out {
		values, err := b.Schmidt(psi, cut)
		if err != nil {
			return nil, err
		}
		weights := make([]float64, len(values))
		for i, v := range values {
			weights[i] = v.Value * v.Value
		}
		out[cut] = measure(weights)
	}
	return out, nil
}

// A bipartition is the part of a vector with one charge on the left, as a
// matrix between left and right states.
type bipartition struct {
	rows, cols map[uint64]int
	row, col   []int
	val        []complex128
}

func (b *Basis) split(psi []complex128, site int) map[charge]*bipartition {
	blocks := map[charge]*bipartition{}
	state := make([]int, len(b.Sites))
	for i, amplitude := range psi {
		b.decode(state, i)
		var left charge
		for k := range site + 1 {
			left = b.add(left, k, state[k])
		}
		block := blocks[left]
		if block == nil {
			block = &bipartition{rows: map[uint64]int{}, cols: map[uint64]int{}}
			blocks[left] = block
		}
		block.row = append(block.row, rank(block.rows, b.codes[i]/b.stride[site]))
		block.col = append(block.col, rank(block.cols, b.codes[i]%b.stride[site]))
		block.val = append(block.val, amplitude)
	}
	return blocks
}

// rank numbers the keys of m in the order in which they come, from 0.
func rank(m map[uint64]int, key uint64) int {
	n, ok := m[key]
	if !ok {
		n = len(m)
		m[key] = n
	}
	return n
}

// singularValues goes through the real matrix ((Re, -Im), (Im, Re)), which has
// every singular value twice.
func (p *bipartition) singularValues() ([]float64, error) {
	r, c := len(p.rows), len(p.cols)
	complexValued := slices.ContainsFunc(p.val, func(z complex128) bool { return imag(z) != 0 })
	copies := 1
	if complexValued {
		copies = 2
	}
	m := mat.NewDense(copies*r, copies*c, nil)
	for k, z := range p.val {
		i, j := p.row[k], p.col[k]
		m.Set(i, j, real(z))
		if complexValued {
			m.Set(i+r, j+c, real(z))
			m.Set(i, j+c, -imag(z))
			m.Set(i+r, j, imag(z))
		}
	}
	var svd mat.SVD
	if !svd.Factorize(m, mat.SVDNone) {
		return nil, errors.New("exact: singular values did not converge")
	}
	all := svd.Values(nil)
	values := make([]float64, min(r, c))
	for i := range values {
		values[i] = all[copies*i]
	}
	return values, nil
}
