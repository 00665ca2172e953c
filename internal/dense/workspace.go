package dense

// Workspace is scratch memory that grows to what its user needs and is then reused. The zero value is ready. It is not for
// concurrent use. Functions that take one accept nil and then allocate.
type Workspace[T Scalar] struct {
	// Stop, unless nil, is asked now and then by factorizations: between panels, merges and blocks of reflections, every few
	// milliseconds where matrices are large. Once it says true they return ErrStopped; their results are then not to be used, all
	// else is as before. It has to be quick. What runs in LAPACK (tag netlib) cannot be stopped.
	Stop func() bool

	elems arena[T]
	reals arena[float64]
	rows  reflectors[T] // of QR and LQ
	eigen hermitian[T]  // of Eigen
}

// arena hands out pieces of one buffer. A buffer that is too small is replaced; pieces handed out before stay alive with the old one.
type arena[E any] struct {
	buf  []E
	used int
}

func (a *arena[E]) take(n int) []E {
	if a.used+n > len(a.buf) {
		a.buf = make([]E, max(2*len(a.buf), a.used+n))
	}
	piece := a.buf[a.used : a.used+n : a.used+n]
	a.used += n
	return piece
}

// mark and release bracket the takes of one function.
type mark struct{ elems, reals int }

func (w *Workspace[T]) mark() mark { return mark{w.elems.used, w.reals.used} }

func (w *Workspace[T]) release(m mark) { w.elems.used, w.reals.used = m.elems, m.reals }

// stopped asks Stop.
func (w *Workspace[T]) stopped() bool { return w.Stop != nil && w.Stop() }

func orNew[T Scalar](w *Workspace[T]) *Workspace[T] {
	if w == nil {
		return new(Workspace[T])
	}
	return w
}
