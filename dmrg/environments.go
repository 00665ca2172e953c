package dmrg

import (
	"errors"
	"os"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// environments holds what stands left and right of the sites of a chain, and recycles the slabs of what is out of date. Under a cap on
// memory those that are needed last lie on disk; each is read again, beside the numerics, while the update before the one that needs it runs.
type environments[T dense.Scalar] struct {
	lefts  []*block.Tensor[T] // lefts[i]: everything left of site i; nil where it does not stand, or lies on disk
	rights []*block.Tensor[T] // rights[i]: everything right of site i
	spare  [][]T              // slabs that are free
	depot  *depot             // nil: nothing goes to disk
	stored [2][]stored        // on disk: left of each site, right of each
}

// stored is an environment that lies on disk, and may be in memory as well; the zero value lies nowhere.
type stored struct {
	structure *block.Structure
	file      *filed
}

// The sides of environments.stored.
const (
	leftSide = iota
	rightSide
)

// newEnvironments has room for those of a chain. With a depot, what does not fit goes there.
func newEnvironments[T dense.Scalar](sites int, d *depot) *environments[T] {
	return &environments[T]{lefts: make([]*block.Tensor[T], sites), rights: make([]*block.Tensor[T], sites), depot: d,
		stored: [2][]stored{make([]stored, sites), make([]stored, sites)}}
}

// left returns the environment left of site i, which must stand; right that right of it.
func (v *environments[T]) left(i int) (*block.Tensor[T], error)  { return v.fetch(leftSide, i) }
func (v *environments[T]) right(i int) (*block.Tensor[T], error) { return v.fetch(rightSide, i) }

// around returns the environments left of site i and right of site j.
func (v *environments[T]) around(i, j int) (left, right *block.Tensor[T], err error) {
	if left, err = v.left(i); err != nil {
		return nil, nil, err
	}
	right, err = v.right(j)
	return left, right, err
}

// stand reports whether the environments left of site i and right of site j do.
func (v *environments[T]) stand(i, j int) bool {
	return v.stands(leftSide, i) && v.stands(rightSide, j)
}

func (v *environments[T]) stands(side, i int) bool {
	return *v.at(side, i) != nil || v.stored[side][i].file != nil
}

// at is the place in memory of an environment.
func (v *environments[T]) at(side, i int) **block.Tensor[T] {
	if side == leftSide {
		return &v.lefts[i]
	}
	return &v.rights[i]
}

// fetch reads an environment from disk where it is not in memory.
func (v *environments[T]) fetch(side, i int) (*block.Tensor[T], error) {
	t := v.at(side, i)
	if f := v.stored[side][i]; *t == nil && f.file != nil {
		into := v.fresh(f.structure)
		if err := restore(f.file, into.Data); err != nil {
			return nil, v.depot.trouble(err)
		}
		*t = into
	}
	return *t, nil
}

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
func (v *environments[T]) dropLeft(i int)  { v.drop(leftSide, i) }
func (v *environments[T]) dropRight(i int) { v.drop(rightSide, i) }

func (v *environments[T]) drop(side, i int) {
	v.release(v.at(side, i))
	if f := &v.stored[side][i]; f.file != nil {
		_ = os.Remove(f.file.path) // the folder is removed at the end
		*f = stored{}
	}
}

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
		v.dropSpare()
	}
}

// dropSpare gives the smallest free slab to the collector.
func (v *environments[T]) dropSpare() {
	least := 0
	for i, slab := range v.spare {
		if cap(slab) < cap(v.spare[least]) {
			least = i
		}
	}
	v.spare = append(v.spare[:least], v.spare[least+1:]...)
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

// place is an environment by its side and site.
type place struct{ side, site int }

// errand is an environment on its way to disk or back.
type errand[T dense.Scalar] struct {
	place
	tensor  *block.Tensor[T]
	file    *filed
	outward bool
	err     error
}

// during runs the update of a bond and moves environments beside it: in comes the one that the next update needs, out go those needed last, until what
// is held and about that much more fits into room; both in elements.
func (v *environments[T]) during(bond int, right bool, more, room int, update func() error) error {
	if v.depot == nil {
		return update()
	}
	errands, err := v.errands(bond, right, more, room)
	if err != nil {
		return v.depot.trouble(err)
	}
	if len(errands) == 0 {
		return update()
	}
	task.Beside(func() {
		for i := range errands {
			if e := &errands[i]; e.outward {
				e.err = store(e.file, e.tensor.Data)
			} else {
				e.err = restore(e.file, e.tensor.Data)
			}
		}
	}, func() { err = update() })
	for _, e := range errands {
		switch t := v.at(e.side, e.site); {
		case e.err != nil:
			err = errors.Join(err, v.depot.trouble(e.err))
		case e.outward:
			v.stored[e.side][e.site] = stored{e.tensor.Structure, e.file}
			v.release(t)
		default:
			*t = e.tensor
		}
	}
	return err
}

// errands chooses what is to be moved. What lies on disk already leaves memory at once.
func (v *environments[T]) errands(bond int, right bool, more, room int) (all []errand[T], err error) {
	if next, ok := v.ahead(bond, right); ok {
		f := v.stored[next.side][next.site]
		all = append(all, errand[T]{place: next, tensor: v.fresh(f.structure), file: f.file})
		more += f.structure.Size
	}
	excess := v.held() + more - room
	for excess > 0 && len(v.spare) > 1 {
		excess += v.held()
		v.dropSpare()
		excess -= v.held()
	}
	for _, p := range v.latest(bond, right) {
		if excess <= 0 {
			break
		}
		t := v.at(p.side, p.site)
		if *t == nil {
			continue
		}
		excess -= cap((*t).Data)
		if v.stored[p.side][p.site].file != nil {
			*t = nil
			continue
		}
		path, err := v.depot.name()
		if err != nil {
			return nil, err
		}
		all = append(all, errand[T]{place: p, tensor: *t, file: &filed{path: path}, outward: true})
	}
	return all, nil
}

// ahead is the environment that the next update needs, where it has to be read.
func (v *environments[T]) ahead(bond int, right bool) (place, bool) {
	p := place{leftSide, bond - 1}
	if right {
		p = place{rightSide, bond + 2}
	}
	if p.site < 0 || p.site >= len(v.lefts) {
		return p, false
	}
	return p, *v.at(p.side, p.site) == nil && v.stored[p.side][p.site].file != nil
}

// latest lists the environments that this update and the next do without, those needed last first: those behind the update, which the way back
// needs in reverse, then those before it.
func (v *environments[T]) latest(bond int, right bool) (all []place) {
	n := len(v.lefts)
	if right {
		for i := range bond {
			all = append(all, place{leftSide, i})
		}
		for i := n - 1; i > bond+2; i-- {
			all = append(all, place{rightSide, i})
		}
		return all
	}
	for i := n - 1; i > bond+1; i-- {
		all = append(all, place{rightSide, i})
	}
	for i := range max(0, bond-1) {
		all = append(all, place{leftSide, i})
	}
	return all
}
