package dmrg

import (
	"rundle/internal/dense"
	"rundle/mps/block"
)

// updateOne optimizes one site of bond i, the left one when going right, and moves the centre to the other. Like update it leaves all as it was on an
// error.
func (e *engine[T]) updateOne(i int, right bool, s setting) (energy, discarded, change float64, err error) {
	w, err := e.windowOf(i, right)
	if err != nil {
		return 0, 0, 0, e.at(i, err)
	}
	if s.update == Expanding {
		if err := e.expand(w, s); err != nil {
			return 0, 0, 0, e.at(i, err)
		}
	}
	h := e.plan.Project(w.site, 1, w.left, w.right, w.center.Structure)
	defer h.Release()
	theta := w.center.Clone()
	if energy, err = e.lowest(h, theta, s); err != nil {
		return 0, 0, 0, e.at(i, err)
	}
	change = distance(w.center, theta)
	a, b, discarded, err := e.hand(w, theta, s)
	if err != nil {
		return 0, 0, 0, e.at(i, err)
	}
	return energy, discarded, change, e.move(i, right, a, b)
}

// oneWindow is what the update of one site sees: the site with the environments around it and the site where the centre goes.
type oneWindow[T dense.Scalar] struct {
	bond         int
	site         int
	toRight      bool
	left, right  *block.Tensor[T] // environments around the site
	center, next *block.Tensor[T]
}

func (e *engine[T]) windowOf(i int, right bool) (w *oneWindow[T], err error) {
	w = &oneWindow[T]{bond: i, site: i, toRight: right, center: e.psi.Sites[i], next: e.psi.Sites[i+1]}
	if !right {
		w.site, w.center, w.next = i+1, w.next, w.center
	}
	w.left, w.right, err = e.envs.around(w.site, w.site)
	w.center = w.center.Clone()
	return w, err
}

// hand makes an isometry of the optimized site and gives the rest to the next one. a is left of b.
func (e *engine[T]) hand(w *oneWindow[T], theta *block.Tensor[T], s setting) (a, b *block.Tensor[T], discarded float64, err error) {
	rows := 2
	if !w.toRight {
		rows = 1
	}
	var u, v *block.Tensor[T]
	switch {
	case s.update == Expanding:
		var spec block.Spectrum
		u, spec, v, err = block.SVD(theta, rows, block.Cut{Bond: s.bond, Weight: s.weight}, &e.factors, e.brief)
		if err != nil {
			return nil, nil, 0, err
		}
		discarded = spec.Discarded
		if w.toRight {
			block.ScaleBond(v, 0, spec.Values)
		} else {
			block.ScaleBond(u, 1, spec.Values)
		}
	case w.toRight:
		u, v, err = block.QR(theta, rows, &e.factors, e.brief)
	default:
		u, v, err = block.LQ(theta, rows, &e.factors, e.brief)
	}
	if err != nil {
		return nil, nil, 0, err
	}
	if w.toRight {
		a, b = u, e.contract(v, w.next, []int{1}, []int{0})
		b.Scale(dense.FromFloat[T](1 / b.Norm()))
	} else {
		a, b = e.contract(w.next, u, []int{2}, []int{0}), v
		a.Scale(dense.FromFloat[T](1 / a.Norm()))
	}
	return a, b, discarded, nil
}

// move puts the tensors of bond i in place and moves the centre across, with the environment that it leaves behind.
func (e *engine[T]) move(i int, right bool, a, b *block.Tensor[T]) (err error) {
	e.psi.Sites[i], e.psi.Sites[i+1] = a, b
	if right {
		e.envs.dropRight(i)
		e.psi.Center = i + 1
		err = e.growLeft(i)
	} else {
		e.envs.dropLeft(i + 1)
		e.psi.Center = i
		err = e.growRight(i + 1)
	}
	if err != nil {
		return e.at(i, err)
	}
	return nil
}
