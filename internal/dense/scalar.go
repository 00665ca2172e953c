package dense

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
)

// Scalar is the set of element types. There is no tilde: each type gets code of its own.
type Scalar interface{ float64 | complex128 }

// IsComplex tells whether T is complex128.
func IsComplex[T Scalar]() bool {
	var zero T
	_, ok := any(zero).(complex128)
	return ok
}

// FromFloat converts x to T.
func FromFloat[T Scalar](x float64) T {
	var out T
	switch p := any(&out).(type) {
	case *float64:
		*p = x
	case *complex128:
		*p = complex(x, 0)
	}
	return out
}

// FromComplex converts z to T. It panics when T is float64 and z has an imaginary part: dropping it would be a wrong number.
func FromComplex[T Scalar](z complex128) T {
	var out T
	switch p := any(&out).(type) {
	case *float64:
		if imag(z) != 0 {
			panic(fmt.Sprintf("dense: %v is not real", z))
		}
		*p = real(z)
	case *complex128:
		*p = z
	}
	return out
}

// ToComplex converts x to complex128.
func ToComplex[T Scalar](x T) complex128 {
	switch v := any(x).(type) {
	case float64:
		return complex(v, 0)
	case complex128:
		return v
	}
	return 0
}

// Real returns the real part of x.
func Real[T Scalar](x T) float64 { return real(ToComplex(x)) }

// Abs returns |x|.
func Abs[T Scalar](x T) float64 {
	switch v := any(x).(type) {
	case float64:
		return math.Abs(v)
	case complex128:
		return cmplx.Abs(v)
	}
	return 0
}

// Conj returns the complex conjugate of x. It is for single numbers; Conjugate serves slices.
func Conj[T Scalar](x T) T {
	switch p := any(&x).(type) {
	case *complex128:
		*p = cmplx.Conj(*p)
	}
	return x
}

// Random fills x with standard normal numbers; for complex128 both parts are standard normal.
func Random[T Scalar](rng *rand.Rand, x []T) {
	switch v := any(x).(type) {
	case []float64:
		for i := range v {
			v[i] = rng.NormFloat64()
		}
	case []complex128:
		for i := range v {
			re := rng.NormFloat64()
			v[i] = complex(re, rng.NormFloat64())
		}
	}
}
