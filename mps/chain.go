package mps

import (
	"errors"
	"fmt"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// Chain is a matrix-product state of known arithmetic: one tensor a site with axes left bond (In), site (In), right bond (Out) and
// total charge zero, so that a bond carries the charge of all sites to its left. The leftmost axis is one state of charge zero,
// the rightmost one state of the total charge. Use NewChain, Product or Random; the zero value is of no use.
type Chain[T dense.Scalar] struct {
	Group block.Group
	Sites []*block.Tensor[T]
	// Center is the orthogonality centre: tensors to its left are isometries from the left, those to its right from the right. -1:
	// not known. Whoever replaces tensors keeps it right.
	Center int
}

// NewChain makes a chain of site tensors, which it keeps, with an unknown centre. It returns an error that names the site if they do not
// fit together.
func NewChain[T dense.Scalar](g block.Group, sites []*block.Tensor[T]) (*Chain[T], error) {
	if len(sites) == 0 {
		return nil, errors.New("mps: a chain of no sites; expected at least one")
	}
	for i, t := range sites {
		if err := checkSite(g, t); err != nil {
			return nil, fmt.Errorf("mps: site %d: %w", i, err)
		}
		if i > 0 && !sites[i-1].Axes[2].Equal(t.Axes[0].Reversed()) {
			return nil, fmt.Errorf("mps: site %d: its left bond %v does not continue the right bond %v of site %d", i, t.Axes[0], sites[i-1].Axes[2], i-1)
		}
	}
	if a := sites[0].Axes[0]; a.Dim() != 1 || a.Sectors[0].Charge != (block.Charge{}) {
		return nil, fmt.Errorf("mps: site 0: the left edge is %v; expected one state of charge zero", a)
	}
	if a := sites[len(sites)-1].Axes[2]; a.Dim() != 1 {
		return nil, fmt.Errorf("mps: site %d: the right edge is %v; expected one state", len(sites)-1, a)
	}
	return &Chain[T]{Group: g, Sites: sites, Center: -1}, nil
}

func checkSite[T dense.Scalar](g block.Group, t *block.Tensor[T]) error {
	switch {
	case t == nil || t.Structure == nil:
		return errors.New("no tensor")
	case t.Group != g:
		return fmt.Errorf("a tensor over the group %v in a chain over %v", t.Group, g)
	case len(t.Axes) != 3:
		return fmt.Errorf("a tensor with %d axes; expected left bond, site, right bond", len(t.Axes))
	case t.Axes[0].Flow != block.In || t.Axes[1].Flow != block.In || t.Axes[2].Flow != block.Out:
		return fmt.Errorf("axes with flows %v, %v, %v; expected in, in, out", t.Axes[0].Flow, t.Axes[1].Flow, t.Axes[2].Flow)
	case t.Total != (block.Charge{}):
		return fmt.Errorf("a tensor of total charge %v; expected zero", t.Total)
	case len(t.Data) != t.Size:
		return fmt.Errorf("a slab of %d elements where the structure has %d", len(t.Data), t.Size)
	}
	for k, a := range t.Axes {
		if a.Dim() == 0 {
			return fmt.Errorf("axis %d has no states", k)
		}
	}
	return nil
}

// Len returns the number of sites.
func (c *Chain[T]) Len() int { return len(c.Sites) }

// Bond returns the axis right of site i.
func (c *Chain[T]) Bond(i int) block.Axis { return c.Sites[i].Axes[2] }

// BondDims returns the dimensions of the Len()-1 inner bonds.
func (c *Chain[T]) BondDims() []int {
	dims := make([]int, c.Len()-1)
	for i := range dims {
		dims[i] = c.Bond(i).Dim()
	}
	return dims
}

// MaxBond returns the largest bond dimension, 1 for a single site.
func (c *Chain[T]) MaxBond() int {
	largest := 1
	for _, d := range c.BondDims() {
		largest = max(largest, d)
	}
	return largest
}

// Axes returns the site axes (In).
func (c *Chain[T]) Axes() []block.Axis {
	axes := make([]block.Axis, c.Len())
	for i, t := range c.Sites {
		axes[i] = t.Axes[1]
	}
	return axes
}

// Charge returns the total charge of the state.
func (c *Chain[T]) Charge() block.Charge { return c.Bond(c.Len() - 1).Sectors[0].Charge }

// Clone returns a copy that shares only structures.
func (c *Chain[T]) Clone() *Chain[T] {
	d := c.view()
	for i, t := range d.Sites {
		d.Sites[i] = t.Clone()
	}
	return d
}

// view returns a chain that shares the tensors of c. Functions that move the centre replace tensors and never write into those they
// found, so a view can be regauged without touching c.
func (c *Chain[T]) view() *Chain[T] {
	return &Chain[T]{Group: c.Group, Sites: append([]*block.Tensor[T]{}, c.Sites...), Center: c.Center}
}

// Scale multiplies the state by alpha.
func (c *Chain[T]) Scale(alpha T) { c.Sites[max(c.Center, 0)].Scale(alpha) }

// Promote returns a real chain in complex arithmetic.
func Promote(c *Chain[float64]) *Chain[complex128] {
	p := &Chain[complex128]{Group: c.Group, Center: c.Center}
	for _, t := range c.Sites {
		u := block.New[complex128](t.Structure)
		for i, x := range t.Data {
			u.Data[i] = complex(x, 0)
		}
		p.Sites = append(p.Sites, u)
	}
	return p
}

// mustFit panics unless a and b live on the same sites.
func mustFit[T dense.Scalar](what string, a, b *Chain[T]) {
	fail := func(why string) { panic(fmt.Sprintf("mps: %s of %v and %v: %s", what, a, b, why)) }
	if a.Group != b.Group {
		fail("different groups")
	}
	if a.Len() != b.Len() {
		fail("different lengths")
	}
	for i, t := range a.Sites {
		if x, y := t.Axes[1], b.Sites[i].Axes[1]; !x.Equal(y) {
			fail(fmt.Sprintf("site %d has the states %v and %v", i, x, y))
		}
	}
}

// String describes the chain for messages.
func (c *Chain[T]) String() string {
	kind := "real"
	if dense.IsComplex[T]() {
		kind = "complex"
	}
	return fmt.Sprintf("%s chain over %v of %d sites, charge %v, bond dimension %d", kind, c.Group, c.Len(), c.Charge(), c.MaxBond())
}

// multiply contracts on the threads of a pool.
func multiply[T dense.Scalar](a, b *block.Tensor[T], axesA, axesB []int, ws *block.Scratch[T], pool *task.Pool) *block.Tensor[T] {
	p := block.PlanContract(a.Structure, b.Structure, axesA, axesB)
	out := block.New[T](p.Out)
	block.RunContract(p, out.Data, a.Data, b.Data, ws, pool)
	return out
}
