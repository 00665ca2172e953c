package dmrg

import (
	"cmp"
	"math"
	"slices"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mps/block"
)

// side is theta seen from one side of its bond: one matrix a bond charge, rows the states of that side.
type side[T dense.Scalar] struct {
	charge  block.Charge
	dim     int            // rows
	rows    map[[2]int]int // first row of a pair of sectors: (l, s1) on the left, (s2, r) on the right
	cols    int
	columns map[[2]int]int // first column of a pair of sectors of the other side
	matrix  []T            // dim × cols; for the right side the transpose, cols × dim
	rho     []T            // dim × dim, the reduced density matrix
	values  []float64
	vectors []T // dim × dim, columns by increasing value
	keep    int
	old     bool // the charge is in theta itself
}

// splitMixed cuts theta by the reduced density matrix of the side that is left behind, perturbed by what the Hamiltonian
// reaches from it: rho + mixing * tr(rho) * sum_w P_w P_w^H / tr (White 2005). Charges that theta does not hold but the
// Hamiltonian reaches get at least one state each, within a tenth of the bond, so that no sector is starved.
func (e *engine[T]) splitMixed(h *mpo.Projected[T], theta *block.Tensor[T], right bool, s setting) (a, b *block.Tensor[T], discarded float64, err error) {
	sides := gatherSides(theta, right)
	for i := range sides {
		sides[i].density(right)
	}
	sides = e.perturb(sides, h, theta, right, s.mixing)
	for i := range sides {
		q := &sides[i]
		q.values, q.vectors = make([]float64, q.dim), make([]T, q.dim*q.dim)
		if err := dense.Eigen(q.dim, q.rho, q.dim, q.values, q.vectors, q.dim, nil); err != nil {
			return nil, nil, 0, err
		}
	}
	choose(sides, s.bond, s.mixing)
	iso, center := assemble(theta, sides, right)
	kept := center.Norm()
	total := theta.Norm()
	discarded = max(0, 1-kept*kept/(total*total))
	center.Scale(dense.FromFloat[T](1 / kept))
	if right {
		return iso, center, discarded, nil
	}
	return center, iso, discarded, nil
}

// gatherSides copies theta into one matrix a bond charge, seen from the left (rows (l, s1)) or the right (rows (s2, r)).
// For the right side the matrices hold theta transposed back: cols × dim.
func gatherSides[T dense.Scalar](theta *block.Tensor[T], left bool) []side[T] {
	g := theta.Group
	at := make(map[block.Charge]int)
	var sides []side[T]
	find := func(q block.Charge) *side[T] {
		i, ok := at[q]
		if !ok {
			i = len(sides)
			at[q] = i
			sides = append(sides, side[T]{charge: q, rows: map[[2]int]int{}, columns: map[[2]int]int{}, old: true})
		}
		return &sides[i]
	}
	keys := func(b block.Block) (row, col [2]int) {
		l, r := [2]int{b.Sectors[0], b.Sectors[1]}, [2]int{b.Sectors[2], b.Sectors[3]}
		if left {
			return l, r
		}
		return r, l
	}
	for _, b := range theta.Blocks {
		q := find(g.Add(theta.Axes[0].Sectors[b.Sectors[0]].Charge, theta.Axes[1].Sectors[b.Sectors[1]].Charge))
		row, col := keys(b)
		rd, cd := b.Shape[0]*b.Shape[1], b.Shape[2]*b.Shape[3]
		if !left {
			rd, cd = cd, rd
		}
		if _, ok := q.rows[row]; !ok {
			q.rows[row] = q.dim
			q.dim += rd
		}
		if _, ok := q.columns[col]; !ok {
			q.columns[col] = q.cols
			q.cols += cd
		}
	}
	for i := range sides {
		sides[i].matrix = make([]T, sides[i].dim*sides[i].cols)
	}
	for i, b := range theta.Blocks {
		q := find(g.Add(theta.Axes[0].Sectors[b.Sectors[0]].Charge, theta.Axes[1].Sectors[b.Sectors[1]].Charge))
		row, col := keys(b)
		r, c := q.rows[row], q.columns[col]
		m, n := b.Shape[0]*b.Shape[1], b.Shape[2]*b.Shape[3]
		ld := q.cols
		if !left {
			r, c, ld = c, r, q.dim
		}
		data := theta.Block(i)
		for k := 0; k < m; k++ {
			copy(q.matrix[(r+k)*ld+c:][:n], data[k*n:(k+1)*n])
		}
	}
	return sides
}

