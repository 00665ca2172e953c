package exact

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// AnisotropicRing returns the lowest energy of sum S^x S^x + S^y S^y + delta S^z S^z
// of neighbours, spin 1/2, on a ring of the given even number of sites, -1 < delta < 1.
// Bethe equations with M = sites/2 real roots (Yang, Yang 1966), delta = cos g:
//
//	sites phi(l_j; g/2) = 2 pi I_j + sum_k phi(l_j - l_k; g),
//	phi(l; a) = 2 arctan(cot(a) tanh(l)),  I_j = -(M-1)/2 .. (M-1)/2,
//	E = sites delta/4 - sum sin(g)^2 / (cosh(2 l_j) - cos g).
func AnisotropicRing(sites int, delta float64) (float64, error) {
	if sites < 4 || sites%2 == 1 || !(math.Abs(delta) < 1) {
		return 0, fmt.Errorf("exact: ring of %d sites, anisotropy %g: need an even number of at least 4, and -1 < delta < 1", sites, delta)
	}
	m, size, g := sites/2, float64(sites), math.Acos(delta)
	phi := func(l, a float64) float64 { return 2 * math.Atan(math.Tanh(l)/math.Tan(a)) }
	slope := func(l, a float64) float64 { return 2 * math.Sin(2*a) / (math.Cosh(2*l) - math.Cos(2*a)) }
	quantum := func(j int) float64 { return 2 * math.Pi * (float64(j) - float64(m-1)/2) }
	x := make([]float64, m)
	for j := range x {
		// The roots of the infinite ring: their density is that of 2 gd(pi l/g), I_j/sites its part of the whole.
		x[j] = g / math.Pi * math.Asinh(math.Tan(quantum(j)/size))
	}
	err := newton(x, func(x, r []float64, jacobian *mat.Dense) {
		for j := range x {
			r[j] = size*phi(x[j], g/2) - quantum(j)
			own := size * slope(x[j], g/2)
			for k := range x {
				r[j] -= phi(x[j]-x[k], g)
				if k != j {
					d := slope(x[j]-x[k], g)
					own -= d
					jacobian.Set(j, k, d)
				}
			}
			jacobian.Set(j, j, own)
		}
	})
	e := size * delta / 4
	for _, l := range x {
		e -= math.Pow(math.Sin(g), 2) / (math.Cosh(2*l) - delta)
	}
	return e, err
}
