package dmrg

import (
	"cmp"
	"fmt"
	"slices"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mpo"
	"rundle/mps/block"
)

// side is one charge of the middle bond of theta, seen from the side that the centre leaves behind: that side's states are its rows.
type side[T dense.Scalar] struct {
	charge  block.Charge
	rows    []mpo.Segment
	dim     int
	matrix  []T // of theta, left states × right states; nil where theta lacks the charge
	other   int // states of the other side in matrix
	rho     []T // dim × dim
	eigen   *dense.Hermitian[T]
	values  []float64
	keep    int
	vectors []T // dim × keep, columns by decreasing value
}

// splitPerturbed cuts theta by the reduced density matrix of the side that is left behind, perturbed by what the Hamiltonian
// reaches from it: rho + perturbation * tr(rho) * sum_w P_w P_w^H / tr (White 2005). Charges that theta does not hold but the
// Hamiltonian reaches get at least one state each, within a tenth of the bond, so that no sector is starved. discarded is
// the weight of theta outside of the states kept.
func (e *engine[T]) splitPerturbed(h *mpo.Projected[T], theta *block.Tensor[T], right bool, s setting) (a, b *block.Tensor[T], discarded float64, err error) {
	e.cutting.reset()
	sides := e.perturb(e.densities(theta, right), h, theta, right, s.perturbation)
	if err := e.diagonalize(sides); err != nil {
		return nil, nil, 0, err
	}
	choose(sides, s.bond, s.perturbation)
	if err := e.chosenVectors(sides); err != nil {
		return nil, nil, 0, err
	}
	iso, center := e.assemble(theta, sides, right)
	kept, total := center.Norm(), theta.Norm()
	if !(kept > 0) {
		return nil, nil, 0, fmt.Errorf("the perturbation left nothing of the state; this is a fault of the program")
	}
	discarded = max(0, 1-kept*kept/(total*total))
	center.Scale(dense.FromFloat[T](1 / kept))
	if right {
		return iso, center, discarded, nil
	}
	return center, iso, discarded, nil
}

// cutting keeps the memory of cuts by density matrices from bond to bond.
type cutting[T dense.Scalar] struct {
	eigen   []*dense.Hermitian[T] // most work first
	workers []dense.Workspace[T]
	slab    []T
	used    int
}

// take returns n elements with arbitrary content, valid until reset. A slab that is too small is replaced; what was taken from it before stays.
func (c *cutting[T]) take(n int) []T {
	if c.used+n > len(c.slab) {
		c.slab, c.used = make([]T, max(2*len(c.slab), n)), 0
	}
	c.used += n
	return c.slab[c.used-n : c.used : c.used]
}

func (c *cutting[T]) reset() { c.used = 0 }

// densities cuts theta into one matrix a bond charge and forms the reduced density matrix of each, of the left side if left: element (x, y)
// is the sum of theta_x conj(theta_y). They are valid until the next reset of e.cutting.
func (e *engine[T]) densities(theta *block.Tensor[T], left bool) []side[T] {
	p := block.PlanMatrix(theta.Structure, 2)
	sides, work := make([]side[T], len(p.Sectors)), make([]float64, len(p.Sectors))
	for i := range p.Sectors {
		m := &p.Sectors[i]
		q := &sides[i]
		q.charge, q.dim, q.other = m.Charge, m.Rows, m.Cols
		if left {
			for _, s := range m.RowSegs {
				q.rows = append(q.rows, mpo.Segment{Outer: s.Sectors[0], Site: s.Sectors[1], Start: s.Start, Dim: s.Dim})
			}
		} else {
			q.dim, q.other = m.Cols, m.Rows
			for _, s := range m.ColSegs {
				q.rows = append(q.rows, mpo.Segment{Outer: s.Sectors[1], Site: s.Sectors[0], Start: s.Start, Dim: s.Dim})
			}
		}
		q.matrix, q.rho = e.cutting.take(m.Rows*m.Cols), e.cutting.take(q.dim*q.dim)
		work[i] = 2 * float64(q.dim) * float64(q.dim) * float64(q.other)
	}
	one, zero := dense.FromFloat[T](1), dense.FromFloat[T](0)
	e.spread(work, func(_, _, i int) {
		q := &sides[i]
		block.Gather(p, i, q.matrix, p.Sectors[i].Cols, theta.Data)
		if left {
			dense.Gemm(dense.NoTrans, dense.ConjTrans, q.dim, q.dim, q.other, one, q.matrix, q.other, q.matrix, q.other, zero, q.rho, q.dim)
		} else {
			dense.Gemm(dense.Trans, dense.ConjNoTrans, q.dim, q.dim, q.other, one, q.matrix, q.dim, q.matrix, q.dim, zero, q.rho, q.dim)
		}
	})
	return sides
}

