package mpo

import "rundle/internal/dense"

// growthScheme says how the entries of a window grow an environment L on the left (R on the right likewise): each index of the result is a sum over
// outgoing states of bra^+ y, and each such y a sum of
//
//	x = L[at] ket[state], which may serve several y;
//	mixtures of several L[at], times ket[state];
//	ket[state] alone where L is the identity.
//
// A smallest vertex cover picks between the first two.
type growthScheme[T dense.Scalar] struct {
	same  place    // index of the result that is the identity; nowhere: none
	xs    []corner // index of the environment and incoming state
	mixes []mixture[T]
	ys    []sum3[T]
}

// sum3 is a y: its index of the result, its outgoing state, and its three sorts of terms.
type sum3[T dense.Scalar] struct {
	corner
	xs    []source[T] // from is a number of xs
	mixed []source[T] // of mixes
	kets  []source[T]
}

// source is value times something of an incoming state.
type source[T dense.Scalar] struct {
	from  int
	in    place
	value T
}

// growthScheme returns the scheme of one side, the last one made if it fits.
func (w *window[T]) growthScheme(left bool, from, to place) *growthScheme[T] {
	at := 0
	if left {
		at++
	}
	if from != nowhere {
		at += 2
	}
	if w.growths[at] == nil {
		w.growths[at] = newGrowthScheme(w, left, from, to)
	}
	return w.growths[at]
}

// newGrowthScheme sorts the entries of a window. from and to are where the environment and the result are the identity.
func newGrowthScheme[T dense.Scalar](w *window[T], left bool, from, to place) *growthScheme[T] {
	s := &growthScheme[T]{same: to}
	var begins, others []fullEntry[T] // left: of the environment, right: of the result
	for _, k := range w.links {
		for _, e := range w.local[k.from:k.to] {
			f := fullEntry[T]{place{k.left, e.left}, place{k.right, e.right}, place{k.out, e.out}, place{k.in, e.in}, e.value}
			if !left {
				f.left, f.right = f.right, f.left
			}
			switch {
			case to != nowhere && f.right == to:
			case from != nowhere && f.left == from:
				begins = append(begins, f)
			default:
				others = append(others, f)
			}
		}
	}
	known := make(map[corner]int)
	mixed := covered(others, known, fromLeft[T])
	numbers := make(map[corner]int)
	var mixers []*mixer[T]
	at := func(f *fullEntry[T]) int {
		n := corner{f.right, f.out}
		i, ok := numbers[n]
		if !ok {
			i = len(s.ys)
			numbers[n] = i
			s.ys, mixers = append(s.ys, sum3[T]{corner: n}), append(mixers, newMixer[T]())
		}
		return i
	}
	for i := range others {
		f := &others[i]
		y := at(f)
		if mixed[i] {
			mixers[y].add(f.out, f.in, f.left, f.value)
			continue
		}
		x := numbered(known, &s.xs, corner{f.left, f.in})
		s.ys[y].xs = append(s.ys[y].xs, source[T]{x, f.in, f.value})
	}
	for i := range begins {
		f := &begins[i]
		y := at(f)
		if k, ok := mixers[y].known[[2]place{f.out, f.in}]; ok && len(mixers[y].mixes[k].terms) > 1 {
			mixers[y].mixes[k].unit += f.value
			continue
		}
		s.ys[y].kets = append(s.ys[y].kets, source[T]{0, f.in, f.value})
	}
	for y, m := range mixers {
		list, uses := m.distinct()
		for _, u := range uses {
			s.ys[y].mixed = append(s.ys[y].mixed, source[T]{len(s.mixes) + u.mixture, u.in, u.factor})
		}
		s.mixes = append(s.mixes, list...)
	}
	return s
}
