package mpo

import (
	"math"

	"rundle/internal/dense"
)

// rowValue is an entry of a sparse column.
type rowValue[T dense.Scalar] struct {
	row int32
	v   T
}

// elimination is a sparse matrix whose columns are to be made independent. Its entries are at most about one.
type elimination[T dense.Scalar] struct {
	rows    [][2]int32 // what each row stands for
	columns [][]rowValue[T]

	pivots []int32         // pivot row of each new column
	result [][]rowValue[T] // the new columns: one in the own pivot row, zero in those of the others
}

// wellPosed is the size of the smallest pivot, with columns scaled to one, that passes for independence without a search for
// the largest pivot: rounding is far below, and so is what a threshold could want to drop.
const wellPosed = 1e-6

// independent reports whether the columns are independent beyond doubt, or too many for the allowed work.
func (e *elimination[T]) independent(opt Options) bool {
	core, ok := e.peel(opt.Tolerance)
	if !ok {
		return false
	}
	if len(core) == 0 {
		return true
	}
	a, m := e.matrix(core)
	n := len(core)
	if m < n {
		return false
	}
	if float64(n)*float64(n)*(float64(m)-float64(n)/3)*2 > opt.Work {
		return true
	}
	return smallestPivot(a, m, n) > wellPosed
}

// peel takes away rows and columns that have a single entry left, which settles their rank at no cost, and returns the columns
// that are left (their entries cut down to the rows that are left), or false if some column depends on the others.
func (e *elimination[T]) peel(tolerance float64) (core [][]rowValue[T], ok bool) {
	p := newPeeling(e)
	for len(p.queue) > 0 {
		v := p.queue[len(p.queue)-1]
		p.queue = p.queue[:len(p.queue)-1]
		if v >= 0 && p.colLeft[v] == 1 {
			p.takeColumn(v, tolerance)
		} else if v < 0 && p.rowLeft[^v] == 1 {
			p.takeRow(^v, tolerance)
		}
		if p.empty {
			return nil, false
		}
	}
	for c, col := range e.columns {
		if p.colLeft[c] < 0 {
			continue
		}
		var rest []rowValue[T]
		for _, x := range col {
			if p.rowLeft[x.row] >= 0 {
				rest = append(rest, x)
			}
		}
		core = append(core, rest)
	}
	return core, true
}

// peeling counts what is left of rows and columns; -1 marks those taken away.
type peeling[T dense.Scalar] struct {
	*elimination[T]
	byRow            [][]int32 // columns of each row
	rowLeft, colLeft []int32
	queue            []int32 // columns c and rows ^r with one entry left
	empty            bool    // a column has lost all its entries
}

func newPeeling[T dense.Scalar](e *elimination[T]) *peeling[T] {
	p := &peeling[T]{elimination: e, byRow: make([][]int32, len(e.rows)), rowLeft: make([]int32, len(e.rows)), colLeft: make([]int32, len(e.columns))}
	for c, col := range e.columns {
		p.colLeft[c] = int32(len(col))
		for _, x := range col {
			p.byRow[x.row] = append(p.byRow[x.row], int32(c))
			p.rowLeft[x.row]++
		}
		if len(col) == 1 {
			p.queue = append(p.queue, int32(c))
		}
	}
	for r, n := range p.rowLeft {
		if n == 1 {
			p.queue = append(p.queue, ^int32(r))
		}
	}
	return p
}

// takeColumn takes away a column with one entry and that entry's row.
func (p *peeling[T]) takeColumn(c int32, tolerance float64) {
	for _, x := range p.columns[c] {
		if p.rowLeft[x.row] >= 0 && dense.Abs(x.v) > tolerance {
			p.colLeft[c], p.rowLeft[x.row] = -1, -1
			for _, d := range p.byRow[x.row] {
				p.lessColumn(d)
			}
			return
		}
	}
}

// takeRow takes away a row with one entry and that entry's column.
func (p *peeling[T]) takeRow(r int32, tolerance float64) {
	for _, c := range p.byRow[r] {
		if p.colLeft[c] < 0 {
			continue
		}
		for _, x := range p.columns[c] {
			if x.row == r && dense.Abs(x.v) <= tolerance {
				return
			}
		}
		p.rowLeft[r], p.colLeft[c] = -1, -1
		for _, x := range p.columns[c] {
			p.lessRow(x.row)
		}
		return
	}
}

func (p *peeling[T]) lessColumn(c int32) {
	if p.colLeft[c] < 0 {
		return
	}
	p.colLeft[c]--
	switch p.colLeft[c] {
	case 0:
		p.empty = true
	case 1:
		p.queue = append(p.queue, c)
	}
}

func (p *peeling[T]) lessRow(r int32) {
	if p.rowLeft[r] < 0 {
		return
	}
	p.rowLeft[r]--
	if p.rowLeft[r] == 1 {
		p.queue = append(p.queue, ^r)
	}
}

