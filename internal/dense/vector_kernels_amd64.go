//go:build amd64 && !purego

package dense

// The functions of this file run the kernels in use over vectors that are not empty, complex numbers as two, so much at a time: a kernel
// cannot be preempted.
const vectorChunk = 1 << 15

func dotRealTiles(x, y []float64) float64 {
	sum := 0.0
	for len(x) > vectorChunk {
		sum += dotRealTiles(x[:vectorChunk], y[:vectorChunk])
		x, y = x[vectorChunk:], y[vectorChunk:]
	}
	if kernels == avx512Kernels {
		return sum + dotReal512(&x[0], &y[0], len(x))
	}
	return sum + dotReal256(&x[0], &y[0], len(x))
}

func dotComplexTiles(x, y []float64) complex128 {
	var sum complex128
	for len(x) > vectorChunk {
		sum += dotComplexTiles(x[:vectorChunk], y[:vectorChunk])
		x, y = x[vectorChunk:], y[vectorChunk:]
	}
	if kernels == avx512Kernels {
		re, im := dotComplex512(&x[0], &y[0], len(x))
		return sum + complex(re, im)
	}
	re, im := dotComplex256(&x[0], &y[0], len(x))
	return sum + complex(re, im)
}

func axpyTiles(alpha complex128, x, y []float64) {
	re, im := real(alpha), imag(alpha)
	for len(x) > 0 {
		n := min(vectorChunk, len(x))
		switch {
		case kernels == avx512Kernels && im == 0:
			axpyReal512(re, &x[0], &y[0], n)
		case kernels == avx512Kernels:
			axpyComplex512(re, im, &x[0], &y[0], n)
		case im == 0:
			axpyReal256(re, &x[0], &y[0], n)
		default:
			axpyComplex256(re, im, &x[0], &y[0], n)
		}
		x, y = x[n:], y[n:]
	}
}

func scaleTiles(alpha complex128, x []float64) {
	re, im := real(alpha), imag(alpha)
	for len(x) > 0 {
		n := min(vectorChunk, len(x))
		switch {
		case kernels == avx512Kernels && im == 0:
			scaleReal512(re, &x[0], n)
		case kernels == avx512Kernels:
			scaleComplex512(re, im, &x[0], n)
		case im == 0:
			scaleReal256(re, &x[0], n)
		default:
			scaleComplex256(re, im, &x[0], n)
		}
		x = x[n:]
	}
}

func largestTiles(x []float64) float64 {
	top := 0.0
	for len(x) > 0 {
		n := min(vectorChunk, len(x))
		part := 0.0
		if kernels == avx512Kernels {
			part = largest512(&x[0], n)
		} else {
			part = largest256(&x[0], n)
		}
		top = max(top, part) // NaN stays
		x = x[n:]
	}
	return top
}
