package mps

import (
	"math"
	"math/cmplx"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/mpo/ladder"
	"rundle/mps/block"
)

// model is a ladder Hamiltonian with its frames.
type model struct {
	h *ladder.Hamiltonian
	f *ladder.Frames
}

func newModel(t require.TestingT, rungs int, site ladder.Site, legs int, opt ladder.FrameOptions, terms ...ladder.Term) model {
	var parts []ladder.Part
	for _, name := range []string{"a", "b"}[:legs] {
		parts = append(parts, ladder.Leg(name, site))
	}
	lad, err := ladder.New(rungs, ladder.Open, parts...)
	require.NoError(t, err)
	h, err := lad.Hamiltonian(ladder.Constants{"J": 1}, terms...)
	require.NoError(t, err)
	f, err := h.Frames(opt)
	require.NoError(t, err)
	return model{h, f}
}

// bosons is a two-leg ladder, real without flux.
func bosons(t require.TestingT, rungs int, flux string) model {
	return newModel(t, rungs, ladder.Boson(2), 2, ladder.FrameOptions{},
		ladder.Term{Formula: "-J*exp(i*" + flux + ") b^+[a,j+1] b[a,j] + h.c."},
		ladder.Term{Formula: "-J b^+[b,j+1] b[b,j] + h.c."},
		ladder.Term{Formula: "-J b^+[a,j] b[b,j] + h.c."})
}

// imaginary is the ladder without flux again, but needs phases to be real.
func imaginary(t require.TestingT, rungs int) model {
	m := newModel(t, rungs, ladder.Boson(2), 2, ladder.FrameOptions{},
		ladder.Term{Formula: "i*J b^+[l,j+1] b[l,j] + h.c.", Each: ladder.Each{"l": "legs"}},
		ladder.Term{Formula: "-J b^+[a,j] b[b,j] + h.c."})
	require.True(t, m.f.Real)
	require.NotZero(t, m.f.Sites[2].Angles)
	return m
}

// tilted is an Ising chain with its parity along x, which the frames turn to z.
func tilted(t require.TestingT, rungs int) model {
	return newModel(t, rungs, ladder.Spin(1), 1, ladder.FrameOptions{},
		ladder.Term{Formula: "-J S^z[a,j+1] S^z[a,j]"}, ladder.Term{Formula: "-J S^x[a,j]"})
}

func (m model) random(t require.TestingT, s ladder.Sector, bond int, seed uint64) *State {
	target, err := m.f.Target(s)
	require.NoError(t, err)
	state, err := RandomState(m.f, m.h.Scope, target.Charge, bond, seed)
	require.NoError(t, err)
	return state
}

// vectorOf returns the state vector in either arithmetic.
func vectorOf(s *State) []complex128 {
	if c, ok := s.Real(); ok {
		return vector(c)
	}
	c, _ := s.Complex()
	return vector(c)
}

func TestStateOfEitherArithmetic(t *testing.T) {
	for _, row := range []struct {
		name string
		flux string
		real bool
	}{{"real", "0", true}, {"complex", "0.3", false}} {
		t.Run(row.name, func(t *testing.T) {
			m := bosons(t, 3, row.flux)
			s := m.random(t, ladder.Sector{"N": 4}, 20, 1)
			re, isReal := s.Real()
			co, isComplex := s.Complex()
			require.Equal(t, row.real, isReal)
			require.Equal(t, !row.real, isComplex)
			require.Equal(t, row.real, re != nil)
			require.Equal(t, !row.real, co != nil)
			require.Same(t, m.f, s.Frames())
			require.Same(t, m.h.Scope, s.Scope())
			require.Equal(t, 6, s.Sites())
			require.Len(t, s.BondDims(), 5)
			require.LessOrEqual(t, s.MaxBond(), 20)
			require.Equal(t, map[string]float64{"N": 4}, s.Charges())
			require.Equal(t, s.Charge(), block.Charge{4})
			require.InDelta(t, 1, s.Norm(), 1e-13)

			wide, err := ChainOf[complex128](s)
			require.NoError(t, err)
			require.Equal(t, vectorOf(s), vector(wide))
			_, err = ChainOf[float64](s)
			require.Equal(t, row.real, err == nil)

			all := s.Spectra()
			require.Equal(t, all[2].Axis, s.Schmidt(2).Axis)
			for b, spectrum := range all {
				requireLevels(t, schmidt(m.f.Group, frameAxes(m.f), vectorOf(s), b), spectrum, 1)
			}
			before := vectorOf(s)
			c := s.Clone()
			discarded, err := c.Truncate(block.Cut{Bond: 4})
			require.NoError(t, err)
			require.Positive(t, discarded)
			require.LessOrEqual(t, c.MaxBond(), 4)
			require.InDelta(t, math.Sqrt(1-discarded), c.Normalize(), 1e-13)
			require.Equal(t, before, vectorOf(s), "a clone is a copy")
			x, err := s.Overlap(c)
			require.NoError(t, err)
			require.InDelta(t, math.Sqrt(1-discarded), cmplx.Abs(x), 1e-13)
		})
	}
}