// spread calls do(worker, rank, i) for each piece i of so much work, the most work, rank 0, first.
func (e *engine[T]) spread(work []float64, do func(worker, rank, i int)) {
	total := 0.0
	for _, w := range work {
		total += w
	}
	order := task.ByWork(work)
	e.pool.Do(len(work), total, func(worker, j int) { do(worker, j, order[j]) })
}

// perturb adds what the Hamiltonian reaches, scaled to the given weight, and appends the charges that are new.
func (e *engine[T]) perturb(sides []side[T], h *mpo.Projected[T], theta *block.Tensor[T], left bool, perturbation float64) []side[T] {
	p := h.PlanPerturbation(left)
	reached := p.Densities(h, theta.Data, e.unit, &e.work, e.pool)
	var total float64
	for i, b := range p.Blocks {
		for k := range b.Rows {
			total += dense.Real(reached[i][k*b.Rows+k])
		}
	}
	if !(total > 0) {
		return sides
	}
	norm := theta.Norm()
	scale := dense.FromFloat[T](perturbation * norm * norm / total)
	at := make(map[block.Charge]int)
	for i := range sides {
		at[sides[i].charge] = i
	}
	for i, b := range p.Blocks {
		k, ok := at[b.Charge]
		if !ok {
			k = len(sides)
			rho := e.cutting.take(b.Rows * b.Rows)
			clear(rho)
			sides = append(sides, side[T]{charge: b.Charge, rows: b.Segments, dim: b.Rows, rho: rho})
		}
		// Both list all pairs of a bond and a site sector in the same order.
		if !slices.Equal(sides[k].rows, b.Segments) {
			panic(fmt.Sprintf("dmrg: theta has the rows %v at charge %v, the perturbation %v", sides[k].rows, b.Charge, b.Segments))
		}
		dense.Axpy(scale, reached[i], sides[k].rho)
	}
	return sides
}

// Finding the eigenvalues of a Hermitian matrix takes about factoring times dim³ operations, each vector about choosing times dim².
const (
	factoring = 5
	choosing  = 4
)

// diagonalize finds the eigenvalues of all density matrices.
func (e *engine[T]) diagonalize(sides []side[T]) error {
	c := &e.cutting
	for len(c.eigen) < len(sides) {
		c.eigen = append(c.eigen, new(dense.Hermitian[T]))
	}
	work := make([]float64, len(sides))
	for i := range sides {
		d := float64(sides[i].dim)
		work[i] = factoring * d * d * d
	}
	return e.each(sides, work, func(rank int, q *side[T], w *dense.Workspace[T]) error {
		q.eigen = c.eigen[rank]
		q.eigen.Work = w
		err := q.eigen.Factor(q.dim, q.rho, q.dim)
		q.values = q.eigen.Values()
		return err
	})
}

// chosenVectors finds the eigenvectors that are kept: most of a perturbed density matrix is not.
func (e *engine[T]) chosenVectors(sides []side[T]) error {
	work := make([]float64, len(sides))
	for i := range sides {
		q := &sides[i]
		q.vectors = e.cutting.take(q.dim * q.keep)
		work[i] = choosing * float64(q.dim) * float64(q.dim) * float64(q.keep)
	}
	return e.each(sides, work, func(_ int, q *side[T], w *dense.Workspace[T]) error {
		q.eigen.Work = w
		return q.eigen.Largest(q.keep, q.vectors, q.keep)
	})
}

// each runs do on every side, most work first. The error is that of the first side that has one.
func (e *engine[T]) each(sides []side[T], work []float64, do func(rank int, q *side[T], w *dense.Workspace[T]) error) error {
	c := &e.cutting
	if n := e.pool.Threads(); len(c.workers) < n {
		c.workers = make([]dense.Workspace[T], n)
	}
	for i := range c.workers {
		c.workers[i].Stop = e.brief.Stop()
	}
	errs := make([]error, len(sides))
	e.spread(work, func(worker, rank, i int) { errs[i] = do(rank, &sides[i], &c.workers[worker]) })
	for i, err := range errs {
		if err != nil {
			return fmt.Errorf("density matrix of bond charge %v: %w", sides[i].charge, err)
		}
	}
	return nil
}

// rounding of a density matrix of trace one, and the part of the perturbation below which an eigenvalue is not worth a state.
const (
	densityRounding   = 1e-15
	perturbationFloor = 1e-8
)

