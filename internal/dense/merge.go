package dense

import "math"

// epsilon is the distance from 1 to the next larger number.
const epsilon = 0x1p-52

// deflation times the largest entry is what a merge of divide and conquer neglects.
const deflation = 8 * epsilon

// vanishing is what counts as zero beside a largest entry of 1: quotients of smaller numbers may be quotients of subnormal ones, which
// are not accurate.
const vanishing = 0x1p-400

// normalize copies the diagonal d and the off-diagonal e (len(d)-1 used) of a matrix, divided by a power of two near its largest entry,
// which it returns; zero for a matrix of zeros.
func normalize(d, e, dst, off []float64) (scale float64) {
	n := len(d)
	top := max(larger(0, d), larger(0, e[:n-1]))
	if top == 0 {
		clear(dst)
		clear(off)
		return 0
	}
	_, exp := math.Frexp(top)
	scale = math.Ldexp(1, exp)
	settle := func(x float64) float64 {
		if x /= scale; math.Abs(x) > vanishing {
			return x
		}
		return 0
	}
	off[n-1] = 0
	for i, x := range d {
		dst[i] = settle(x)
		if i+1 < n {
			off[i] = settle(e[i])
		}
	}
	return scale
}

// part tells where a row of singular or eigenvectors can be different from zero.
type part byte

const (
	upperPart part = iota // in the columns of the first half
	bothParts             // in both, after a rotation that joined the halves
	lowerPart
)

// merge is the state of one merge of divide and conquer: two solved halves, joined by one row or one rank-one term, become one
// problem. Vectors are rows; the rows and columns of a merge are those of the whole problem, from lo on.
type merge struct {
	poles []float64 // D of the secular equation
	z     []float64
	rows  []int // row of each pole
	parts []part
	gone  []int // deflated rows, by increasing value
	secular
	scratch []float64

	// Poles in the order upper, dense, lower, for products of contiguous blocks.
	place  []int
	placed []float64 // poles
	weight []float64 // z, recomputed
	count  [3]int

	order []int     // scratch: rows of both halves by value
	moved []float64 // scratch: values of deflated rows
}

// reserve makes room for problems of size n.
func (m *merge) reserve(n int) {
	if cap(m.poles) >= n {
		return
	}
	m.poles, m.z, m.scratch = make([]float64, n), make([]float64, n), make([]float64, n)
	m.placed, m.weight, m.moved = make([]float64, n), make([]float64, n), make([]float64, n)
	m.origin, m.offset = make([]int, n), make([]float64, n)
	m.rows, m.gone, m.place, m.order = make([]int, n), make([]int, n), make([]int, n), make([]int, n)
	m.parts = make([]part, n)
}

// reset starts a merge.
func (m *merge) reset() {
	m.poles, m.z, m.rows, m.parts, m.gone = m.poles[:0], m.z[:0], m.rows[:0], m.parts[:0], m.gone[:0]
}

// keep appends a pole.
func (m *merge) keep(value, z float64, row int, p part) {
	m.poles, m.z, m.rows, m.parts = append(m.poles, value), append(m.z, z), append(m.rows, row), append(m.parts, p)
}

// drop takes out a row, whose value is an answer already.
func (m *merge) drop(row int, values []float64) {
	at := len(m.gone)
	m.gone = append(m.gone, row)
	for at > 0 && values[m.gone[at-1]] > values[row] {
		m.gone[at] = m.gone[at-1]
		at--
	}
	m.gone[at] = row
}

// sorted merges two lists of rows, each by increasing value, into m.order.
func (m *merge) sorted(a, b []int, values []float64) []int {
	out := m.order[:len(a)+len(b)]
	i, j := 0, 0
	for k := range out {
		if j == len(b) || (i < len(a) && values[a[i]] <= values[b[j]]) {
			out[k] = a[i]
			i++
		} else {
			out[k] = b[j]
			j++
		}
	}
	return out
}

// solveSecular finds the roots and the vector z that belongs to them, and sorts the poles by part.
func (m *merge) solveSecular(squared bool) bool {
	k := len(m.poles)
	m.squared, m.d, m.secular.z = squared, m.poles, m.z
	m.origin, m.offset = m.origin[:k], m.offset[:k]
	if k > 0 {
		if !m.secular.solve() {
			return false
		}
		m.recompute(m.scratch[:k])
	}
	m.count = [3]int{}
	for _, p := range m.parts {
		m.count[p]++
	}
	next := [3]int{0, m.count[upperPart], m.count[upperPart] + m.count[bothParts]}
	m.place, m.placed, m.weight = m.place[:k], m.placed[:k], m.weight[:k]
	for j, p := range m.parts {
		at := next[p]
		next[p]++
		m.place[at], m.placed[at], m.weight[at] = m.rows[j], m.poles[j], m.z[j]
	}
	return true
}

// finish puts the values of the merged problem at values[lo:] and lists its rows by increasing value in index: the roots come first,
// in rows lo, lo+1, ..., then the deflated rows.
func (m *merge) finish(lo int, values []float64, index []int) {
	k := len(m.poles)
	moved := m.moved[:len(m.gone)]
	for i, row := range m.gone {
		moved[i] = values[row]
	}
	for i := range k {
		values[lo+i] = m.value(i)
	}
	copy(values[lo+k:], moved)
	i, j := 0, 0
	for at := range k + len(moved) {
		if j == len(moved) || (i < k && values[lo+i] <= moved[j]) {
			index[at] = lo + i
			i++
		} else {
			index[at] = lo + k + j
			j++
		}
	}
}

// coefficients writes, for each of the given roots x, the normalized row c_j = z_j/(D_j - x) over the placed poles.
func (m *merge) coefficients(roots []int, c []float64) {
	k, kind := len(m.placed), plainRow
	if m.squared {
		kind = squaredRow
	}
	for r, i := range roots {
		row := c[r*k : (r+1)*k]
		sum := coefficientRow(kind, m.placed, m.weight[:k], row, m.poles[m.origin[i]], m.offset[i])
		Scale(1/math.Sqrt(sum), row)
	}
}

// leftCoefficients writes the rows d_j z_j/(D_j - x), normalized, of the left singular vectors; that of the pole 0, which is placed at
// zero, is -1 before.
func (m *merge) leftCoefficients(roots []int, zero int, c []float64) {
	k := len(m.placed)
	for r, i := range roots {
		row := c[r*k : (r+1)*k]
		sum := 1 + coefficientRow(leftRow, m.placed, m.weight[:k], row, m.poles[m.origin[i]], m.offset[i])
		row[zero] = -1
		Scale(1/math.Sqrt(sum), row)
	}
}

// collect copies the rows of the poles, from the n-wide matrix x, to one slice: columns from..from+head-1 of those that have an upper
// part, then columns at..at+tail-1 of those that have a lower part.
func (m *merge) collect(x []float64, n, from, head, tail, at int, out []float64) []float64 {
	first, split := m.count[upperPart]+m.count[bothParts], m.count[upperPart]
	out = resize(out, first*head+(len(m.place)-split)*tail)
	next := out
	for _, row := range m.place[:first] {
		copy(next[:head], x[row*n+from:])
		next = next[head:]
	}
	for _, row := range m.place[split:] {
		copy(next[:tail], x[row*n+at:])
		next = next[tail:]
	}
	return out
}

// productRows is the number of rows that are multiplied between two questions whether to stop.
const productRows = 512

// product multiplies the rows of coefficients c by what collect copied: head columns to out, tail columns to out from column at on. It
// reports false if stopped by stop.
func (m *merge) product(rows int, c, collected []float64, head, tail int, out []float64, ldo, at int) bool {
	k, first, split := len(m.place), m.count[upperPart]+m.count[bothParts], m.count[upperPart]
	for from := 0; from < rows; from += productRows {
		if from > 0 && m.stopped() {
			return false
		}
		some, c, out := min(productRows, rows-from), c[from*k:], out[from*ldo:]
		Gemm(NoTrans, NoTrans, some, head, first, 1, c, k, collected, head, 0, out, ldo)
		if tail > 0 {
			Gemm(NoTrans, NoTrans, some, tail, k-split, 1, c[split:], k, collected[first*head:], tail, 0, out[at:], ldo)
		}
	}
	return true
}

// settle moves the deflated rows of x to the places after those of the roots; width columns from lo on matter.
func (m *merge) settle(x []float64, n, lo, width int, spare []float64) []float64 {
	spare = resize(spare, len(m.gone)*width)
	for i, row := range m.gone {
		copy(spare[i*width:(i+1)*width], x[row*n+lo:])
	}
	for i := range m.gone {
		copy(x[(lo+len(m.poles)+i)*n+lo:][:width], spare[i*width:])
	}
	return spare
}

// planeRotation replaces (x, y) by (c x + s y, c y - s x).
func planeRotation(x, y []float64, c, s float64) {
	y = y[:len(x)]
	for i, a := range x {
		b := y[i]
		x[i], y[i] = c*a+s*b, c*b-s*a
	}
}

// counting returns 0, 1, ..., n-1, reusing list.
func counting(list []int, n int) []int {
	for i := len(list); i < n; i++ {
		list = append(list, i)
	}
	return list[:n]
}