func TestSuperposition(t *testing.T) {
	m := bosons(t, 2, "0")
	a, b := m.random(t, ladder.Sector{"N": 3}, 9, 1), m.random(t, ladder.Sector{"N": 3}, 9, 2)
	want := func(alpha, beta complex128) []complex128 {
		out := vectorOf(a)
		for i, x := range vectorOf(b) {
			out[i] = alpha*out[i] + beta*x
		}
		return out
	}
	s, err := Superpose(2, a, -1, b)
	require.NoError(t, err)
	_, ok := s.Real()
	require.True(t, ok)
	requireClose(t, want(2, -1), vectorOf(s), 1e-14)
	z, err := Superpose(2, a, 1i, b)
	require.NoError(t, err)
	_, ok = z.Complex()
	require.True(t, ok)
	requireClose(t, want(2, 1i), vectorOf(z), 1e-14)
	x, err := s.Overlap(z)
	require.NoError(t, err)
	require.InDelta(t, 0, cmplx.Abs(x-inner(vectorOf(s), vectorOf(z))), 1e-13)
	x, err = z.Overlap(s)
	require.NoError(t, err)
	require.InDelta(t, 0, cmplx.Abs(x-inner(vectorOf(z), vectorOf(s))), 1e-13)
}

func TestStatesThatDoNotMatch(t *testing.T) {
	m := bosons(t, 2, "0")
	a := m.random(t, ladder.Sector{"N": 3}, 9, 1)
	for _, row := range []struct {
		name string
		b    *State
		want string
	}{
		{"another length", bosons(t, 3, "0").random(t, ladder.Sector{"N": 3}, 9, 1), "4 and 6 sites"},
		{"other charges", newModel(t, 2, ladder.Boson(2), 2, ladder.FrameOptions{}, ladder.Term{Formula: "n[a,j] b[b,j] + h.c."}).random(t, nil, 3, 1), "same charges"},
		{"another gauge", imaginary(t, 2).random(t, ladder.Sector{"N": 3}, 9, 1), "different bases at site"},
	} {
		t.Run(row.name, func(t *testing.T) {
			_, err := a.Overlap(row.b)
			require.ErrorContains(t, err, row.want)
			_, err = Superpose(1, a, 1, row.b)
			require.ErrorContains(t, err, row.want)
		})
	}
	_, err := Superpose(1, a, 1, m.random(t, ladder.Sector{"N": 2}, 9, 1))
	require.ErrorContains(t, err, "expected equal ones")
	again := bosons(t, 2, "0").random(t, ladder.Sector{"N": 3}, 9, 1)
	x, err := a.Overlap(again)
	require.NoError(t, err, "frames found twice are equal")
	require.InDelta(t, 1, real(x), 1e-13)
}

func TestNewStateRefuses(t *testing.T) {
	m := bosons(t, 2, "0")
	c, _ := m.random(t, ladder.Sector{"N": 3}, 9, 1).Real()
	other, longer := tilted(t, 4), bosons(t, 3, "0")
	foreign, err := Product[float64](m.f.Group, uniform(4, 0, 1), []int{0, 0, 0, 0})
	require.NoError(t, err)
	sick := c.Clone()
	sick.Sites[1].Data[0] = math.NaN()
	spins := newModel(t, 2, ladder.Boson(3), 2, ladder.FrameOptions{}, ladder.Term{Formula: "n[a,j]"}).h.Scope
	for _, row := range []struct {
		name string
		c    *Chain[float64]
		f    *ladder.Frames
		s    *ladder.Scope
		want string
	}{
		{"no chain", nil, m.f, m.h.Scope, "needs a chain"},
		{"no frames", c, nil, m.h.Scope, "needs a chain"},
		{"no scope", c, m.f, nil, "needs a chain"},
		{"other charges", c, other.f, m.h.Scope, "in frames with"},
		{"longer frames", c, longer.f, m.h.Scope, "chain of 4 sites, frames of 6"},
		{"longer ladder", c, m.f, longer.h.Scope, "a ladder of 6"},
		{"other states", foreign, m.f, m.h.Scope, "site 0 has the states"},
		{"other sites", c, m.f, spins, "site 0 has 3 states, that of the ladder 4"},
		{"a number that is none", sick, m.f, m.h.Scope, "site 1 holds the number NaN"},
	} {
		t.Run(row.name, func(t *testing.T) {
			_, err := NewReal(row.c, row.f, row.s)
			require.ErrorContains(t, err, row.want)
			var wide *Chain[complex128]
			if row.c != nil {
				wide = Promote(row.c)
			}
			_, err = NewComplex(wide, row.f, row.s)
			require.Error(t, err)
		})
	}
}

