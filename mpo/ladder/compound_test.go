package ladder

import (
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"sync"
	"testing"

	"github.com/stretchr/testify/require"
)

// compoundOn is a random compound on a site: of elements that raise by an even number (0), an odd one (1), or any (2).
func (f form) compoundOn(rng *rand.Rand, site, mode int) *Polynomial {
	s := f.l.Site(site)
	var w []Weighted
	for op := OpID(0); op < OpID(s.Dim()*s.Dim()); op++ {
		raise := 0
		for _, r := range s.Raise(op) {
			raise += r
		}
		if s.Kind() == KindSpin {
			raise /= 2
		}
		odd := mod(raise, 2) == 1
		if odd != (mode == 1) && mode < 2 || mode == 2 && s.Odd(op) {
			continue
		}
		if rng.IntN(4) > 0 {
			w = append(w, Weighted{complex(rng.NormFloat64(), float64(rng.IntN(2))*rng.NormFloat64()), op})
		}
	}
	w, err := s.ops.condense(mergeWeighted(w))
	require.NoError(f.t, err)
	p := Zero(f.l)
	for _, x := range w {
		p = p.Add(Local(f.l, site, x.Op).Scale(x.Coef))
	}
	return p
}

// TestCompoundsPassFrames holds that rotations, gauges, charges and signs treat a compound as the sum it stands for.
func TestCompoundsPassFrames(t *testing.T) {
	spins := newForm(t, 3, Leg("a", Spin(2)))
	halves := newForm(t, 4, Leg("a", Spin(1)))
	fermions := newForm(t, 2, Leg("a", Fermion()), Leg("b", Electron()))
	clocks := newForm(t, 3, Leg("a", Clock(3)))
	pairs := fermions.hamiltonian(hermitian(fermions.mul(fermions.op("c", "+", "a", 0), fermions.op("c", "+", "a", 1)).Scale(1i)),
		hermitian(fermions.mul(fermions.op("c_up", "+", "b", 0), fermions.op("c_up", "", "b", 1)).Scale(1+1i)))
	pair := func(f form, symbol string) *Hamiltonian {
		var ps []*Polynomial
		for j := range f.l.Rungs() - 1 {
			ps = append(ps, hermitian(f.mul(f.op(symbol, "+", "a", j), f.op(symbol, "-", "a", j+1))), hermitian(f.mul(f.op(symbol, "+", "a", j), f.op(symbol, "+", "a", j+1)).Scale(cmplx.Rect(1, 0.7))))
		}
		return f.hamiltonian(ps...)
	}
	chain := newForm(t, 3, Leg("a", Fermion()))
	majorana := func(f form) *Hamiltonian {
		var ps []*Polynomial
		for j := range 2 {
			ps = append(ps, hermitian(f.mul(f.op("c", "+", "a", j), f.op("c", "", "a", j+1))), hermitian(f.mul(f.op("c", "+", "a", j), f.op("c", "+", "a", j+1)).Scale(cmplx.Rect(1, 0.7))))
		}
		return f.hamiltonian(ps...)
	}
	for _, c := range []struct {
		name string
		form form
		h    *Hamiltonian
	}{
		{"spins with gauge phases", halves, pair(halves, "S")},
		{"large spins with gauge phases", spins, pair(spins, "S")},
		{"fermions with gauge phases", chain, majorana(chain)},
		{"spins, turned", spins, spins.isingZ(3)},
		{"spins, as written", spins, spins.isingX(3)},
		{"spins with one charge", spins, spins.xyz(3, 1, 1, 0.5)},
		{"spins with a gauge", halves, halves.xyz(4, 0.5, 0.8, 1, "y")},
		{"spins without charge", halves, halves.xyz(4, 0.5, 0.8, 1, "x", "y", "z")},
		{"fermions", fermions, pairs},
		{"clocks", clocks, clocks.clockChain(3, false)},
		{"clocks, turned", clocks, clocks.clockChain(3, true)},
	} {
		t.Run(c.name, func(t *testing.T) {
			f, err := c.h.Frames(FrameOptions{})
			require.NoError(t, err)
			require.Equal(t, strings.HasSuffix(c.name, "gauge phases"), f.Real && f.Sites[0].Angles != nil && f.Sites[0].Angles[0] != 0)
			rng := rand.New(rand.NewPCG(3, 4))
			for range 4 {
				p := One(c.form.l)
				for i := range c.form.l.Sites() {
					if rng.IntN(4) > 0 {
						p = c.form.mul(p, c.form.compoundOn(rng, i, rng.IntN(3)))
					}
				}
				requireFrame(t, f, p)
			}
		})
	}
}

// TestLongStringsPassFrames: a disorder operator of the transverse Ising chain stays one term, turned or not.
func TestLongStringsPassFrames(t *testing.T) {
	l := must(t, 64, Open, Leg("a", Spin(1)))
	s, err := NewScope(l, nil)
	require.NoError(t, err)
	for _, axes := range [][2]string{{"z", "x"}, {"x", "z"}} {
		h, err := s.Hamiltonian(Term{Formula: "S^" + axes[0] + "[a,j] S^" + axes[0] + "[a,j+1]"}, Term{Formula: "S^" + axes[1] + "[a,j]"})
		require.NoError(t, err)
		f, err := h.Frames(FrameOptions{})
		require.NoError(t, err)
		for _, axis := range []string{"x", "z"} {
			p := polynomial(t, s, Term{Formula: "prod(k=0..63, 2*S^" + axis + "[a,k])"})
			require.Equal(t, 1, p.NumTerms())
			parts, err := f.Strings(p)
			require.NoError(t, err)
			require.Len(t, parts.Coef, 1)
			require.True(t, parts.Real)
		}
	}
	// With S^z conserved each S^x is two parts of different charge.
	h, err := s.Hamiltonian(Term{Formula: "S[a,j].S[a,j+1]"})
	require.NoError(t, err)
	f, err := h.Frames(FrameOptions{})
	require.NoError(t, err)
	_, err = f.Strings(polynomial(t, s, Term{Formula: "prod(k=0..63, 2*S^x[a,k])"}))
	require.ErrorContains(t, err, "a sum of more than 65536 terms; shorten it")
}

func TestScopesAreShared(t *testing.T) {
	l := must(t, 12, Open, Leg("a", Boson(3)), Leg("v", Spin(2)), Leg("f", Fermion()))
	s, err := NewScope(l, nil)
	require.NoError(t, err)
	var wait sync.WaitGroup
	got := make([]*Polynomial, 8)
	for k := range got {
		wait.Go(func() {
			p, err := s.Polynomial(Term{Formula: "prod(k=0..rungs-1, exp(i*pi*S^z[v,k])) exp(i*j*n[a,j]) b[a,j] prod(k=0..rungs-1, exp(i*pi*n[f,k]))"})
			if err == nil {
				got[k] = p.Adjoint()
			}
		})
	}
	wait.Wait()
	for _, p := range got {
		require.True(t, p.Equal(got[0], 1e-14))
	}
}
