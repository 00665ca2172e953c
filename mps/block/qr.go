package block

import "rundle/internal/dense"

// QR factors t across the bond after its first left axes, t = q r. q has the left axes and the bond (Out), total zero, orthonormal
// columns; r has the bond (In) and the other axes, the total of t, and for each charge an upper trapezoid with real diagonal >= 0.
// The bond has min(rows, columns) states of each charge that crosses it.
func QR[T dense.Scalar](t *Tensor[T], left int) (q, r *Tensor[T]) {
	return factor(t, left, dense.QR[T])
}

// LQ factors t = l q like QR, with the orthonormal rows on the right: l has the left axes and the bond (Out), total zero, for each charge
// a lower trapezoid; q has the bond (In) and the other axes, the total of t.
func LQ[T dense.Scalar](t *Tensor[T], left int) (l, q *Tensor[T]) {
	return factor(t, left, dense.LQ[T])
}

// factor applies a dense m×n -> m×k, k×n factorization to the matrix of each charge.
func factor[T dense.Scalar](t *Tensor[T], left int,
	kernel func(m, n int, a []T, lda int, x []T, ldx int, y []T, ldy int, w *dense.Workspace[T]) error) (x, y *Tensor[T]) {
	p := PlanMatrix(t.Structure, left)
	bond := make([]int, len(p.Sectors))
	for i := range p.Sectors {
		bond[i] = min(p.Sectors[i].Rows, p.Sectors[i].Cols)
	}
	h := newHalves(p, bond)
	x, y = New[T](h.left.Of), New[T](h.right.Of)
	var w dense.Workspace[T]
	var ws Scratch[T]
	for i, k := range bond {
		m := &p.Sectors[i]
		a, b, c := ws.Take(m.Rows*m.Cols), ws.Take(m.Rows*k), ws.Take(k*m.Cols)
		Gather(p, i, a, m.Cols, t.Data)
		if err := kernel(m.Rows, m.Cols, a, m.Cols, b, k, c, m.Cols, &w); err != nil {
			panic(err) // only what was told to stop fails
		}
		Scatter(h.left, i, x.Data, b, k)
		Scatter(h.right, i, y.Data, c, m.Cols)
		ws.Give(a)
		ws.Give(b)
		ws.Give(c)
	}
	return x, y
}

// halves are the structures on both sides of a new bond, as matrices whose sectors are those of the bond.
type halves struct {
	bond        Axis // flow In
	left, right *MatrixPlan
}

// newHalves cuts p with dims[i] bond states for its sector i; a sector with none disappears.
func newHalves(p *MatrixPlan, dims []int) halves {
	s := p.Of
	sectors := make([]Sector, len(dims))
	for i, d := range dims {
		sectors[i] = Sector{p.Sectors[i].Charge, d}
	}
	h := halves{bond: NewAxis(In, sectors...)}
	axes := append(append([]Axis{}, s.Axes[:p.Left]...), h.bond.Reversed())
	h.left = PlanMatrix(NewStructure(s.Group, axes, Charge{}), p.Left)
	axes = append([]Axis{h.bond}, s.Axes[p.Left:]...)
	h.right = PlanMatrix(NewStructure(s.Group, axes, s.Total), 1)
	return h
}
