package dense

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// operand is a factor as Gemm sees it, and its rows (of A) or columns (of B) in a row of their own.
type operand[T Scalar] struct {
	*padded[T]
	lines [][]T
	norms []float64
}

// newOperand returns a random factor: lines×k, or stored the other way round.
func newOperand[T Scalar](rng *rand.Rand, lines, k int, linesAreRows, conjugated bool) operand[T] {
	entries := make([]T, lines*k)
	Random(rng, entries)
	o := operand[T]{}
	for i := range lines {
		line := append([]T(nil), entries[i*k:(i+1)*k]...)
		if conjugated {
			Conjugate(line, line)
		}
		o.lines, o.norms = append(o.lines, line), append(o.norms, Norm(line))
	}
	rows, cols := lines, k
	if !linesAreRows {
		turned := make([]T, lines*k)
		for i := range lines {
			for l := range k {
				turned[l*lines+i] = entries[i*k+l]
			}
		}
		rows, cols, entries = k, lines, turned
	}
	o.padded = input(rows, cols, rng.IntN(4), 1+2*rng.IntN(3), entries)
	return o
}

// checkGemm compares one product with sums over lines. The bound is Cauchy and Schwarz's.
func checkGemm[T Scalar](t *testing.T, opA, opB Op, m, n, k int, alpha, beta T, seed uint64) {
	t.Helper()
	rng := rand.New(rand.NewPCG(seed, 17))
	a := newOperand[T](rng, m, k, !opA.transposes(), opA.conjugates())
	b := newOperand[T](rng, n, k, opB.transposes(), opB.conjugates())
	c := newPadded[T](m, n, rng.IntN(4), 1+2*rng.IntN(3), -777.25)
	before := make([]T, m*n)
	Random(rng, before)
	for i := range m {
		for j := range n {
			if beta == 0 {
				before[i*n+j] = FromFloat[T](math.NaN())
			}
			c.a[i*c.ld+j] = before[i*n+j]
		}
	}
	Gemm(opA, opB, m, n, k, alpha, a.a, a.ld, b.a, b.ld, beta, c.a, c.ld)
	name := fmt.Sprintf("%v%v m=%d n=%d k=%d alpha=%v beta=%v seed=%d", opA, opB, m, n, k, alpha, beta, seed)
	for i := range m {
		for j := range n {
			want := alpha * plainDot(a.lines[i], b.lines[j])
			size := Abs(alpha) * a.norms[i] * b.norms[j]
			if beta != 0 {
				want += beta * before[i*n+j]
				size += Abs(beta) * Abs(before[i*n+j])
			}
			if d := Abs(c.at(i, j) - want); !(d <= 2*eps*float64(k+4)*size) {
				t.Fatalf("%s: C[%d,%d] = %v, want %v", name, i, j, c.at(i, j), want)
			}
		}
	}
	c.checkGuards(t, name)
	a.checkGuards(t, name)
	b.checkGuards(t, name)
}

func plainDot[T Scalar](x, y []T) T {
	var sum T
	for i, x := range x {
		sum += x * y[i]
	}
	return sum
}

// TestGemmEverySize takes each of m, n and k through 0 to 100 with every pair of operations and every kernel.
func TestGemmEverySize(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, everySize[float64], everySize[complex128]) })
}

func everySize[T Scalar](t *testing.T) {
	alphas := []T{1, FromFloat[T](-1), FromFloat[T](0.75)}
	betas := []T{0, 1, FromFloat[T](-0.5)}
	if IsComplex[T]() {
		alphas[2], betas[2] = FromComplex[T](complex(0.5, -2)), FromComplex[T](complex(-1, 0.5))
	}
	seed := uint64(0)
	for size := range 101 {
		// Small and odd sizes beside the one that runs, so that all of its remainders meet all of theirs sooner or later.
		p, q := (7*size+3)%29, (11*size+5)%37
		for _, s := range [][3]int{{size, p, q}, {p, size, q}, {p, q, size}, {size, q, p}, {q, size, p}, {q, p, size}} {
			for _, opA := range allOps {
				for _, opB := range allOps {
					seed++
					if (seed+uint64(size))%share == 0 {
						checkGemm(t, opA, opB, s[0], s[1], s[2], alphas[seed/4%3], betas[seed/12%3], seed)
					}
				}
			}
		}
	}
}

// TestGemmNarrow takes few rows and columns through long sums: sizes for which other kernels serve than for the rest.
func TestGemmNarrow(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, narrow[float64], narrow[complex128]) })
}

func narrow[T Scalar](t *testing.T) {
	seed := uint64(0)
	for _, k := range []int{15, 16, 17, 63, 64, 65, 130, 512, 1030} {
		for _, m := range []int{1, 2, 3, 4, 5, 6, 9, 33} {
			for _, n := range []int{1, 2, 3, 4, 5, 7} {
				for _, opA := range allOps {
					for _, opB := range allOps {
						seed++
						if seed%share == 0 && (share == 1 || seed%5 == 0 || k < 100) {
							checkGemm(t, opA, opB, m, n, k, FromFloat[T](1.5), FromFloat[T](float64(seed%3)), seed)
						}
					}
				}
			}
		}
	}
}

// FuzzGemm looks for a shape that goes wrong.
func FuzzGemm(f *testing.F) {
	f.Add(uint8(0), uint16(3), uint16(5), uint16(7), uint64(1))
	f.Add(uint8(1), uint16(24), uint16(8), uint16(16), uint64(2))
	f.Add(uint8(255), uint16(129), uint16(505), uint16(257), uint64(3))
	f.Fuzz(func(t *testing.T, ops uint8, m, n, k uint16, seed uint64) {
		opA, opB := allOps[ops&3], allOps[ops>>2&3]
		mm, nn, kk := int(m)%300, int(n)%600, int(k)%600
		if mm*nn*kk > 1e6 {
			mm %= 30
			kk %= 60
		}
		for set := range kernelSet(len(kernelNames)) {
			if set.available() {
				use(t, set)
				checkGemm[float64](t, opA, opB, mm, nn, kk, 1, 0, seed)
				checkGemm[complex128](t, opA, opB, mm, nn, kk, 1i, 1, seed)
			}
		}
	})
}
