//go:build linux

package dense

import (
	"fmt"
	"runtime/debug"
	"testing"
	"unsafe"

	"github.com/stretchr/testify/require"
	"golang.org/x/sys/unix"
)

// fenced returns a function that places numbers right before a page that nobody may touch, or right behind one.
func fenced[T Scalar](t *testing.T) func(entries []T, before bool) []T {
	t.Helper()
	page := unix.Getpagesize()
	return func(entries []T, before bool) []T {
		var zero T
		size := len(entries) * int(unsafe.Sizeof(zero))
		room := (size + page - 1) / page * page
		memory, err := unix.Mmap(-1, 0, room+2*page, unix.PROT_READ|unix.PROT_WRITE, unix.MAP_ANON|unix.MAP_PRIVATE)
		require.NoError(t, err)
		t.Cleanup(func() { require.NoError(t, unix.Munmap(memory)) })
		require.NoError(t, unix.Mprotect(memory[:page], unix.PROT_NONE))
		require.NoError(t, unix.Mprotect(memory[page+room:], unix.PROT_NONE))
		at := page
		if before {
			at += room - size
		}
		if size == 0 {
			return nil
		}
		out := unsafe.Slice((*T)(unsafe.Pointer(&memory[at])), len(entries))
		copy(out, entries)
		return out
	}
}

// TestGemmStaysInside multiplies matrices that end where the memory ends, at every small size: a kernel that reads or writes beyond
// them, even to no effect, is caught.
func TestGemmStaysInside(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, staysInside[float64], staysInside[complex128]) })
}

func staysInside[T Scalar](t *testing.T) {
	defer debug.SetPanicOnFault(debug.SetPanicOnFault(true))
	place := fenced[T](t)
	const most = 27
	for _, before := range []bool{true, false} {
		a, b, c := place(random[T](most*most), before), place(random[T](most*most), before), place(random[T](most*most), before)
		part := func(x []T, n int) []T {
			if before {
				return x[len(x)-n:]
			}
			return x[:n]
		}
		for s := 1; s <= most; s++ {
			for _, shape := range [][3]int{{s, s, s}, {s, 1 + s%5, most - s + 1}, {1 + s%7, s, 1 + s%6}, {1 + s%9, 1 + s%11, s}} {
				m, n, k := shape[0], shape[1], shape[2]
				for _, opA := range allOps {
					for _, opB := range allOps {
						lda, ldb := k, n
						if opA.transposes() {
							lda = m
						}
						if opB.transposes() {
							ldb = k
						}
						require.NotPanics(t, func() {
							Gemm(opA, opB, m, n, k, 1, part(a, m*k), lda, part(b, k*n), ldb, 1, part(c, m*n), n)
							Gemm(opA, opB, m, n, k, 1, part(a, m*k), lda, part(b, k*n), ldb, 0, part(c, m*n), n)
						}, fmt.Sprintf("%v%v m=%d n=%d k=%d", opA, opB, m, n, k))
					}
				}
			}
		}
	}
}

// TestVectorsStayInside does so for the kernels on vectors.
func TestVectorsStayInside(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, vectorsStayInside[float64], vectorsStayInside[complex128]) })
}

func vectorsStayInside[T Scalar](t *testing.T) {
	defer debug.SetPanicOnFault(debug.SetPanicOnFault(true))
	place := fenced[T](t)
	alpha := FromFloat[T](0.5)
	if IsComplex[T]() {
		alpha = FromComplex[T](complex(0.5, 0.5))
	}
	for n := 1; n < 70; n++ {
		for _, before := range []bool{true, false} {
			x, y := place(random[T](n), before), place(random[T](n), before)
			require.NotPanics(t, func() {
				Dot(x, y)
				Axpy(alpha, x, y)
				Axpy(2, x, y)
				Scale(alpha, x)
				Scale(2, x)
				largest(1, n, x, n)
				Conjugate(y, x)
			}, "n=%d", n)
		}
	}
}

// TestTwoProductsStayInside and those below do so for the kernels of factorizations.
func TestTwoProductsStayInside(t *testing.T) {
	eachKernels(t, func(t *testing.T) { both(t, twoProductsStayInside[float64], twoProductsStayInside[complex128]) })
}

func twoProductsStayInside[T Scalar](t *testing.T) {
	defer debug.SetPanicOnFault(debug.SetPanicOnFault(true))
	place := fenced[T](t)
	for n := 1; n < 34; n++ {
		for _, before := range []bool{true, false} {
			m := 1 + n%17
			a, v, x := place(random[T](m*n), before), place(random[T](n), before), place(random[T](m), before)
			dots, y := place(random[T](m), before), place(random[T](n), before)
			require.NotPanics(t, func() {
				twoProducts(m, n, a, n, v, x, dots, y)
				adjoint(m, n, a, n, place(random[T](m*n), before), m)
			}, "%d×%d", m, n)
		}
	}
}

func TestSecularStaysInside(t *testing.T) {
	eachKernels(t, func(t *testing.T) {
		defer debug.SetPanicOnFault(debug.SetPanicOnFault(true))
		place := fenced[float64](t)
		for n := 1; n < 34; n++ {
			for _, before := range []bool{true, false} {
				d, z, row := place(random[float64](n), before), place(random[float64](n), before), place(random[float64](n), before)
				require.NotPanics(t, func() {
					for _, squared := range []bool{false, true} {
						s := secular{squared: squared}
						s.sums(d, z, 3, 0.5)
						s.quotients(row, d, 3, 0.5, 5)
					}
					for kind := plainRow; kind <= leftRow; kind++ {
						coefficientRow(kind, d, z, row, 3, 0.5)
					}
				}, "n=%d", n)
			}
		}
	})
}
