package fit

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// NonlinearOptions steer a nonlinear fit.
type NonlinearOptions struct {
	Iterations int     // most steps; 0: 500
	Tolerance  float64 // relative change of the parameters that ends the fit; 0: 1e-10
}

func (o NonlinearOptions) settled() NonlinearOptions {
	if o.Iterations == 0 {
		o.Iterations = 500
	}
	if o.Tolerance == 0 {
		o.Tolerance = 1e-10
	}
	return o
}

// Nonlinear fits y_i = model(i, p) from the start given. The model is called
// with parameters it may not keep or change; where it is not defined it
// returns NaN or an infinity, and the fit turns back from there.
func Nonlinear(model func(i int, p []float64) float64, y, sigma, start []float64, opt NonlinearOptions) (Report, error) {
	if err := checkData(y, sigma); err != nil {
		return Report{}, err
	}
	if len(start) == 0 || len(y) < len(start) {
		return Report{}, tooFew(len(y), len(start))
	}
	f := &descent{model: model, y: y, sigma: sigma, p: append([]float64(nil), start...), scales: make([]float64, len(start))}
	var ok bool
	if f.residuals, f.chi2, ok = f.evaluate(f.p); !ok {
		return Report{}, fmt.Errorf("fit: the model is not finite at the start %v", start)
	}
	opt = opt.settled()
	r := Report{Freedom: len(y) - len(start), Weighted: sigma != nil}
	damping := 1e-3
	for r.Iterations < opt.Iterations && !r.Converged {
		r.Iterations++
		if err := f.differentiate(); err != nil {
			return Report{}, err
		}
		r.Converged, damping = f.step(damping, opt.Tolerance)
	}
	if err := f.differentiate(); err != nil {
		return Report{}, err
	}
	_, inverse, err := solve(f.jacobian, mat.NewVecDense(len(y), f.residuals))
	if err != nil {
		return Report{}, err
	}
	r.Params, r.Covariance, r.ChiSquared = f.p, inverse, f.chi2
	r.settleErrors()
	return r, nil
}

// A descent is a point of a nonlinear fit on its way down.
type descent struct {
	model     func(i int, p []float64) float64
	y, sigma  []float64
	p         []float64
	residuals []float64 // (y - model)/sigma at p
	chi2      float64
	jacobian  *mat.Dense // of model/sigma at p
	scales    []float64  // largest column norms so far (More 1978)
}

func (f *descent) evaluate(p []float64) (residuals []float64, chi2 float64, ok bool) {
	residuals = make([]float64, len(f.y))
	for i, v := range f.y {
		residuals[i] = (v - f.model(i, p)) / weight(f.sigma, i)
		chi2 += residuals[i] * residuals[i]
	}
	return residuals, chi2, finite(chi2)
}

// differentiate fills the Jacobian by central differences of the width that
// balances rounding and curvature, eps^(1/3).
func (f *descent) differentiate() error {
	f.jacobian = mat.NewDense(len(f.y), len(f.p), nil)
	p := append([]float64(nil), f.p...)
	for k, v := range f.p {
		h := 6e-6 * math.Abs(v)
		if h == 0 {
			h = 6e-6
		}
		above, below := v+h, v-h
		for i := range f.y {
			p[k] = above
			up := f.model(i, p)
			p[k] = below
			down := f.model(i, p)
			slope := (up - down) / (above - below) / weight(f.sigma, i)
			if !finite(slope) {
				return fmt.Errorf("fit: the model is not finite about parameter %d = %g at point %d", k, v, i)
			}
			f.jacobian.Set(i, k, slope)
		}
		p[k] = v
		f.scales[k] = max(f.scales[k], mat.Norm(f.jacobian.ColView(k), 2))
	}
	return nil
}

// step goes one step down, raising the damping until it leads down. It has
// converged when the step is small against the parameters, also when rounding
// leaves no way down.
func (f *descent) step(damping, tolerance float64) (converged bool, next float64) {
	for range 60 {
		d, err := f.damped(damping)
		if err != nil {
			damping *= 10
			continue
		}
		trial, small := make([]float64, len(f.p)), true
		for k, v := range f.p {
			trial[k] = v + d[k]
			small = small && math.Abs(d[k]) <= tolerance*(math.Abs(v)+tolerance)
		}
		residuals, chi2, ok := f.evaluate(trial)
		if ok && chi2 <= f.chi2 {
			f.p, f.residuals, f.chi2 = trial, residuals, chi2
			return small && damping <= 1, max(damping/10, 1e-12)
		}
		if small {
			return true, damping
		}
		damping *= 10
	}
	return false, damping
}

// damped solves min |J d - r|^2 + damping |S d|^2 with S the scales.
func (f *descent) damped(damping float64) ([]float64, error) {
	m, n := f.jacobian.Dims()
	a, b := mat.NewDense(m+n, n, nil), mat.NewVecDense(m+n, nil)
	a.Slice(0, m, 0, n).(*mat.Dense).Copy(f.jacobian)
	for k := range n {
		a.Set(m+k, k, math.Sqrt(damping)*f.scales[k])
	}
	for i, v := range f.residuals {
		b.SetVec(i, v)
	}
	d, _, err := solve(a, b)
	return d, err
}
