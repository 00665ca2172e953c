package block

import (
	"errors"

	"rundle/internal/dense"
	"rundle/internal/task"
)

// QR factors t across the bond after its first left axes, t = q r. q has the left axes and the bond (Out), total zero, orthonormal
// columns; r has the bond (In) and the other axes, the total of t, and for each charge an upper trapezoid with real diagonal >= 0.
// The bond has min(rows, columns) states of each charge that crosses it. ws may be nil. The error is dense.ErrStopped; without a stop of the
// pool (see SVD) there is none.
func QR[T dense.Scalar](t *Tensor[T], left int, ws *Workspace[T], pool *task.Pool) (q, r *Tensor[T], err error) {
	return factor(t, left, dense.QR[T], ws, pool)
}

// LQ factors t = l q like QR, with the orthonormal rows on the right: l has the left axes and the bond (Out), total zero, for each charge
// a lower trapezoid; q has the bond (In) and the other axes, the total of t.
func LQ[T dense.Scalar](t *Tensor[T], left int, ws *Workspace[T], pool *task.Pool) (l, q *Tensor[T], err error) {
	return factor(t, left, dense.LQ[T], ws, pool)
}

// qrCost is the work of a factorization in units of rows*cols*min(rows, cols), an estimate for the hand-out to threads.
const qrCost = 4

// factor applies a dense m×n -> m×k, k×n factorization to the matrix of each charge.
func factor[T dense.Scalar](t *Tensor[T], left int,
	kernel func(m, n int, a []T, lda int, x []T, ldx int, y []T, ldy int, w *dense.Workspace[T]) error,
	ws *Workspace[T], pool *task.Pool) (x, y *Tensor[T], err error) {
	p := PlanMatrix(t.Structure, left)
	bond, errs := make([]int, len(p.Sectors)), make([]error, len(p.Sectors))
	for i := range p.Sectors {
		bond[i] = min(p.Sectors[i].Rows, p.Sectors[i].Cols)
	}
	h := newHalves(p, bond)
	x, y = New[T](h.left.Of), New[T](h.right.Of)
	order, flops := p.byWork(qrCost)
	ws = ws.prepare(pool)
	pool.Do(len(bond), flops, func(worker, j int) {
		i := order[j]
		k, m, w := bond[i], &p.Sectors[i], &ws.workers[worker]
		all := w.take(m.Rows*m.Cols + m.Rows*k + k*m.Cols)
		a, b, c := all[:m.Rows*m.Cols], all[m.Rows*m.Cols:][:m.Rows*k], all[m.Rows*(m.Cols+k):]
		Gather(p, i, a, m.Cols, t.Data)
		if errs[i] = kernel(m.Rows, m.Cols, a, m.Cols, b, k, c, m.Cols, &w.dense); errs[i] == nil {
			Scatter(h.left, i, x.Data, b, k)
			Scatter(h.right, i, y.Data, c, m.Cols)
		}
	})
	if err := errors.Join(errs...); err != nil {
		return nil, nil, dense.ErrStopped // nothing else goes wrong
	}
	return x, y, nil
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