// Product states count in the user's order, whatever the charges made of it; in a turned frame along its axis.
func TestProductStatesOfALadder(t *testing.T) {
	m := bosons(t, 2, "0")
	s, err := ProductState(m.f, m.h.Scope, []int{2, 0, 1, 1})
	require.NoError(t, err)
	require.Equal(t, map[string]float64{"N": 4}, s.Charges())
	require.Equal(t, 1.0, s.Norm())
	_, err = ProductState(m.f, m.h.Scope, []int{2, 0, 3, 1})
	require.ErrorContains(t, err, "site 2 has states 0..2, got 3")
	_, err = ProductState(m.f, m.h.Scope, []int{2})
	require.ErrorContains(t, err, "1 states given for 4 sites")

	require.NotZero(t, tilted(t, 3).f.Sites[0].Rotation)
	for _, m := range []model{tilted(t, 3), bosons(t, 2, "0.3"), imaginary(t, 2),
		newModel(t, 2, ladder.Electron(), 1, ladder.FrameOptions{}, ladder.Term{Formula: "c_up^+[a,j] c_down[a,j] + h.c."})} {
		lad := m.h.Scope.Ladder()
		states := make([]int, lad.Sites())
		for i := range states {
			states[i] = (i + 1) % lad.Site(i).Dim()
		}
		s, err := ProductState(m.f, m.h.Scope, states)
		require.NoError(t, err)
		// The stored state is U|user state>, up to a phase, where the user's state lies along the axis of the frame.
		want := []complex128{1}
		for i, frame := range m.f.Sites {
			d, u := frame.Dim(), m.f.Unitary(lad, i)
			user := make([]complex128, d)
			user[states[i]] = 1
			if frame.Rotation != 0 { // the states of a spin 1/2 along x
				user[0], user[1] = math.Sqrt2/2, complex(math.Sqrt2/2*float64(1-2*states[i]), 0)
			}
			site := make([]complex128, d)
			for k := range d {
				for n, x := range user {
					site[k] += u[k*d+n] * x
				}
			}
			var next []complex128
			for _, x := range want {
				for _, y := range site {
					next = append(next, x*y)
				}
			}
			want = next
		}
		require.InDelta(t, 1, cmplx.Abs(inner(want, vectorOf(s))), 1e-12)
	}
}

func TestZeroAndFailingSpectra(t *testing.T) {
	m := bosons(t, 2, "0")
	s := m.random(t, ladder.Sector{"N": 3}, 9, 1)
	c, _ := s.Real()
	c.Scale(0)
	require.Zero(t, s.Schmidt(1).Norm)
	require.Empty(t, s.Schmidt(1).Values)
	require.Len(t, s.Spectra(), 3)
	require.Empty(t, s.Spectra()[0].Values)
	c.Sites[0].Data[0] = math.Inf(1)
	require.Panics(t, func() { s.Schmidt(1) })
	require.Panics(t, func() { s.Spectra() })
}

func TestRandomStateRefuses(t *testing.T) {
	for _, m := range []model{bosons(t, 2, "0"), bosons(t, 2, "0.3")} {
		_, err := RandomState(m.f, m.h.Scope, block.Charge{9}, 4, 0)
		require.ErrorContains(t, err, "cannot hold the total charge")
	}
}

func sameChain[T dense.Scalar](t *testing.T, a, b *Chain[T]) {
	require.Equal(t, a.Center, b.Center)
	require.Equal(t, len(a.Sites), len(b.Sites))
	for i := range a.Sites {
		require.True(t, a.Sites[i].Structure.Equal(b.Sites[i].Structure))
		require.Equal(t, a.Sites[i].Data, b.Sites[i].Data)
	}
}