// density forms M M^H (left) or M^T conj(M) (right): element (x, y) = sum theta_x conj(theta_y) in both.
func (q *side[T]) density(left bool) {
	q.rho = make([]T, q.dim*q.dim)
	one, zero := dense.FromFloat[T](1), dense.FromFloat[T](0)
	if left {
		dense.Gemm(dense.NoTrans, dense.ConjTrans, q.dim, q.dim, q.cols, one, q.matrix, q.cols, q.matrix, q.cols, zero, q.rho, q.dim)
	} else {
		dense.Gemm(dense.Trans, dense.ConjNoTrans, q.dim, q.dim, q.cols, one, q.matrix, q.dim, q.matrix, q.dim, zero, q.rho, q.dim)
	}
}

// perturb adds what the Hamiltonian reaches, scaled to the weight mixing, and appends the charges that are new.
func (e *engine[T]) perturb(sides []side[T], h *mpo.Projected[T], theta *block.Tensor[T], left bool, mixing float64) []side[T] {
	p := h.PlanPerturbation(left)
	slab := p.Run(h, theta.Data, &e.work, e.pool)
	var total float64
	for _, b := range p.Blocks {
		n := dense.Norm(slab[b.Offset : b.Offset+b.Rows*b.Cols])
		total += n * n
	}
	if total == 0 {
		return sides
	}
	norm := theta.Norm()
	scale := dense.FromFloat[T](mixing * norm * norm / total)
	at := make(map[block.Charge]int)
	for i, q := range sides {
		at[q.charge] = i
	}
	one, zero := dense.FromFloat[T](1), dense.FromFloat[T](0)
	for _, b := range p.Blocks {
		m := slab[b.Offset : b.Offset+b.Rows*b.Cols]
		rho := make([]T, b.Rows*b.Rows)
		if left {
			dense.Gemm(dense.NoTrans, dense.ConjTrans, b.Rows, b.Rows, b.Cols, one, m, b.Cols, m, b.Cols, zero, rho, b.Rows)
		} else {
			dense.Gemm(dense.Trans, dense.ConjNoTrans, b.Rows, b.Rows, b.Cols, one, m, b.Rows, m, b.Rows, zero, rho, b.Rows)
		}
		i, ok := at[b.Charge]
		if !ok {
			i = len(sides)
			sides = append(sides, side[T]{charge: b.Charge, rows: map[[2]int]int{}, columns: map[[2]int]int{}})
		}
		sides[i].add(b, rho, scale, left)
	}
	return sides
}

// add accumulates scale * rho, whose rows are the segments of b, and widens q by segments that it lacks.
func (q *side[T]) add(b mpo.PerturbationBlock, rho []T, scale T, left bool) {
	key := func(s mpo.Segment) [2]int {
		if left {
			return [2]int{s.Outer, s.Site}
		}
		return [2]int{s.Site, s.Outer}
	}
	old := q.dim
	for _, s := range b.Segments {
		if _, ok := q.rows[key(s)]; !ok {
			q.rows[key(s)] = q.dim
			q.dim += s.Dim
		}
	}
	if q.dim > old {
		wide := make([]T, q.dim*q.dim)
		for i := 0; i < old; i++ {
			copy(wide[i*q.dim:][:old], q.rho[i*old:(i+1)*old])
		}
		q.rho = wide
	}
	for _, s := range b.Segments {
		for _, t := range b.Segments {
			r, c := q.rows[key(s)], q.rows[key(t)]
			for k := 0; k < s.Dim; k++ {
				dense.Axpy(scale, rho[(s.Start+k)*b.Rows+t.Start:][:t.Dim], q.rho[(r+k)*q.dim+c:][:t.Dim])
			}
		}
	}
}

// choose marks how many of the largest eigenvalues of each charge stay: the bond largest over all charges, and one for each
// starved charge up to a tenth of the bond more.
func choose[T dense.Scalar](sides []side[T], bond int, mixing float64) {
	type candidate struct {
		value float64
		side  int
	}
	var all []candidate
	var trace float64
	for i, q := range sides {
		for _, v := range q.values {
			all = append(all, candidate{v, i})
			trace += max(v, 0)
		}
	}
	slices.SortStableFunc(all, func(a, b candidate) int { return cmp.Compare(b.value, a.value) })
	floor := trace * min(1e-15, 1e-8*mixing)
	for k, c := range all {
		if k >= bond || (k > 0 && c.value <= floor) {
			break
		}
		sides[c.side].keep++
	}
	spare := 1 + bond/10
	for _, c := range all {
		if spare > 0 && sides[c.side].keep == 0 && c.value > floor {
			sides[c.side].keep = 1
			spare--
		}
	}
}

