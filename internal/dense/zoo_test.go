package dense

import (
	"math"
	"math/rand/v2"
)

// The zoo holds kinds of square matrices that are known to be hard, or plain, for factorizations: the spectra of LAPACK's test matrix
// generators (modes 1 to 6, LAPACK Working Note 9) and the classical named matrices (Higham, Accuracy and Stability of Numerical
// Algorithms, chapter 28; formulas from memory). `entry` gives element (i, j) of n; kinds that need more have `fill`.
type kind struct {
	name  string
	entry func(i, j, n int) float64
	fill  func(rng *rand.Rand, n int, a []float64)
}

// matrix returns one of the kind. The complex form is the real one between two diagonal matrices of phases: it has the same singular
// values, and the same eigenvalues if hermitian.
func (k kind) real(n int) []float64 {
	a := make([]float64, n*n)
	if k.fill != nil {
		k.fill(rand.New(rand.NewPCG(uint64(n), 7)), n, a)
		return a
	}
	for i := range n {
		for j := range n {
			a[i*n+j] = k.entry(i, j, n)
		}
	}
	return a
}

func zooMatrix[T Scalar](k kind, n int, hermitian bool) []T {
	a := k.real(n)
	if hermitian {
		for i := range n {
			for j := range i {
				a[i*n+j] = a[j*n+i]
			}
		}
	}
	out := make([]T, n*n)
	for i := range n {
		for j := range n {
			out[i*n+j] = FromFloat[T](a[i*n+j])
			if !IsComplex[T]() {
				continue
			}
			angle := float64(i*i - j*j)
			if !hermitian {
				angle = float64(i*i + 3*j)
			}
			sin, cos := math.Sincos(angle)
			if i == j && hermitian {
				sin, cos = 0, 1
			}
			out[i*n+j] *= FromComplex[T](complex(cos, sin))
		}
	}
	return out
}

// spectrum is a kind with given singular values s(i, n) in random bases.
func spectrum(name string, s func(i, n int) float64) kind {
	return kind{name: name, fill: func(rng *rand.Rand, n int, a []float64) {
		copy(a, withSpectrum[float64](rng, n, n, func(i int) float64 { return s(i, n) }))
	}}
}

func randomKind(name string, f func(rng *rand.Rand, i, j, n int) float64) kind {
	return kind{name: name, fill: func(rng *rand.Rand, n int, a []float64) {
		for i := range n {
			for j := range n {
				a[i*n+j] = f(rng, i, j, n)
			}
		}
	}}
}

func where(yes bool, x float64) float64 {
	if yes {
		return x
	}
	return 0
}

const condition = 0x1p50

