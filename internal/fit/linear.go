package fit

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/mathext"
)

// A Report is the outcome of a least-squares fit.
type Report struct {
	Params     []float64
	Covariance []float64 // len(Params) squared, row-major
	ChiSquared float64   // sum of ((y - model)/sigma)^2, sigma = 1 if not given
	Freedom    int       // points minus parameters
	Weighted   bool      // sigma was given
	Iterations int       // of a nonlinear fit
	Converged  bool      // always true for a linear fit
}

// Error returns the standard error of parameter i.
func (r Report) Error(i int) float64 { return math.Sqrt(r.Covariance[i*len(r.Params)+i]) }

// Scatter returns the standard deviation of the residuals in units of sigma,
// NaN without a degree of freedom.
func (r Report) Scatter() float64 {
	if r.Freedom == 0 {
		return math.NaN()
	}
	return math.Sqrt(r.ChiSquared / float64(r.Freedom))
}

// Goodness returns the probability that data with the given errors scatter at
// least this much about a true model; NaN without sigma or without a degree of
// freedom.
func (r Report) Goodness() float64 {
	if !r.Weighted || r.Freedom == 0 {
		return math.NaN()
	}
	return mathext.GammaIncRegComp(float64(r.Freedom)/2, r.ChiSquared/2)
}

// Linear fits y_i = sum_k design[i][k] p_k.
func Linear(design [][]float64, y, sigma []float64) (Report, error) {
	if err := checkData(y, sigma); err != nil {
		return Report{}, err
	}
	if len(design) != len(y) {
		return Report{}, fmt.Errorf("fit: %d rows of the design matrix for %d values", len(design), len(y))
	}
	if len(y) == 0 || len(design[0]) == 0 || len(y) < len(design[0]) {
		return Report{}, tooFew(len(y), designWidth(design))
	}
	n := len(design[0])
	a, b := mat.NewDense(len(y), n, nil), mat.NewVecDense(len(y), nil)
	for i, row := range design {
		if len(row) != n {
			return Report{}, fmt.Errorf("fit: row %d of the design matrix has %d columns, row 0 has %d", i, len(row), n)
		}
		for k, v := range row {
			if !finite(v) {
				return Report{}, fmt.Errorf("fit: element (%d, %d) of the design matrix is %v", i, k, v)
			}
			a.Set(i, k, v/weight(sigma, i))
		}
		b.SetVec(i, y[i]/weight(sigma, i))
	}
	p, inverse, err := solve(a, b)
	if err != nil {
		return Report{}, err
	}
	r := Report{Params: p, Covariance: inverse, Freedom: len(y) - n, Weighted: sigma != nil, Converged: true}
	for i, row := range design {
		d := y[i]
		for k, v := range row {
			d -= v * p[k]
		}
		d /= weight(sigma, i)
		r.ChiSquared += d * d
	}
	r.settleErrors()
	return r, nil
}

// settleErrors scales the covariance by the scatter when the errors were not
// given; without a degree of freedom they are unknown.
func (r *Report) settleErrors() {
	if r.Weighted {
		return
	}
	s := r.Scatter()
	for i := range r.Covariance {
		r.Covariance[i] *= s * s
	}
}

// solve minimizes |a p - b| and returns p with the inverse of a^T a. Columns
// are scaled to norm one, so that their units do not matter.
func solve(a *mat.Dense, b *mat.VecDense) (p, inverse []float64, err error) {
	m, n := a.Dims()
	scales := make([]float64, n)
	scaled := mat.NewDense(m, n, nil)
	for k := range n {
		scales[k] = mat.Norm(a.ColView(k), 2)
		if scales[k] == 0 {
			return nil, nil, fmt.Errorf("fit: parameter %d does not enter at any point", k)
		}
		for i := range m {
			scaled.Set(i, k, a.At(i, k)/scales[k])
		}
	}
	var qr mat.QR
	qr.Factorize(scaled)
	var r mat.Dense
	qr.RTo(&r)
	for k := range n {
		if math.Abs(r.At(k, k)) < 1e-13*float64(m) {
			return nil, nil, fmt.Errorf("fit: the data do not tell parameter %d from the ones before it", k)
		}
	}
	x := mat.NewVecDense(n, nil)
	if err := settled(qr.SolveVecTo(x, false, b)); err != nil {
		return nil, nil, err
	}
	// (a^T a)^-1 = r^-1 r^-T
	inv := mat.NewTriDense(n, mat.Upper, nil)
	for i := range n {
		for k := i; k < n; k++ {
			inv.SetTri(i, k, r.At(i, k))
		}
	}
	if err := settled(inv.InverseTri(inv)); err != nil {
		return nil, nil, err
	}
	p, inverse = make([]float64, n), make([]float64, n*n)
	for i := range n {
		p[i] = x.AtVec(i) / scales[i]
		for k := range n {
			for l := max(i, k); l < n; l++ {
				inverse[i*n+k] += inv.At(i, l) * inv.At(k, l)
			}
			inverse[i*n+k] /= scales[i] * scales[k]
		}
	}
	return p, inverse, nil
}

// settled drops gonum's warning of a large condition number: the test on the
// diagonal of r has judged already.
func settled(err error) error {
	if _, ill := err.(mat.Condition); ill {
		return nil
	}
	return err
}

func weight(sigma []float64, i int) float64 {
	if sigma == nil {
		return 1
	}
	return sigma[i]
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }

func checkData(y, sigma []float64) error {
	if sigma != nil && len(sigma) != len(y) {
		return fmt.Errorf("fit: %d errors for %d values", len(sigma), len(y))
	}
	for i, v := range y {
		if !finite(v) {
			return fmt.Errorf("fit: value %d is %v", i, v)
		}
		if sigma != nil && (!finite(sigma[i]) || sigma[i] <= 0) {
			return fmt.Errorf("fit: error %d is %v: it must be positive", i, sigma[i])
		}
	}
	return nil
}

func designWidth(design [][]float64) int {
	if len(design) == 0 {
		return 0
	}
	return len(design[0])
}

func tooFew(points, params int) error {
	return fmt.Errorf("fit: %d points cannot fix %d parameters", points, params)
}
