package dmrg

import (
	"rundle/internal/dense"
	"rundle/mps/block"
)

// environments holds what stands left and right of the sites of a chain, and recycles the slabs of what is out of date.
type environments[T dense.Scalar] struct {
	lefts  []*block.Tensor[T] // lefts[i]: everything left of site i; nil where it does not stand
	rights []*block.Tensor[T] // rights[i]: everything right of site i
	spare  [][]T              // slabs that are free
}

func newEnvironments[T dense.Scalar](sites int) *environments[T] {
	return &environments[T]{lefts: make([]*block.Tensor[T], sites), rights: make([]*block.Tensor[T], sites)}
}

// left returns the environment left of site i, which must stand; right that right of it.
func (v *environments[T]) left(i int) (*block.Tensor[T], error)  { return v.lefts[i], nil }
func (v *environments[T]) right(i int) (*block.Tensor[T], error) { return v.rights[i], nil }

// around returns the environments left of site i and right of site j.
func (v *environments[T]) around(i, j int) (left, right *block.Tensor[T], err error) {
	if left, err = v.left(i); err != nil {
		return nil, nil, err
	}
	right, err = v.right(j)
	return left, right, err
}

// stand reports whether the environments left of site i and right of site j do.
func (v *environments[T]) stand(i, j int) bool { return v.lefts[i] != nil && v.rights[j] != nil }

// setLeft takes the environment left of site i, made by fresh or anew; an old one is dropped. setRight does so for the right.
func (v *environments[T]) setLeft(i int, t *block.Tensor[T]) {
	v.dropLeft(i)
	v.lefts[i] = t
}

func (v *environments[T]) setRight(i int, t *block.Tensor[T]) {
	v.dropRight(i)
	v.rights[i] = t
}

// dropLeft gives up the environment left of site i where it stands; dropRight that right of it.
func (v *environments[T]) dropLeft(i int)  { v.release(&v.lefts[i]) }
func (v *environments[T]) dropRight(i int) { v.release(&v.rights[i]) }

// fresh returns a tensor for a new environment, in an old slab where one is large enough. Its elements are arbitrary.
func (v *environments[T]) fresh(s *block.Structure) *block.Tensor[T] {
	best := -1
	for i, slab := range v.spare {
		if cap(slab) >= s.Size && (best < 0 || cap(slab) < cap(v.spare[best])) {
			best = i
		}
	}
	if best < 0 {
		return block.New[T](s)
	}
	slab := v.spare[best][:s.Size]
	v.spare = append(v.spare[:best], v.spare[best+1:]...)
	return &block.Tensor[T]{Structure: s, Data: slab}
}

// release takes the slab of an environment that is out of date. Of the slabs that are free the two largest are kept.
func (v *environments[T]) release(t **block.Tensor[T]) {
	if *t == nil {
		return
	}
	v.spare = append(v.spare, (*t).Data)
	*t = nil
	if len(v.spare) > 2 {
		least := 0
		for i, slab := range v.spare {
			if cap(slab) < cap(v.spare[least]) {
				least = i
			}
		}
		v.spare = append(v.spare[:least], v.spare[least+1:]...)
	}
}

// held is the elements in memory, spare slabs included.
func (v *environments[T]) held() int {
	n := 0
	for i := range v.lefts {
		for _, t := range []*block.Tensor[T]{v.lefts[i], v.rights[i]} {
			if t != nil {
				n += cap(t.Data)
			}
		}
	}
	for _, slab := range v.spare {
		n += cap(slab)
	}
	return n
}
