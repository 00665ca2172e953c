package block

import (
	"fmt"
	"math"
	"math/rand/v2"

	"rundle/internal/dense"
)

// Tensor is a block-sparse tensor: a structure and the slab that holds its blocks. The gaps between blocks are zero, so
// that vector operations run over the whole slab. It has no useful zero value; use New.
type Tensor[T dense.Scalar] struct {
	*Structure
	Data []T
}

// New returns the zero tensor of a structure.
func New[T dense.Scalar](s *Structure) *Tensor[T] {
	return &Tensor[T]{Structure: s, Data: make([]T, s.Size)}
}

// Random returns a tensor whose allowed elements are independent standard normal (complex: both parts).
func Random[T dense.Scalar](s *Structure, rng *rand.Rand) *Tensor[T] {
	t := New[T](s)
	for i := range s.Blocks {
		dense.Random(rng, t.Block(i))
	}
	return t
}

// Identity returns the tensor with axes (a, a reversed) and total zero that has ones on its diagonal.
func Identity[T dense.Scalar](g Group, a Axis) *Tensor[T] {
	t := New[T](NewStructure(g, []Axis{a, a.Reversed()}, Charge{}))
	for i, b := range t.Blocks {
		data := t.Block(i)
		for k := 0; k < b.Shape[0]; k++ {
			data[k*b.Shape[1]+k] = 1
		}
	}
	return t
}

// Block returns block i, row-major with shape Blocks[i].Shape; it shares the tensor's memory.
func (t *Tensor[T]) Block(i int) []T {
	b := &t.Blocks[i]
	return t.Data[b.Offset : b.Offset+b.Len : b.Offset+b.Len]
}

// Clone returns a copy that shares only the structure.
func (t *Tensor[T]) Clone() *Tensor[T] {
	c := New[T](t.Structure)
	copy(c.Data, t.Data)
	return c
}

// Scale multiplies t by alpha.
func (t *Tensor[T]) Scale(alpha T) { dense.Scale(alpha, t.Data) }

// Axpy adds alpha*x to t. The structures must agree.
func (t *Tensor[T]) Axpy(alpha T, x *Tensor[T]) {
	mustMatch("Axpy", t.Structure, x.Structure)
	dense.Axpy(alpha, x.Data, t.Data)
}

// Norm returns the Frobenius norm.
func (t *Tensor[T]) Norm() float64 { return dense.Norm(t.Data) }

// Dot returns the sum of conj(a_i)*b_i. The structures must agree.
func Dot[T dense.Scalar](a, b *Tensor[T]) T {
	mustMatch("Dot", a.Structure, b.Structure)
	return dense.Dot(a.Data, b.Data)
}

// Conj returns the conjugate tensor: values conjugated, flows reversed, total negated.
func (t *Tensor[T]) Conj() *Tensor[T] {
	c := New[T](t.Structure.Conj())
	dense.Conjugate(c.Data, t.Data)
	return c
}

func mustMatch(what string, a, b *Structure) {
	if !a.Equal(b) {
		panic(fmt.Sprintf("block: %s of %v and %v", what, a, b))
	}
}

func mustFit[T dense.Scalar](what string, s *Structure, data []T) {
	if len(data) != s.Size {
		panic(fmt.Sprintf("block: %s: slab of %d elements where %v has %d", what, len(data), s, s.Size))
	}
}

// mustAxis panics unless axis is one of s.
func mustAxis(what string, s *Structure, axis int) {
	if axis < 0 || axis >= len(s.Axes) {
		panic(fmt.Sprintf("block: %s on axis %d of %v", what, axis, s))
	}
}

// Dense returns the tensor as a full row-major array of dimensions Dims.
func (t *Tensor[T]) Dense() []T {
	size := 1
	for _, d := range t.Dims() {
		size *= d
	}
	full := make([]T, size)
	for i := range t.Blocks {
		data := t.Block(i)
		t.eachElement(i, func(at, k int) { full[at] = data[k] })
	}
	return full
}

// eachElement calls visit with the dense index and the index in the block of every element of block i.
func (s *Structure) eachElement(i int, visit func(at, k int)) {
	b := &s.Blocks[i]
	n := len(s.Axes)
	var stride, start, index [MaxAxes]int
	at, step := 0, 1
	for k := n - 1; k >= 0; k-- {
		stride[k], start[k] = step, s.Axes[k].Offset(b.Sectors[k])
		at += step * start[k]
		step *= s.Axes[k].Dim()
	}
	for e := 0; e < b.Len; e++ {
		visit(at, e)
		for k := n - 1; k >= 0; k-- {
			index[k]++
			at += stride[k]
			if index[k] < b.Shape[k] {
				break
			}
			at -= stride[k] * index[k]
			index[k] = 0
		}
	}
}

// ForbiddenError reports an element that the charge rule does not allow.
type ForbiddenError struct {
	Index []int      // its position, one number per axis
	Value complex128 // what was found there
}

func (e *ForbiddenError) Error() string {
	return fmt.Sprintf("element %v is %v but the charge rule allows only zero there", e.Index, e.Value)
}

// FromDense cuts the allowed blocks out of a full row-major array. A forbidden element larger than tol in magnitude, or not a
// number, gives a *ForbiddenError.
func FromDense[T dense.Scalar](s *Structure, data []T, tol float64) (*Tensor[T], error) {
	dims := s.Dims()
	size := 1
	for _, d := range dims {
		size *= d
	}
	if size != len(data) {
		panic(fmt.Sprintf("block: FromDense with %d elements for dimensions %v of %v", len(data), dims, s))
	}
	t := New[T](s)
	allowed := make([]bool, size)
	for i := range s.Blocks {
		block := t.Block(i)
		s.eachElement(i, func(at, k int) { block[k], allowed[at] = data[at], true })
	}
	for at, ok := range allowed {
		if a := dense.Abs(data[at]); !ok && (a > tol || math.IsNaN(a)) {
			return nil, &ForbiddenError{Index: unravel(at, dims), Value: dense.ToComplex(data[at])}
		}
	}
	return t, nil
}

func unravel(at int, dims []int) []int {
	index := make([]int, len(dims))
	for k := len(dims) - 1; k >= 0; k-- {
		index[k] = at % dims[k]
		at /= dims[k]
	}
	return index
}

// ScaleBond multiplies t in place along an axis by per-sector diagonals: element j of sector p by values[p][j].
func ScaleBond[T dense.Scalar](t *Tensor[T], axis int, values [][]float64) {
	mustAxis("ScaleBond", t.Structure, axis)
	a := t.Axes[axis]
	if len(values) != len(a.Sectors) {
		panic(fmt.Sprintf("block: ScaleBond with %d lists of values on axis %v", len(values), a))
	}
	for p, v := range values {
		if len(v) != a.Sectors[p].Dim {
			panic(fmt.Sprintf("block: ScaleBond with %d values for sector %d of axis %v", len(v), p, a))
		}
	}
	for i := range t.Blocks {
		b := &t.Blocks[i]
		inner := 1
		for _, d := range b.Shape[axis+1:] {
			inner *= d
		}
		data, v := t.Block(i), values[b.Sectors[axis]]
		for row := 0; row*inner < len(data); row++ {
			scaleRow(v[row%len(v)], data[row*inner:(row+1)*inner])
		}
	}
}

func scaleRow[T dense.Scalar](alpha float64, x []T) {
	switch x := any(x).(type) {
	case []float64:
		for i := range x {
			x[i] *= alpha
		}
	case []complex128:
		for i := range x {
			x[i] = complex(alpha*real(x[i]), alpha*imag(x[i]))
		}
	}
}
