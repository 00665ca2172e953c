package observables

import (
	"fmt"
	"math"

	"rundle/internal/dense"
	"rundle/mpo/ladder"
	"rundle/mps/block"
)

// forest holds operator strings by common beginnings: a node is an operator on a site with all that stands to its left.
type forest[T dense.Scalar] struct {
	ops    []*block.Tensor[T] // by number of the operator, axes (out In, in Out); nil: identity
	byKey  map[opKey]int32
	axes   map[string]int32
	starts [][]*node[T] // per site: nodes of strings that begin there
}

// opKey knows an operator by its axis and the bytes of its matrix.
type opKey struct {
	axis   int32
	matrix string
}

// node is one step of a string on one site.
type node[T dense.Scalar] struct {
	op       int32
	children []*node[T]
	ends     []end // strings that end here
}

// end adds weight times the value of a string to a result.
type end struct {
	result int
	weight complex128
}

func newForest[T dense.Scalar](sites int) *forest[T] {
	return &forest[T]{byKey: make(map[opKey]int32), axes: make(map[string]int32), starts: make([][]*node[T], sites)}
}

// add enters all strings of s with the factor weight for a result. Strings without factors are returned as a constant.
func (f *forest[T]) add(s *ladder.Strings, result int, weight complex128) (constant complex128) {
	numbers := make(map[*ladder.OpTable][]int32) // of the operators of s; 0: not asked yet, else one more than the number
	for i, c := range s.Coef {
		factors := s.Factors[s.Start[i]:s.Start[i+1]]
		if len(factors) == 0 {
			constant += c * weight
			continue
		}
		odd := false
		var at *node[T]
		k := 0
		for site := int(factors[0].Site); k < len(factors); site++ {
			table := s.Tables[site]
			op := int32(0)
			if odd {
				op = table.Filler
			}
			if int(factors[k].Site) == site {
				op = factors[k].Op
				if table.Odd[op] {
					odd = !odd
				}
				k++
			}
			known := numbers[table]
			if known == nil {
				known = make([]int32, len(table.Matrices))
				numbers[table] = known
			}
			if known[op] == 0 {
				known[op] = 1 + f.number(table.Matrices[op], s.Axes[site], s.Group, table.Charges[op])
			}
			if at == nil {
				at = child(&f.starts[site], known[op]-1)
			} else {
				at = child(&at.children, known[op]-1)
			}
		}
		at.ends = append(at.ends, end{result, c * weight})
	}
	return constant
}

func child[T dense.Scalar](list *[]*node[T], op int32) *node[T] {
	for _, n := range *list {
		if n.op == op {
			return n
		}
	}
	n := &node[T]{op: op}
	*list = append(*list, n)
	return n
}

// number interns a local matrix as a tensor with axes (out In, in Out).
func (f *forest[T]) number(m []complex128, axis block.Axis, g block.Group, charge block.Charge) int32 {
	text := fmt.Sprint(axis.Sectors)
	place, ok := f.axes[text]
	if !ok {
		place = int32(len(f.axes))
		f.axes[text] = place
	}
	key := opKey{place, matrixKey(m)}
	if n, ok := f.byKey[key]; ok {
		return n
	}
	n := int32(len(f.ops))
	f.byKey[key] = n
	if isIdentity(m, axis.Dim()) {
		f.ops = append(f.ops, nil)
		return n
	}
	// <out|O|in> carries q(out) - q(in) = charge: out In (+), in Out (-).
	s := block.NewStructure(g, []block.Axis{axis, axis.Reversed()}, charge)
	data := make([]T, len(m))
	for i, z := range m {
		data[i] = dense.FromComplex[T](z)
	}
	t, err := block.FromDense(s, data, 0)
	if err != nil {
		panic(fmt.Sprintf("observables: an operator does not carry its charge: %v", err))
	}
	f.ops = append(f.ops, t)
	return n
}

func matrixKey(m []complex128) string {
	b := make([]byte, 0, 16*len(m))
	for _, z := range m {
		for _, x := range [2]float64{real(z), imag(z)} {
			u := math.Float64bits(x + 0) // -0 and 0 alike
			for k := 0; k < 8; k++ {
				b = append(b, byte(u>>(8*k)))
			}
		}
	}
	return string(b)
}

func isIdentity(m []complex128, d int) bool {
	for i := 0; i < d; i++ {
		for j := 0; j < d; j++ {
			want := complex(0, 0)
			if i == j {
				want = 1
			}
			if m[i*d+j] != want {
				return false
			}
		}
	}
	return true
}