// assemble builds the isometry from the kept eigenvectors and the centre, theta projected on them.
func assemble[T dense.Scalar](theta *block.Tensor[T], sides []side[T], left bool) (iso, center *block.Tensor[T]) {
	g := theta.Group
	var sectors []block.Sector
	byCharge := make(map[block.Charge]*side[T])
	for i := range sides {
		if q := &sides[i]; q.keep > 0 {
			sectors = append(sectors, block.Sector{Charge: q.charge, Dim: q.keep})
			byCharge[q.charge] = q
		}
	}
	in := block.NewAxis(block.In, sectors...)
	out := in.Reversed()
	leftStructure := block.NewStructure(g, []block.Axis{theta.Axes[0], theta.Axes[1], out}, block.Charge{})
	rightStructure := block.NewStructure(g, []block.Axis{in, theta.Axes[2], theta.Axes[3]}, block.Charge{})
	l, r := block.New[T](leftStructure), block.New[T](rightStructure)
	for i, b := range l.Blocks {
		q := byCharge[out.Sectors[b.Sectors[2]].Charge]
		q.fillLeft(l.Block(i), b, [2]int{b.Sectors[0], b.Sectors[1]}, left)
	}
	for i, b := range r.Blocks {
		q := byCharge[in.Sectors[b.Sectors[0]].Charge]
		q.fillRight(r.Block(i), b, [2]int{b.Sectors[1], b.Sectors[2]}, left)
	}
	if left {
		return l, r
	}
	return r, l
}

// kept returns column k of the kept eigenvectors, largest first, as an index into vectors.
func (q *side[T]) kept(k int) int { return q.dim - 1 - k }

// fillLeft writes a block (l, s1 | bond) of the left tensor: the isometry, or the centre theta · conj(v).
func (q *side[T]) fillLeft(dst []T, b block.Block, key [2]int, left bool) {
	m := b.Shape[0] * b.Shape[1]
	if left {
		row, ok := q.rows[key]
		if !ok {
			return
		}
		for i := 0; i < m; i++ {
			for k := 0; k < q.keep; k++ {
				dst[i*q.keep+k] = q.vectors[(row+i)*q.dim+q.kept(k)]
			}
		}
		return
	}
	col, ok := q.columns[key]
	if !ok || !q.old {
		return
	}
	v := q.selected(len(q.matrix) / q.cols)
	one, zero := dense.FromFloat[T](1), dense.FromFloat[T](0)
	d := len(q.matrix) / q.cols
	dense.Gemm(dense.NoTrans, dense.ConjNoTrans, m, q.keep, d, one, q.matrix[col*d:], d, v, q.keep, zero, dst, q.keep)
}

// fillRight writes a block (bond | s2, r) of the right tensor: the isometry v^T, or the centre v^H theta.
func (q *side[T]) fillRight(dst []T, b block.Block, key [2]int, left bool) {
	n := b.Shape[1] * b.Shape[2]
	if !left {
		row, ok := q.rows[key]
		if !ok {
			return
		}
		for k := 0; k < q.keep; k++ {
			for j := 0; j < n; j++ {
				dst[k*n+j] = q.vectors[(row+j)*q.dim+q.kept(k)]
			}
		}
		return
	}
	col, ok := q.columns[key]
	if !ok || !q.old {
		return
	}
	d := len(q.matrix) / q.cols
	v := q.selected(d)
	one, zero := dense.FromFloat[T](1), dense.FromFloat[T](0)
	dense.Gemm(dense.ConjTrans, dense.NoTrans, q.keep, n, d, one, v, q.keep, q.matrix[col:], q.cols, zero, dst, n)
}

// selected copies the kept eigenvectors, restricted to the first d rows (those that theta has), as a d × keep matrix.
func (q *side[T]) selected(d int) []T {
	v := make([]T, d*q.keep)
	for i := 0; i < d; i++ {
		for k := 0; k < q.keep; k++ {
			v[i*q.keep+k] = q.vectors[i*q.dim+q.kept(k)]
		}
	}
	return v
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }
