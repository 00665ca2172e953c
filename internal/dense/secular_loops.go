package dense

// The sums over poles that take the time of a merge. Each is a plain loop, which is the contract, and a kernel for lists that are
// long enough to pay for a call.

// fewPoles is the number of poles up to which the plain loops are faster; BenchmarkEigen sets it anew.
const fewPoles = 4

// sums returns the sum of z^2/(D-x) over the given poles, and its derivative, at x = pole + t.
func (s *secular) sums(d, z []float64, pole, t float64) (sum, slope float64) {
	z = z[:len(d)]
	if len(d) > fewPoles && useTiles() {
		return sumsTiles(s.squared, d, z, pole, t)
	}
	if s.squared {
		for j, x := range d {
			q := z[j] / (((x - pole) - t) * ((x + pole) + t))
			sum += z[j] * q
			slope += q * q
		}
		return sum, slope
	}
	for j, x := range d {
		q := z[j] / ((x - pole) - t)
		sum += z[j] * q
		slope += q * q
	}
	return sum, slope
}

// quotients multiplies product[i] by (D_i - x)/(D_i - D_other) with x = pole + t.
func (s *secular) quotients(product, d []float64, pole, t, other float64) {
	product = product[:len(d)]
	if len(d) > fewPoles && useTiles() {
		quotientsTiles(s.squared, product, d, pole, t, other)
		return
	}
	if s.squared {
		for i, x := range d {
			product[i] *= ((x - pole) - t) * ((x + pole) + t) / ((x - other) * (x + other))
		}
		return
	}
	for i, x := range d {
		product[i] *= ((x - pole) - t) / (x - other)
	}
}

// rowKind says what a row of coefficients is made for.
type rowKind byte

const (
	plainRow   rowKind = iota // D = d: eigenvectors
	squaredRow                // D = d^2: right singular vectors
	leftRow                   // left ones
)

// coefficientRow writes z_j/(D_j - x) at x = pole + t, times d_j for left vectors, to row and returns the sum of the squares.
func coefficientRow(kind rowKind, d, z, row []float64, pole, t float64) (squares float64) {
	z, row = z[:len(d)], row[:len(d)]
	if len(d) > fewPoles && useTiles() {
		return rowTiles(kind, d, z, row, pole, t)
	}
	for j, x := range d {
		q := z[j]
		switch kind {
		case plainRow:
			q /= (x - pole) - t
		case squaredRow:
			q /= ((x - pole) - t) * ((x + pole) + t)
		case leftRow:
			q = x * q / (((x - pole) - t) * ((x + pole) + t))
		}
		row[j] = q
		squares += q * q
	}
	return squares
}
