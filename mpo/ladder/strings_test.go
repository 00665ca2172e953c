package ladder

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/mps/block"
)

// manyHops is a sum of random density-assisted hops between all pairs of a long chain.
func manyHops(tb testing.TB, site Site, terms int) *Hamiltonian {
	const n = 1000
	l, err := New(n, Open, Leg("a", site))
	require.NoError(tb, err)
	word := map[Kind][2]string{KindFermion: {"c", "+"}, KindBoson: {"b", "+"}, KindSpin: {"S", "+"}, KindClock: {"X", ""}}[site.Kind()]
	w, _ := site.Symbol(word[0], word[1])
	up := w[0].Op
	down := site.Adjoint(up)[0].Op
	rng := rand.New(rand.NewPCG(1, 2))
	theta := make([]float64, n)
	if site.Kind() != KindClock {
		for i := range theta {
			theta[i] = 7 * rng.Float64()
		}
	}
	b := NewBuilder(l)
	for range terms / 2 {
		i, j := rng.IntN(n), rng.IntN(n)
		if i == j {
			continue
		}
		i, j = min(i, j), max(i, j)
		z := cmplx.Rect(rng.Float64(), theta[i]-theta[j])
		b.Add(z, Factor{int32(i), up}, Factor{int32(j), down})
		back := cmplx.Conj(z)
		if site.Kind() == KindFermion {
			back = -back
		}
		b.Add(back, Factor{int32(i), down}, Factor{int32(j), up})
	}
	scope, err := NewScope(l, nil)
	require.NoError(tb, err)
	return &Hamiltonian{Scope: scope, Poly: b.Polynomial()}
}

func TestStringsOfManyTerms(t *testing.T) {
	h := manyHops(t, Fermion(), 100_000)
	f, err := h.Frames(FrameOptions{})
	require.NoError(t, err)
	require.True(t, f.Real, f.Loop)
	require.Equal(t, "N: U(1)", f.Group.String())
	s, err := f.Strings(h.Poly)
	require.NoError(t, err)
	require.True(t, s.Real)
	require.Len(t, s.Coef, h.Poly.NumTerms())
	require.Same(t, s.Tables[0], s.Tables[999], "like sites share a table")
	require.Len(t, s.Tables[0].Matrices, 4, "1, sign, c, c^+")
}

func BenchmarkFrames(b *testing.B) {
	for _, site := range []Site{Fermion(), Boson(3), Spin(1), Clock(3)} {
		for _, terms := range []int{10_000, 1_000_000} {
			h := manyHops(b, site, terms)
			b.Run(fmt.Sprintf("site=%s/terms=%d", site.Kind(), terms), func(b *testing.B) {
				for b.Loop() {
					_, err := h.Frames(FrameOptions{})
					require.NoError(b, err)
				}
			})
		}
	}
}

func BenchmarkStrings(b *testing.B) {
	for _, site := range []Site{Fermion(), Boson(3), Spin(1), Clock(3)} {
		for _, terms := range []int{10_000, 1_000_000} {
			h := manyHops(b, site, terms)
			f, err := h.Frames(FrameOptions{})
			require.NoError(b, err)
			b.Run(fmt.Sprintf("site=%s/terms=%d", site.Kind(), terms), func(b *testing.B) {
				for b.Loop() {
					_, err := f.Strings(h.Poly)
					require.NoError(b, err)
				}
			})
		}
	}
}

func TestStringsRefuse(t *testing.T) {
	f := newForm(t, 3, Leg("a", Boson(2)))
	h := f.hamiltonian(f.chainTerms("a", 1, "b^+", "b"))
	fr, err := h.Frames(FrameOptions{})
	require.NoError(t, err)
	_, err = fr.Strings(hermitian(f.op("b", "", "a", 0)))
	require.ErrorContains(t, err, "one by N = -1, another by N = 1")
	other := newForm(t, 4, Leg("a", Boson(2)))
	_, err = fr.Strings(other.op("n", "", "a", 0))
	require.ErrorContains(t, err, "frames of 3 sites do not fit a ladder of 4")
	spins := newForm(t, 3, Leg("a", Fermion()))
	_, err = fr.Strings(spins.op("n", "", "a", 0))
	require.ErrorContains(t, err, "does not fit a fermion site")
}

func TestStringsOfConstantsAndZero(t *testing.T) {
	f := newForm(t, 2, Leg("a", Boson(1)))
	h := f.hamiltonian(f.chainTerms("a", 1, "b^+", "b"))
	fr, err := h.Frames(FrameOptions{})
	require.NoError(t, err)
	s, err := fr.Strings(One(f.l).Scale(3))
	require.NoError(t, err)
	require.Equal(t, []complex128{3}, s.Coef)
	require.Empty(t, s.Factors)
	for _, p := range []*Polynomial{Zero(f.l), f.mul(f.op("b", "", "a", 0), f.op("b", "", "a", 0))} { // b^2 vanishes at max = 1
		s, err = fr.Strings(p)
		require.NoError(t, err)
		require.Empty(t, s.Coef)
		require.True(t, s.Real)
		require.Equal(t, block.Charge{}, s.Charge)
	}
}

func TestSplitRefusesComplexFrames(t *testing.T) {
	f := newForm(t, 3, Leg("a", Fermion()), Leg("b", Fermion()))
	h := f.fluxLadder(3, "c", 0.3, true)
	fr, err := h.Frames(FrameOptions{})
	require.NoError(t, err)
	_, _, err = fr.Split(h.Poly)
	require.ErrorContains(t, err, "these frames are complex (the loop of 4 terms")
	pi := f.fluxLadder(3, "c", math.Pi, true)
	fr, err = pi.Frames(FrameOptions{})
	require.NoError(t, err)
	a, b, err := fr.Split(f.mul(f.op("c", "+", "a", 0), f.op("c", "", "a", 1)))
	require.NoError(t, err)
	require.Equal(t, 1, len(a.Coef)+len(b.Coef))
}
