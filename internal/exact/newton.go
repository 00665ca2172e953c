package exact

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// newton solves f(x) = 0. f fills the residuals and the Jacobian at x. Steps
// are halved while they make the residual larger.
func newton(x []float64, f func(x, r []float64, jacobian *mat.Dense)) error {
	n := len(x)
	if n == 0 {
		return nil
	}
	r, trial := make([]float64, n), make([]float64, n)
	jacobian, scratch := mat.NewDense(n, n, nil), mat.NewDense(n, n, nil)
	f(x, r, jacobian)
	for range 200 {
		size := maxAbs(r)
		var step mat.VecDense
		if err := step.SolveVec(jacobian, mat.NewVecDense(n, r)); err != nil {
			if _, ill := err.(mat.Condition); !ill {
				return fmt.Errorf("exact: Newton step: %w", err)
			}
		}
		damping := 1.0
		for {
			for i := range trial {
				trial[i] = x[i] - damping*step.AtVec(i)
			}
			f(trial, r, scratch)
			if maxAbs(r) < size || damping < 1e-6 {
				break
			}
			damping /= 2
		}
		if maxAbs(r) >= size && size < 1e-9 { // as small as rounding lets it be
			return nil
		}
		copy(x, trial)
		jacobian.Copy(scratch)
		if maxAbs(r) < 1e-14 {
			return nil
		}
	}
	return fmt.Errorf("exact: Newton did not converge: residual %g", maxAbs(r))
}

func maxAbs(x []float64) float64 {
	var m float64
	for _, v := range x {
		m = max(m, math.Abs(v))
	}
	return m
}

// theta is 2 arctan(x/width), dtheta its derivative by x.
func theta(x, width float64) float64  { return 2 * math.Atan(x/width) }
func dtheta(x, width float64) float64 { return 2 * width / (width*width + x*x) }
