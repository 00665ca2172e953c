package dmrg

import (
	"slices"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// Figures of the expansion.
const (
	overBond   = 0.1  // part of the bond dimension by which a bond is expanded beyond its cap before it is cut back
	overSample = 1.2  // random states for each state that is wanted
	sampleBase = 4    // and these, of each charge
	leastReach = 1e-7 // of the largest singular value of what is reached: less is not worth a state
)

// expand widens the bond of w by the states of the next site that the Hamiltonian reaches from the centre, outside of what both sites hold
// now: the singular vectors of P_left (H psi) P_right, where P projects on the complement of the kept states of a side (Gleis, Li, von Delft
// 2023). The side of the centre is seen through random states of its complement only, a few more than are wanted (Halko, Martinsson, Tropp
// 2011), so that no tensor of two sites is ever made. Charges absent from the bond take part like all others. The centre gets zeros there: the state stays as it is.
func (e *engine[T]) expand(w *oneWindow[T], s setting) error {
	room := int(float64(s.bond)*(1+overBond)) + 1 - w.center.Axes[w.mid()].Dim()
	if room <= 0 {
		return nil
	}
	kept, err := e.kept(w)
	if err != nil {
		return err
	}
	probe := e.probeOf(w, kept, room)
	if probe == nil {
		return nil
	}
	fresh, err := e.reached(w, probe, room)
	if err != nil || fresh == nil {
		return err
	}
	w.join(fresh)
	return e.regrow(w)
}

// mid is the axis of the centre that is the bond; far that of the next site.
func (w *oneWindow[T]) mid() int {
	if w.toRight {
		return 2
	}
	return 0
}

func (w *oneWindow[T]) far() int { return 2 - w.mid() }

// kept is an isometry onto the states that the centre's side of the window holds.
func (e *engine[T]) kept(w *oneWindow[T]) (q *block.Tensor[T], err error) {
	if w.toRight {
		q, _, err = block.QR(w.center, 2, &e.factors, e.brief)
	} else {
		_, q, err = block.LQ(w.center, 1, &e.factors, e.brief)
	}
	return q, err
}

// outside takes the part of t along the isometry q out, twice for the sake of rounding. toRight: q has the bond as its last axis and t its states as its first two; else the bond is the
// first axis and the states are the last two.
func (e *engine[T]) outside(t, q *block.Tensor[T], last bool) {
	adjoint := q.Conj()
	minus := dense.FromFloat[T](-1)
	for range 2 {
		if last {
			overlap := e.contract(adjoint, t, []int{0, 1}, []int{0, 1})
			t.Axpy(minus, e.contract(q, overlap, []int{2}, []int{0}))
		} else {
			overlap := e.contract(t, adjoint, []int{1, 2}, []int{1, 2})
			t.Axpy(minus, e.contract(overlap, q, []int{1}, []int{0}))
		}
	}
}

// probeOf draws random states of the complement of kept, so many of each charge as its share of the bond asks for and both sides have. It is nil
// where there are none.
func (e *engine[T]) probeOf(w *oneWindow[T], kept *block.Tensor[T], room int) *block.Tensor[T] {
	here, there := free(w.center, w.mid()), free(w.next, w.far())
	bond := kept.Axes[w.mid()]
	var sectors []block.Sector
	for _, x := range here.Sectors {
		have := 0
		if i, ok := bond.Find(x.Charge); ok {
			have = bond.Sectors[i].Dim
		}
		other, ok := there.Find(x.Charge)
		if !ok {
			continue
		}
		held := 0
		if i, ok := w.next.Axes[w.far()].Find(x.Charge); ok {
			held = w.next.Axes[w.far()].Sectors[i].Dim
		}
		share := sampleBase + int(overSample*float64(room)*float64(have)/float64(bond.Dim()))
		if n := min(share, x.Dim-have, there.Sectors[other].Dim-held); n > 0 {
			sectors = append(sectors, block.Sector{Charge: x.Charge, Dim: n})
		}
	}
	if len(sectors) == 0 {
		return nil
	}
	axes := append([]block.Axis{}, w.center.Axes...)
	axes[w.mid()] = block.NewAxis(axes[w.mid()].Flow, sectors...)
	probe := block.New[T](block.NewStructure(w.center.Group, axes, block.Charge{}))
	for i := range probe.Blocks {
		dense.Random(e.rng, probe.Block(i))
	}
	e.outside(probe, kept, w.toRight)
	return probe
}

// free is the axis of all states that the other two axes of a site tensor could give to the bond on axis mid.
func free[T dense.Scalar](t *block.Tensor[T], mid int) block.Axis {
	axes := []block.Axis{t.Axes[0], t.Axes[1]}
	if mid == 0 {
		axes = []block.Axis{t.Axes[1].Reversed(), t.Axes[2].Reversed()}
	}
	return block.NewFusion(t.Group, axes, block.In).Fused
}

// reached returns isometric states of the next site that the Hamiltonian reaches together with the probe, room at most, the strongest first.
func (e *engine[T]) reached(w *oneWindow[T], probe *block.Tensor[T], room int) (*block.Tensor[T], error) {
	i, cut := w.bond, block.Cut{Bond: room, Floor: leastReach}
	var image *block.Tensor[T]
	if w.toRight {
		beyond, err := e.envs.right(i + 1)
		if err != nil {
			return nil, err
		}
		g := e.plan.Left(i, w.left.Structure, probe.Structure, w.center.Structure)
		near := block.New[T](g.Out)
		g.Run(near, w.left, probe, w.center, &e.work, e.pool)
		m := e.plan.Image(i+1, near.Structure, beyond.Structure, w.next.Structure)
		image = m.Run(near, beyond, w.next, &e.work, e.pool)
		e.count(g.Flops() + m.Flops())
	} else {
		beyond, err := e.envs.left(i)
		if err != nil {
			return nil, err
		}
		g := e.plan.Right(i+1, w.right.Structure, probe.Structure, w.center.Structure)
		near := block.New[T](g.Out)
		g.Run(near, w.right, probe, w.center, &e.work, e.pool)
		m := e.plan.Image(i, beyond.Structure, near.Structure, w.next.Structure)
		image = m.Run(beyond, near, w.next, &e.work, e.pool)
		e.count(g.Flops() + m.Flops())
	}
	e.outside(image, w.next, !w.toRight)
	if image.Norm() == 0 {
		return nil, nil
	}
	return e.strongest(w, image, cut)
}

// strongest finds the leading singular vectors of the image, and rids them of what rounding left along the next site.
func (e *engine[T]) strongest(w *oneWindow[T], image *block.Tensor[T], cut block.Cut) (*block.Tensor[T], error) {
	if w.toRight {
		_, _, v, err := block.SVD(image, 1, cut, &e.factors, e.brief)
		if err != nil {
			return nil, err
		}
		e.outside(v, w.next, false)
		_, v, err = block.LQ(v, 1, &e.factors, e.brief)
		return v, err
	}
	u, _, _, err := block.SVD(image, 2, cut, &e.factors, e.brief)
	if err != nil {
		return nil, err
	}
	e.outside(u, w.next, true)
	u, _, err = block.QR(u, 2, &e.factors, e.brief)
	return u, err
}

// join appends the fresh states to the bond: those of the next site after its own, zeros to the centre.
func (w *oneWindow[T]) join(fresh *block.Tensor[T]) {
	old := w.next.Axes[w.far()]
	bond := block.NewAxis(old.Flow, slices.Concat(old.Sectors, fresh.Axes[w.far()].Sectors)...)
	w.center = joined(w.mid(), bond.Reversed(), w.center)
	w.next = joined(w.far(), bond, w.next, fresh)
}

// joined puts parts one after the other along an axis; what is left of the axis holds zeros.
func joined[T dense.Scalar](axis int, whole block.Axis, parts ...*block.Tensor[T]) *block.Tensor[T] {
	axes := slices.Clone(parts[0].Axes)
	axes[axis] = whole
	out := block.New[T](block.NewStructure(parts[0].Group, axes, block.Charge{}))
	used := make([]int, len(whole.Sectors))
	for _, t := range parts {
		for k := range t.Blocks {
			from := &t.Blocks[k]
			at := slices.Clone(from.Sectors)
			at[axis], _ = whole.Find(t.Axes[axis].Sectors[at[axis]].Charge)
			i, _ := out.Find(at...)
			copyAlong(axis, out.Block(i), out.Blocks[i].Shape, used[at[axis]], t.Block(k), from.Shape)
		}
		for _, x := range t.Axes[axis].Sectors {
			i, _ := whole.Find(x.Charge)
			used[i] += x.Dim
		}
	}
	return out
}

// copyAlong copies a block into a larger one of three axes, from a place along one axis on.
func copyAlong[T dense.Scalar](axis int, dst []T, large []int, from int, src []T, small []int) {
	inner, outer := 1, 1
	for k, n := range small {
		if k < axis {
			outer *= n
		} else if k > axis {
			inner *= n
		}
	}
	run := small[axis] * inner
	for k := range outer {
		copy(dst[(k*large[axis]+from)*inner:][:run], src[k*run:][:run])
	}
}

// regrow makes the environment of the widened bond.
func (e *engine[T]) regrow(w *oneWindow[T]) error {
	if w.toRight {
		from, err := e.envs.right(w.bond + 1)
		if err != nil {
			return err
		}
		g := e.plan.RightIsometry(w.bond+1, from, w.next.Structure)
		w.right = block.New[T](g.Out)
		g.Run(w.right, from, w.next, w.next, &e.work, e.pool)
		e.count(g.Flops())
		return nil
	}
	from, err := e.envs.left(w.bond)
	if err != nil {
		return err
	}
	g := e.plan.LeftIsometry(w.bond, from, w.next.Structure)
	w.left = block.New[T](g.Out)
	g.Run(w.left, from, w.next, w.next, &e.work, e.pool)
	e.count(g.Flops())
	return nil
}
