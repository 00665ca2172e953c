package dense

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
)

const eps = 0x1p-52

// padded is a matrix inside a larger slice: an odd offset before it, a stride larger than its width, words behind it. All words that
// are not the matrix's hold a guard value.
type padded[T Scalar] struct {
	whole      []T
	a          []T
	rows, cols int
	ld, offset int
	guard      float64
}

// newPadded fills the guard words, and the matrix itself, with guard.
func newPadded[T Scalar](rows, cols, pad, offset int, guard float64) *padded[T] {
	p := &padded[T]{rows: rows, cols: cols, ld: cols + pad, offset: offset, guard: guard}
	p.whole = make([]T, offset+rows*p.ld+3)
	for i := range p.whole {
		p.whole[i] = FromFloat[T](guard)
	}
	end := offset
	if rows > 0 {
		end += (rows-1)*p.ld + cols // the last row is not followed by padding
	}
	p.a = p.whole[offset:end]
	return p
}

// input is a padded matrix with the given entries; its guard words are NaN so that reading them shows.
func input[T Scalar](rows, cols, pad, offset int, entries []T) *padded[T] {
	p := newPadded[T](rows, cols, pad, offset, math.NaN())
	for i := range rows {
		copy(p.a[i*p.ld:i*p.ld+cols], entries[i*cols:(i+1)*cols])
	}
	return p
}

func (p *padded[T]) at(i, j int) T { return p.a[i*p.ld+j] }

// compact returns the entries without padding.
func (p *padded[T]) compact() []T {
	out := make([]T, 0, p.rows*p.cols)
	for i := range p.rows {
		out = append(out, p.a[i*p.ld:i*p.ld+p.cols]...)
	}
	return out
}

// checkGuards reports words outside of the matrix that have changed.
func (p *padded[T]) checkGuards(t *testing.T, name string) {
	t.Helper()
	for i, x := range p.whole {
		at := i - p.offset
		if at >= 0 && p.ld > 0 && at/p.ld < p.rows && at%p.ld < p.cols {
			continue
		}
		if v := Real(x); v != p.guard && !(math.IsNaN(v) && math.IsNaN(p.guard)) {
			t.Errorf("%s: word %d outside of the matrix became %v", name, at, x)
			return
		}
	}
}

// sample is a matrix to factor.
type sample[T Scalar] struct {
	name string
	m, n int
	a    []T
}

// withSpectrum returns an m×n matrix with the given singular values in random bases.
func withSpectrum[T Scalar](rng *rand.Rand, m, n int, s func(i int) float64) []T {
	k := min(m, n)
	u, v, r := make([]T, m*k), make([]T, n*k), make([]T, k*k)
	x := make([]T, max(m, n)*k)
	Random(rng, x)
	QR(m, k, x, k, u, k, r, k, nil)
	Random(rng, x)
	QR(n, k, x, k, v, k, r, k, nil)
	for i := range m {
		for j := range k {
			u[i*k+j] *= FromFloat[T](s(j))
		}
	}
	a := make([]T, m*n)
	Gemm(NoTrans, ConjTrans, m, n, k, 1, u, k, v, k, 0, a, n)
	return a
}

// spectra are the kinds of matrices that break factorizations.
var spectra = []struct {
	name string
	s    func(i, k int) float64
}{
	{"flat", func(i, k int) float64 { return 1 }},
	{"graded", func(i, k int) float64 { return math.Pow(10, -16*float64(i)/float64(k)) }},
	{"steep", func(i, k int) float64 { return math.Pow(10, -4*float64(i)) }},
	{"rank deficient", func(i, k int) float64 { return float64(max(0, k/2-i)) }},
	{"rank one", func(i, k int) float64 { return float64(max(0, 1-i)) }},
	{"clustered", func(i, k int) float64 { return []float64{1, 1 + 1e-14, 1e-3, 1e-8}[i%4] }},
	{"huge", func(i, k int) float64 { return 1e160 / float64(1+i) }},
	{"tiny", func(i, k int) float64 { return 1e-160 / float64(1+i) }},
	{"subnormal", func(i, k int) float64 { return 1e-307 / float64(1+i) }},
}