// choose marks how many of the largest eigenvalues of each charge stay, bond in all. Charges that would get none share up to a tenth of the
// seats, at least one where there are two or more.
func choose[T dense.Scalar](sides []side[T], bond int, perturbation float64) {
	type candidate struct {
		value float64
		side  int
	}
	var all []candidate
	var trace float64
	for i := range sides {
		for _, v := range sides[i].values {
			all = append(all, candidate{v, i})
			trace += max(v, 0)
		}
	}
	slices.SortStableFunc(all, func(a, b candidate) int { return cmp.Compare(b.value, a.value) })
	floor := trace * min(densityRounding, perturbationFloor*perturbation)
	worth := 1
	for worth < len(all) && all[worth].value > floor {
		worth++
	}
	all = all[:worth]
	n := min(bond, worth)
	seen := make([]bool, len(sides))
	starved := 0
	for k, c := range all {
		if !seen[c.side] && k >= n {
			starved++
		}
		seen[c.side] = true
	}
	spare := min(starved, max(1, bond/10), n-1)
	n -= spare
	for _, c := range all[:n] {
		sides[c.side].keep++
	}
	for _, c := range all[n:] {
		if spare > 0 && sides[c.side].keep == 0 {
			sides[c.side].keep = 1
			spare--
		}
	}
}

// assemble builds the isometry from the kept eigenvectors v, largest first, and the centre, theta projected on them: v^H theta where the left side
// is kept, theta conj(v) where the right one is, whose isometry is v^T.
func (e *engine[T]) assemble(theta *block.Tensor[T], sides []side[T], left bool) (iso, center *block.Tensor[T]) {
	var sectors []block.Sector
	at := make(map[block.Charge]*side[T])
	for i := range sides {
		if q := &sides[i]; q.keep > 0 {
			sectors = append(sectors, block.Sector{Charge: q.charge, Dim: q.keep})
			at[q.charge] = q
		}
	}
	bond := block.NewAxis(block.In, sectors...)
	l := block.New[T](block.NewStructure(theta.Group, []block.Axis{theta.Axes[0], theta.Axes[1], bond.Reversed()}, block.Charge{}))
	r := block.New[T](block.NewStructure(theta.Group, []block.Axis{bond, theta.Axes[2], theta.Axes[3]}, block.Charge{}))
	lp, rp := block.PlanMatrix(l.Structure, 2), block.PlanMatrix(r.Structure, 1)
	if left {
		for i := range lp.Sectors {
			q := at[lp.Sectors[i].Charge]
			block.Scatter(lp, i, l.Data, q.vectors, q.keep)
		}
		e.project(rp, at, r.Data, func(q *side[T], m []T) {
			dense.Gemm(dense.ConjTrans, dense.NoTrans, q.keep, q.other, q.dim, 1, q.vectors, q.keep, q.matrix, q.other, 0, m, q.other)
		})
		return l, r
	}
	for i := range rp.Sectors {
		q := at[rp.Sectors[i].Charge]
		block.Scatter(rp, i, r.Data, transposed(q.vectors, e.cutting.take(q.dim*q.keep), q.dim, q.keep), q.dim)
	}
	e.project(lp, at, l.Data, func(q *side[T], m []T) {
		dense.Gemm(dense.NoTrans, dense.ConjNoTrans, q.other, q.keep, q.dim, 1, q.matrix, q.dim, q.vectors, q.keep, 0, m, q.keep)
	})
	return r, l
}

// project writes the matrix that product forms for each sector of the centre to the slab dst.
func (e *engine[T]) project(p *block.MatrixPlan, at map[block.Charge]*side[T], dst []T, product func(q *side[T], m []T)) {
	work, matrices := make([]float64, len(p.Sectors)), make([][]T, len(p.Sectors))
	for i := range p.Sectors {
		if q := at[p.Sectors[i].Charge]; q.matrix != nil {
			work[i] = 2 * float64(q.dim) * float64(q.keep) * float64(q.other)
			matrices[i] = e.cutting.take(q.keep * q.other)
		}
	}
	e.spread(work, func(_, _, i int) {
		if m := matrices[i]; m != nil {
			product(at[p.Sectors[i].Charge], m)
			block.Scatter(p, i, dst, m, p.Sectors[i].Cols)
		}
	})
}

// transposed writes the transpose of the m×n matrix a to b.
func transposed[T dense.Scalar](a, b []T, m, n int) []T {
	for i := range m {
		for k := range n {
			b[k*m+i] = a[i*n+k]
		}
	}
	return b
}