var zoo = []kind{
	spectrum("one large value", func(i, n int) float64 { return max(1/condition, where(i == 0, 1)) }),
	spectrum("one small value", func(i, n int) float64 { return max(1/condition, where(i < n-1, 1)) }),
	spectrum("geometric", func(i, n int) float64 { return math.Pow(condition, -float64(i)/float64(max(1, n-1))) }),
	spectrum("arithmetic", func(i, n int) float64 { return 1 - float64(i)/float64(max(1, n-1))*(1-1/condition) }),
	spectrum("logarithms at random", func(i, n int) float64 { return math.Pow(condition, -math.Mod(float64(i)*math.Phi, 1)) }),
	spectrum("equidistributed", func(i, n int) float64 { return math.Mod(float64(i)*math.Phi, 1) }),
	spectrum("near overflow", func(i, n int) float64 { return 1e305 / float64(1+i) / float64(1+n) }),
	spectrum("near underflow", func(i, n int) float64 { return 1e-300 / float64(1+i) }),
	spectrum("subnormal", func(i, n int) float64 { return 1e-310 }),
	spectrum("Schmidt values", func(i, n int) float64 { return math.Exp(-float64(i*i) / float64(4+n)) }),
	spectrum("pairs", func(i, n int) float64 { return 1 / float64(1+i/2) }),
	spectrum("two clusters", func(i, n int) float64 { return 1 + 1e-15*float64(i) - where(2*i > n, 0.5) }),
	spectrum("many clusters", func(i, n int) float64 { return 1/float64(1+i/5) + 1e-13*float64(i%5) }),
	spectrum("rank one", func(i, n int) float64 { return where(i == 0, 1) }),
	spectrum("rank half", func(i, n int) float64 { return where(2*i < n, 1/float64(1+i)) }),
	spectrum("orthogonal", func(i, n int) float64 { return 1 }),
	{name: "zero", entry: func(i, j, n int) float64 { return 0 }},
	{name: "identity", entry: func(i, j, n int) float64 { return where(i == j, 1) }},
	{name: "diagonal", entry: func(i, j, n int) float64 { return where(i == j, float64(i%7)-3) }},
	{name: "reversed diagonal", entry: func(i, j, n int) float64 { return where(i+j == n-1, float64(1+i)) }},
	{name: "permutation", entry: func(i, j, n int) float64 { return where((i+n/3)%max(n, 1) == j, 1) }},
	{name: "ones", entry: func(i, j, n int) float64 { return 1 }},
	{name: "checkers", entry: func(i, j, n int) float64 { return float64((i + j) % 2) }},
	{name: "one entry", entry: func(i, j, n int) float64 { return where(i == n/3 && j == n/2, -3) }},
	{name: "one row", entry: func(i, j, n int) float64 { return where(i == n/2, 1+float64(j)) }},
	{name: "arrow", entry: func(i, j, n int) float64 { return where(i == j, float64(i)) + where(i == 0 || j == 0, 1) }},
	{name: "upper triangle", entry: func(i, j, n int) float64 { return where(i <= j, 1) }},
	{name: "strict upper triangle", entry: func(i, j, n int) float64 { return where(i < j, 1/float64(1+i+j)) }},
	{name: "Jordan block", entry: func(i, j, n int) float64 { return where(i == j, 1e-3) + where(j == i+1, 1) }},
	{name: "nilpotent", entry: func(i, j, n int) float64 { return where(j == i+1, 1) }},
	{name: "Laplacian", entry: func(i, j, n int) float64 { return where(i == j, 2) - where(i-j == 1 || j-i == 1, 1) }},
	{name: "Laplacian scaled up", entry: func(i, j, n int) float64 { return 1e200 * (where(i == j, 2) - where(i-j == 1 || j-i == 1, 1)) }},
	{name: "hopping", entry: func(i, j, n int) float64 { return where(i-j == 1 || j-i == 1, 1) }},
	{name: "Clement", entry: func(i, j, n int) float64 {
		return where(i-j == 1 || j-i == 1, math.Sqrt(float64(max(i, j)*(n-max(i, j)))))
	}},
	{name: "Wilkinson", entry: func(i, j, n int) float64 {
		return where(i == j, math.Abs(float64(i)-float64(n-1)/2)) + where(i-j == 1 || j-i == 1, 1)
	}},
	{name: "glued Wilkinson", entry: func(i, j, n int) float64 {
		const w = 21
		off := where(i-j == 1 || j-i == 1, 1)
		if i/w != j/w {
			off *= 1e-8
		}
		return where(i == j, math.Abs(float64(i%w)-10)) + off
	}},
	{name: "Hilbert", entry: func(i, j, n int) float64 { return 1 / float64(i+j+1) }},
	{name: "Cauchy", entry: func(i, j, n int) float64 { return 1 / (float64(i) - float64(j) + 0.5) }},
	{name: "Lehmer", entry: func(i, j, n int) float64 { return float64(1+min(i, j)) / float64(1+max(i, j)) }},
	{name: "Pascal", entry: func(i, j, n int) float64 {
		a, _ := math.Lgamma(float64(i + j + 1))
		b, _ := math.Lgamma(float64(i + 1))
		c, _ := math.Lgamma(float64(j + 1))
		return math.Exp(a - b - c - 1.3*float64(n))
	}},
	{name: "Vandermonde", entry: func(i, j, n int) float64 { return math.Pow(2*float64(i)/float64(n)-1, float64(j)) }},
	{name: "Kahan", entry: func(i, j, n int) float64 {
		s := math.Pow(math.Sin(1.2), float64(i))
		return where(i == j, s) - where(i < j, s*math.Cos(1.2))
	}},
	{name: "Frank", entry: func(i, j, n int) float64 { return where(j >= i-1, float64(n-max(i, j))) }},
	{name: "Moler", entry: func(i, j, n int) float64 { return float64(min(i, j)) - where(i != j, 1) + where(i == j, 1) }},
	{name: "Grcar", entry: func(i, j, n int) float64 { return where(j >= i && j <= i+3, 1) - where(j == i-1, 1) }},
	{name: "Parter", entry: func(i, j, n int) float64 { return 1 / (float64(i) - float64(j) + 0.5) }},
	{name: "Lauchli", entry: func(i, j, n int) float64 { return where(i == 0, 1) + where(i == j && i > 0, 1e-9) }},
	{name: "smaller of both", entry: func(i, j, n int) float64 { return float64(1 + min(i, j)) }},
	{name: "distance", entry: func(i, j, n int) float64 { return math.Abs(float64(i - j)) }},
	{name: "Gaussian Toeplitz", entry: func(i, j, n int) float64 { return math.Exp(-float64((i-j)*(i-j)) / 50) }},
	{name: "exponential Hankel", entry: func(i, j, n int) float64 { return math.Exp(-0.5 * float64(i+j)) }},
	{name: "sines", entry: func(i, j, n int) float64 {
		return math.Sin(math.Pi * float64((i+1)*(j+1)) / float64(n+1))
	}},
	{name: "companion", entry: func(i, j, n int) float64 { return where(i == j+1, 1) - where(j == n-1, 1+float64(i)) }},
	{name: "rows of falling size", entry: func(i, j, n int) float64 { return math.Pow(10, -float64(i)) * (1 + float64((i*j)%5)) }},
	{name: "columns of rising size", entry: func(i, j, n int) float64 { return math.Pow(10, float64(j)*200/float64(n+1)-100) }},
	{name: "falling both ways", entry: func(i, j, n int) float64 {
		return math.Pow(10, -8*float64(i+j)/float64(n+1)) * math.Cos(float64(i*j+i))
	}},
	{name: "equal rows", entry: func(i, j, n int) float64 { return math.Cos(float64(j + i%2)) }},
	{name: "equal blocks", entry: func(i, j, n int) float64 { return where(i/4 == j/4, 1+float64(i%4+2*(j%4))) }},
	{name: "largest in the corner", entry: func(i, j, n int) float64 { return 1e-12*math.Sin(float64(3*i+j*j)) + where(i+j == 2*n-2, 1e10) }},
	randomKind("normal", func(rng *rand.Rand, i, j, n int) float64 { return rng.NormFloat64() }),
	randomKind("uniform", func(rng *rand.Rand, i, j, n int) float64 { return rng.Float64() }),
	randomKind("signs", func(rng *rand.Rand, i, j, n int) float64 { return float64(rng.IntN(2))*2 - 1 }),
	randomKind("sparse", func(rng *rand.Rand, i, j, n int) float64 { return where(rng.IntN(8) == 0, rng.NormFloat64()) }),
	randomKind("band", func(rng *rand.Rand, i, j, n int) float64 { return where(max(i-j, j-i) < 4, rng.NormFloat64()) }),
	randomKind("bidiagonal", func(rng *rand.Rand, i, j, n int) float64 { return where(i == j || j == i+1, rng.NormFloat64()) }),
	randomKind("graded at random", func(rng *rand.Rand, i, j, n int) float64 {
		return rng.NormFloat64() * math.Pow(10, -20*rng.Float64())
	}),
	randomKind("heavy tails", func(rng *rand.Rand, i, j, n int) float64 { return math.Pow(rng.NormFloat64(), 15) }),
	randomKind("noise on a low rank", func(rng *rand.Rand, i, j, n int) float64 {
		return math.Cos(float64(i-j)) + 1e-14*rng.NormFloat64()
	}),
}