// samples returns matrices of one shape: random, of special spectra and of special forms.
func samples[T Scalar](m, n int) []sample[T] {
	rng := rand.New(rand.NewPCG(uint64(m), uint64(n)))
	out := []sample[T]{}
	add := func(name string, a []T) { out = append(out, sample[T]{name, m, n, a}) }
	fill := func(f func(i, j int) float64) []T {
		a := make([]T, m*n)
		for i := range m {
			for j := range n {
				a[i*n+j] = FromFloat[T](f(i, j))
			}
		}
		return a
	}
	a := make([]T, m*n)
	Random(rng, a)
	add("random", a)
	for _, s := range spectra {
		add(s.name, withSpectrum[T](rng, m, n, func(i int) float64 { return s.s(i, min(m, n)) }))
	}
	add("zero", make([]T, m*n))
	add("ones", fill(func(i, j int) float64 { return 1 }))
	add("identity", fill(func(i, j int) float64 { return float64(max(0, 1-max(i-j, j-i))) }))
	add("minus identity", fill(func(i, j int) float64 { return -float64(max(0, 1-max(i-j, j-i))) }))
	add("upper", fill(func(i, j int) float64 { return float64(max(0, min(1, j-i+1))) }))
	add("one entry", fill(func(i, j int) float64 {
		if i == m/2 && j == n/3 {
			return -3
		}
		return 0
	}))
	graded := make([]T, m*n)
	Random(rng, graded)
	for i := range graded {
		graded[i] *= FromFloat[T](math.Pow(10, -20*float64(i/n)/float64(m)-20*float64(i%n)/float64(n)))
	}
	add("graded entries", graded)
	if IsComplex[T]() {
		phase := make([]T, m*n)
		for i := range phase {
			phase[i] = FromComplex[T](complex(0, float64(i%5)-2))
		}
		add("imaginary", phase)
	}
	return out
}

// reconstruction returns |A - B C| / (|A| eps max(m,n)) in Frobenius norms.
func reconstruction[T Scalar](m, n, k int, a, b, c []T) float64 {
	d := append([]T(nil), a...)
	Gemm(NoTrans, NoTrans, m, n, k, FromFloat[T](-1), b, k, c, n, 1, d, n)
	norm := Norm(a)
	if norm == 0 {
		return Norm(d) / 0x1p-1074
	}
	return Norm(d) / norm / (eps * float64(max(m, n, 1)))
}

// orthogonality returns |X^H X - 1| / (eps max(m,n)) for the columns of an m×n matrix.
func orthogonality[T Scalar](m, n int, x []T) float64 {
	d := make([]T, n*n)
	for i := range n {
		d[i*n+i] = FromFloat[T](1)
	}
	Gemm(ConjTrans, NoTrans, n, n, m, FromFloat[T](-1), x, n, x, n, 1, d, n)
	return Norm(d) / (eps * float64(max(m, n, 1)))
}

// transposed returns the conjugate transpose of the m×n matrix a.
func transposed[T Scalar](m, n int, a []T) []T {
	out := make([]T, n*m)
	for i := range m {
		for j := range n {
			out[j*m+i] = Conj(a[i*n+j])
		}
	}
	return out
}

// small asserts x <= bound; NaN fails.
func small(t *testing.T, x, bound float64, format string, args ...any) {
	t.Helper()
	if !(x <= bound) {
		assert.Fail(t, fmt.Sprintf(format, args...), "%g units of eps, at most %g wanted", x, bound)
	}
}

func both(t *testing.T, real, complex func(t *testing.T)) {
	t.Run("real", real)
	t.Run("complex", complex)
}

// eachKernels runs f under every set of kernels of this build that this machine can run.
func eachKernels(t *testing.T, f func(t *testing.T)) {
	for set := range kernelSet(len(kernelNames)) {
		if !set.available() {
			continue
		}
		t.Run(set.String(), func(t *testing.T) {
			use(t, set)
			f(t)
		})
	}
}

// use switches to a set of kernels until the test ends.
func use(t *testing.T, set kernelSet) {
	saved := kernels
	kernels = set
	t.Cleanup(func() { kernels = saved })
}

// shapes are the m×n that factorizations are tested on.
func shapes() [][2]int {
	var out [][2]int
	for m := range 9 {
		for n := range 9 {
			out = append(out, [2]int{m, n})
		}
	}
	for s := 9; s <= 40; s++ {
		out = append(out, [2]int{s, s}, [2]int{s, (7 * s) % 41}, [2]int{(11 * s) % 41, s})
	}
	return append(out, [2]int{100, 100}, [2]int{130, 61}, [2]int{61, 130}, [2]int{90, 80}, [2]int{150, 1}, [2]int{1, 150})
}
