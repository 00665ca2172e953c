package dense

import (
	"fmt"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"
)

// FuzzFactorizations draws a shape, strides, a spectrum and how many vectors to keep.
func FuzzFactorizations(f *testing.F) {
	for i, shape := range [][2]byte{{0, 0}, {1, 1}, {1, 40}, {40, 1}, {33, 32}, {8, 7}, {17, 64}, {50, 49}, {70, 66}} {
		f.Add(shape[0], shape[1], byte(i), byte(3*i), uint64(i))
	}
	f.Fuzz(func(t *testing.T, m, n, keep, which byte, seed uint64) {
		fuzzFactorizations[float64](t, int(m%96), int(n%96), int(keep), int(which), seed)
		fuzzFactorizations[complex128](t, int(m%96), int(n%96), int(keep), int(which), seed)
	})
}

func fuzzFactorizations[T Scalar](t *testing.T, m, n, keep, which int, seed uint64) {
	rng := rand.New(rand.NewPCG(seed, 3))
	k := min(m, n)
	s := spectra[which%len(spectra)]
	entries := withSpectrum[T](rng, m, n, func(i int) float64 { return s.s(i, k) })
	name := fmt.Sprintf("%s %d×%d", s.name, m, n)
	pad := func() int { return rng.IntN(4) }
	a := input(m, n, pad(), pad(), entries)

	var f SVD[T]
	require.NoError(t, f.Factor(m, n, a.a, a.ld), name)
	keep %= k + 1
	u, vh := newPadded[T](m, keep, pad(), 1, -9), newPadded[T](keep, n, pad(), 2, -9)
	f.Vectors(keep, u.a, u.ld, vh.a, vh.ld)
	small(t, orthogonality(m, keep, u.compact()), svdBound, "%s: U", name)
	small(t, orthogonality(n, keep, transposed(keep, n, vh.compact())), svdBound, "%s: V", name)
	// A V = U S for the vectors kept.
	av, us := make([]T, m*keep), u.compact()
	Gemm(NoTrans, ConjTrans, m, keep, n, 1, entries, n, vh.compact(), n, 0, av, keep)
	for i := range us {
		av[i] -= us[i] * FromFloat[T](f.Values()[i%keep])
	}
	if norm := Norm(entries); norm > 0 {
		small(t, Norm(av)/norm/(eps*float64(max(m, n))), svdBound*coarseness(entries), "%s: A V - U S", name)
	}

	q, r := newPadded[T](m, k, pad(), 0, -9), newPadded[T](k, n, pad(), 1, -9)
	QR(m, n, a.a, a.ld, q.a, q.ld, r.a, r.ld, nil)
	small(t, orthogonality(m, k, q.compact()), qrBound, "%s: Q", name)
	small(t, reconstruction(m, n, k, entries, q.compact(), r.compact()), qrBound*coarseness(entries), "%s: A - QR", name)
	for _, p := range []*padded[T]{a, u, vh, q, r} {
		p.checkGuards(t, name)
	}

	var h Hermitian[T]
	b := input(k, k, pad(), pad(), corner(entries, k, n))
	require.NoError(t, h.Factor(k, b.a, b.ld), name)
	v := newPadded[T](k, keep, pad(), pad(), -9)
	h.Largest(keep, v.a, v.ld)
	small(t, orthogonality(k, keep, v.compact()), svdBound, "%s: eigenvectors", name)
	v.checkGuards(t, name)
	b.checkGuards(t, name)
}

// corner returns the leading k×k part of a matrix of stride n.
func corner[T Scalar](a []T, k, n int) []T {
	out := make([]T, k*k)
	copyMatrix(k, k, 1, a, n, out, k)
	return out
}
