package ladder

import (
	"math"
	"math/cmplx"
	"strconv"
)

// expOf is exp(z) with the rounding of multiples of pi/2 removed: exp(i*pi) is -1.
func expOf(z complex128) complex128 {
	scale := math.Exp(real(z))
	s, c := math.Sincos(imag(z))
	return complex(scale*clean(c, imag(z)), scale*clean(s, imag(z)))
}

// clean returns 0 for a sine or cosine of x that is zero up to the rounding of x.
func clean(v, x float64) float64 {
	if math.Abs(x) > 1 && math.Abs(v) < 2.3e-16*math.Abs(x) {
		return 0
	}
	return v
}

// formatNumber writes a coefficient so that a formula reads it back exactly, in parentheses if complex.
func formatNumber(z complex128) string {
	x, y := real(z), imag(z)
	switch {
	case y == 0:
		return formatReal(x)
	case x == 0:
		return formatReal(y) + "*i"
	}
	sign := "+"
	if y < 0 {
		sign = "-"
	}
	return "(" + formatReal(x) + sign + formatReal(math.Abs(y)) + "*i)"
}

func formatReal(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }

// power returns x^y; whole powers of anything by multiplication, so that (-1)^3 and i^2 are exact.
func power(x, y complex128) complex128 {
	if n := real(y); imag(y) == 0 && n == math.Trunc(n) && math.Abs(n) <= 1<<20 {
		k := int(math.Abs(n))
		result, base := complex128(1), x
		for ; k > 0; k >>= 1 {
			if k&1 == 1 {
				result *= base
			}
			base *= base
		}
		if n < 0 {
			return 1 / result
		}
		return result
	}
	if imag(x) == 0 && imag(y) == 0 && real(x) >= 0 {
		return complex(math.Pow(real(x), real(y)), 0)
	}
	return cmplx.Pow(x, y)
}