// matrix writes columns as a row-major matrix, m × len(columns), of the rows that occur, with the largest entry of each column
// scaled to about one.
func (e *elimination[T]) matrix(columns [][]rowValue[T]) (a []T, m int) {
	at := make([]int32, len(e.rows))
	fill(at, none)
	for _, col := range columns {
		for _, x := range col {
			if at[x.row] == none {
				at[x.row] = int32(m)
				m++
			}
		}
	}
	n := len(columns)
	a = make([]T, m*n)
	for c, col := range columns {
		top := far
		for _, x := range col {
			top = max(top, exponent(x.v))
		}
		for _, x := range col {
			a[int(at[x.row])*n+c] = ldexp(x.v, -top)
		}
	}
	return a, m
}

// panel is the number of columns eliminated before the rest of the matrix is brought up to date by one product.
const panel = 48

// smallestPivot factorizes a (row-major, m × n, m >= n; overwritten) by Gaussian elimination with row exchanges and returns the
// smallest pivot, or zero as soon as one is below wellPosed.
func smallestPivot[T dense.Scalar](a []T, m, n int) float64 {
	smallest := math.Inf(1)
	for j := 0; j < n; j += panel {
		end := min(j+panel, n)
		for k := j; k < end; k++ {
			p, size := k, 0.0
			for i := k; i < m; i++ {
				if s := dense.Abs(a[i*n+k]); s > size {
					p, size = i, s
				}
			}
			if size <= wellPosed {
				return 0
			}
			smallest = min(smallest, size)
			if p != k {
				for c := range n {
					a[p*n+c], a[k*n+c] = a[k*n+c], a[p*n+c]
				}
			}
			for i := k + 1; i < m; i++ {
				if a[i*n+k] == 0 {
					continue
				}
				f := a[i*n+k] / a[k*n+k]
				a[i*n+k] = f
				for c := k + 1; c < end; c++ {
					a[i*n+c] -= f * a[k*n+c]
				}
			}
		}
		if end == n {
			break
		}
		for k := j; k < end; k++ { // the panel's rows, right of it
			for i := k + 1; i < end; i++ {
				if f := a[i*n+k]; f != 0 {
					for c := end; c < n; c++ {
						a[i*n+c] -= f * a[k*n+c]
					}
				}
			}
		}
		one := dense.FromFloat[T](1)
		dense.Gemm(dense.NoTrans, dense.NoTrans, m-end, n-end, end-j, -one, a[end*n+j:], n, a[j*n+end:], n, one, a[end*n+end:], n)
	}
	return smallest
}

// reduce eliminates with the largest pivot of the whole matrix each time (Gauss-Jordan on columns) until what is left is below
// the tolerance, and sets pivots and result. It returns the norm of what is left.
func (e *elimination[T]) reduce(tolerance float64) (rest float64) {
	m, n := len(e.rows), len(e.columns)
	a := make([]T, n*m) // a column of the matrix is a row of a
	for c, col := range e.columns {
		for _, x := range col {
			a[c*m+int(x.row)] = x.v
		}
	}
	used := make([]bool, m)
	rank := 0
	for ; rank < min(m, n); rank++ {
		best, size := 0, 0.0
		for c := rank; c < n; c++ {
			for i, x := range a[c*m : (c+1)*m] {
				if s := dense.Abs(x); s > size && !used[i] {
					best, size = c*m+i, s
				}
			}
		}
		if size <= tolerance {
			break
		}
		c, row := best/m, best%m
		pivotal := a[rank*m : (rank+1)*m]
		for i := range pivotal {
			pivotal[i], a[c*m+i] = a[c*m+i], pivotal[i]
		}
		dense.Scale(dense.FromFloat[T](1)/pivotal[row], pivotal)
		pivotal[row] = dense.FromFloat[T](1)
		for c := range n {
			if f := a[c*m+row]; c != rank && f != dense.FromFloat[T](0) {
				dense.Axpy(-f, pivotal, a[c*m:(c+1)*m])
				a[c*m+row] = dense.FromFloat[T](0)
			}
		}
		used[row] = true
		e.pivots = append(e.pivots, int32(row))
	}
	for j := range rank {
		var col []rowValue[T]
		for i, x := range a[j*m : (j+1)*m] {
			if s := dense.Abs(x); s > tolerance {
				col = append(col, rowValue[T]{int32(i), x})
			} else {
				rest = math.Hypot(rest, s)
			}
		}
		e.result = append(e.result, col)
	}
	for c := rank; c < n; c++ {
		for i, x := range a[c*m : (c+1)*m] {
			if !used[i] {
				rest = math.Hypot(rest, dense.Abs(x))
			}
		}
	}
	return rest
}

// ldexp returns x times 2^e.
func ldexp[T dense.Scalar](x T, e int) T {
	switch y := any(x).(type) {
	case float64:
		return any(math.Ldexp(y, e)).(T)
	case complex128:
		return any(complex(math.Ldexp(real(y), e), math.Ldexp(imag(y), e))).(T)
	}
	panic("mpo: a scalar that is neither real nor complex")
}
