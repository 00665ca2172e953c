package dense

import "math"

// A reflector is H = 1 - tau v v^H with v[0] = 1. For complex numbers H is unitary but not Hermitian: tau is complex so that the
// number it leaves behind, H^H x = beta e_0, is real (LAPACK Working Note 72; Lehoucq 1996).

// negligible is the norm below which a vector counts as zero in a matrix that safeScale has seen. What rank-deficient matrices leave
// behind shrinks by eps at each step of a reduction until it is subnormal; directions taken from such numbers are not unit vectors.
const negligible = 0x1p-960

// reflector overwrites x by v and returns beta and tau. An x that is already real beta times e_0 gives tau = 0.
func reflector[T Scalar](x []T) (beta float64, tau T) {
	rest := Norm(x[1:])
	switch x := any(x).(type) {
	case []float64:
		alpha := x[0]
		x[0] = 1
		size := math.Hypot(alpha, rest)
		if rest == 0 || size < negligible {
			clear(x[1:])
			return alpha, tau
		}
		beta = -math.Copysign(size, alpha)
		*any(&tau).(*float64) = (beta - alpha) / beta
		Scale(1/(alpha-beta), x[1:])
	case []complex128:
		alpha := x[0]
		x[0] = 1
		size := math.Hypot(math.Hypot(real(alpha), imag(alpha)), rest)
		if (rest == 0 && imag(alpha) == 0) || size < negligible {
			clear(x[1:])
			return real(alpha), tau
		}
		beta = -math.Copysign(size, real(alpha))
		*any(&tau).(*complex128) = complex((beta-real(alpha))/beta, -imag(alpha)/beta)
		Scale(1/(alpha-complex(beta, 0)), x[1:])
	}
	return beta, tau
}

// safeScale returns a power of two that brings a matrix whose largest entry is top near 1, or 1 when squares and quotients of its
// entries are harmless as they are (or nothing helps: zero, not finite).
func safeScale(top float64) float64 {
	const small, large = 1e-100, 1e100
	if top == 0 || top > math.MaxFloat64 || top != top || (top >= small && top <= large) {
		return 1
	}
	_, exp := math.Frexp(top)
	return math.Ldexp(1, max(min(-exp, 1023), -1021))
}
