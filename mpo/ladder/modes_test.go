package ladder

import (
	"math/cmplx"
	"testing"

	"github.com/stretchr/testify/require"
)

// modesCase is a flux ladder on legs of the given sites, its hopping written in different gauges.
func modesCase(t *testing.T, rungs int, site Site, c Constants, terms ...string) *Hamiltonian {
	t.Helper()
	l, err := New(rungs, Open, Leg("a", site), Leg("b", site))
	require.NoError(t, err)
	return modesOn(t, l, c, terms...)
}

func modesOn(t *testing.T, l *Ladder, c Constants, terms ...string) *Hamiltonian {
	t.Helper()
	var all []Term
	for _, f := range terms {
		all = append(all, Term{Formula: f})
	}
	h, err := l.Hamiltonian(c, all...)
	require.NoError(t, err)
	return h
}

// The matrix of the Hamiltonian is that of the rewritten one between the pair matrices, which are unitary: no more than matrices of
// a product basis are used.
func TestModesAreTheSameHamiltonian(t *testing.T) {
	con := Constants{"J": 1, "K": 0.7, "V": 1.3, "U": 2.1, "W": 0.4, "phi": 0.77, "x": 0.31}
	legs := []string{
		"-J*exp(i*phi/2) c^+[a,j+1] c[a,j] - J*exp(-i*phi/2) c^+[b,j+1] c[b,j] + h.c.", "-K c^+[a,j] c[b,j] + h.c.",
		"V n[a,j] n[a,j+1] + V n[b,j] n[b,j+1]", "U n[a,j] n[b,j]",
	}
	rung := []string{
		"-J c^+[a,j+1] c[a,j] - J c^+[b,j+1] c[b,j] + h.c.", "-K*exp(i*(phi*j + x)) c^+[a,j] c[b,j] + h.c.",
		"W c^+[a,j+1] c[b,j] + W c^+[b,j+1] c[a,j] + h.c.",
	}
	one := []string{
		"-J*exp(i*(phi+x)) c^+[a,j+1] c[a,j] - J*exp(i*x) c^+[b,j+1] c[b,j] + h.c.", "-K c^+[a,j] c[b,j] + h.c.", "V n[a,j] n[b,j+1] + V n[b,j] n[a,j+1]",
	}
	electrons := []string{
		"-J*exp(i*phi/2) c_up^+[a,j+1] c_up[a,j] - J*exp(-i*phi/2) c_up^+[b,j+1] c_up[b,j] + h.c.",
		"-J*exp(i*phi/2) c_down^+[a,j+1] c_down[a,j] - J*exp(-i*phi/2) c_down^+[b,j+1] c_down[b,j] + h.c.",
		"-K c_up^+[a,j] c_up[b,j] - K c_down^+[a,j] c_down[b,j] + h.c.",
		"U n_up[a,j] n_down[a,j] + U n_up[b,j] n_down[b,j]", "V n[a,j] n[b,j]", "W (S[a,j].S[b,j+1] + S[b,j].S[a,j+1])",
	}
	four, err := New(2, Open, Leg("a", Fermion()), Leg("b", Fermion()), Leg("c", Fermion()), Leg("d", Fermion()))
	require.NoError(t, err)
	three, err := New(2, Open, Leg("a", Fermion()), Leg("b", Fermion()), Leg("c", Fermion()))
	require.NoError(t, err)
	for _, row := range []struct {
		name string
		h    *Hamiltonian
	}{
		{"flux on both legs", modesCase(t, 4, Fermion(), con, legs...)},
		{"flux on the rungs", modesCase(t, 4, Fermion(), con, rung...)},
		{"flux on one leg", modesCase(t, 4, Fermion(), con, one...)},
		{"pairing", modesCase(t, 3, Fermion(), con, append(legs[:2:2], "W c[a,j] c[b,j] + W c[b,j+1] c[a,j] + W c[b,j] c[a,j+1]+ h.c.")...)},
		{"two components", modesCase(t, 2, Electron(), con, electrons...)},
		{"four legs", modesOn(t, four, con, append(legs[:2:2], "-J*exp(i*phi) c^+[c,j+1] c[c,j] - J*exp(-i*phi) c^+[d,j+1] c[d,j] + h.c.", "-K c^+[c,j] c[d,j] + h.c.",
			"-W c^+[a,j] c[c,j] - W c^+[b,j] c[d,j] + h.c.")...)},
		{"a third leg", modesOn(t, three, con, append(legs, "-W c^+[a,j] c[c,j] - W c^+[b,j] c[c,j] + h.c.", "J c^+[c,j+1] c[c,j] + h.c.")...)},
	} {
		t.Run(row.name, func(t *testing.T) {
			f, err := row.h.Frames(FrameOptions{})
			require.NoError(t, err)
			require.False(t, f.Real, "phases alone do it: no case for modes")
			m := row.h.Modes()
			require.NotNil(t, m)
			f, err = m.Hamiltonian.Frames(FrameOptions{})
			require.NoError(t, err)
			require.True(t, f.Real)
			old, new := userMatrix(row.h.Poly), userMatrix(m.Hamiltonian.Poly)
			n := len(old)
			g := make([]complex128, n*n)
			for i := range n {
				g[i*n+i] = 1
			}
			for _, first := range m.Pairs {
				g = actOnPair(m, first, g, n)
			}
			back := make([]complex128, n*n) // g · new · g^+
			half := make([]complex128, n*n)
			for i := range n {
				for k := range n {
					if z := g[i*n+k]; z != 0 {
						for j := range n {
							half[i*n+j] += z * new[k][j]
						}
					}
				}
			}
			for j := range n {
				for k := range n {
					if z := cmplx.Conj(g[j*n+k]); z != 0 {
						for i := range n {
							back[i*n+j] += half[i*n+k] * z
						}
					}
				}
			}
			for i := range n {
				norm := 0.0
				for j := range n {
					norm += real(g[i*n+j])*real(g[i*n+j]) + imag(g[i*n+j])*imag(g[i*n+j])
					require.InDelta(t, 0, cmplx.Abs(old[i][j]-back[i*n+j]), 1e-12, "element %d, %d", i, j)
				}
				require.InDelta(t, 1, norm, 1e-12)
			}
		})
	}
}

// actOnPair multiplies the columns of g by the matrix of a pair; rows count the product basis, site 0 slowest.
func actOnPair(m *Modes, first int, g []complex128, n int) []complex128 {
	l := m.Hamiltonian.Ladder()
	inner := 1
	for i := first + 2; i < l.Sites(); i++ {
		inner *= l.Site(i).Dim()
	}
	d := l.Site(first).Dim()
	pair := m.Pair(first)
	out := make([]complex128, n*n)
	for row := range n {
		outer, in := row/(inner*d*d), row%inner
		to := row / inner % (d * d)
		for from := range d * d {
			if z := pair[to*d*d+from]; z != 0 {
				src := (outer*d*d+from)*inner + in
				for k := range n {
					out[row*n+k] += z * g[src*n+k]
				}
			}
		}
	}
	return out
}

func TestModesNeedTheSymmetry(t *testing.T) {
	con := Constants{"phi": 0.77}
	hop := "-exp(i*phi/2) c^+[a,j+1] c[a,j] - exp(-i*phi/2) c^+[b,j+1] c[b,j] - c^+[a,j] c[b,j] + h.c."
	boson, err := New(3, Open, Leg("a", Boson(1)), Leg("b", Boson(1)))
	require.NoError(t, err)
	single, err := New(2, Open, Leg("a", Electron(Double(false))), Leg("b", Electron(Double(false))))
	require.NoError(t, err)
	ragged, err := New(3, Open, Leg("a", Fermion(), OnRungs(0, 1)), Leg("b", Fermion()))
	require.NoError(t, err)
	for _, row := range []struct {
		name string
		h    *Hamiltonian
	}{
		{"tilt", modesCase(t, 3, Fermion(), con, hop, "n[a,j] - n[b,j]")},
		{"other hopping", modesCase(t, 3, Fermion(), con, hop, "0.1 c^+[a,j+1] c[a,j] + h.c.")},
		{"bosons", modesOn(t, boson, con, "-exp(i*phi/2) b^+[a,j+1] b[a,j] - exp(-i*phi/2) b^+[b,j+1] b[b,j] - b^+[a,j] b[b,j] + h.c.")},
		{"no double occupation", modesOn(t, single, con, "-exp(i*phi/2) c_up^+[a,j+1] c_up[a,j] - exp(-i*phi/2) c_up^+[b,j+1] c_up[b,j] - c_up^+[a,j] c_up[b,j] + h.c.")},
		{"ragged", modesOn(t, ragged, con, hop)},
	} {
		t.Run(row.name, func(t *testing.T) { require.Nil(t, row.h.Modes()) })
	}
}
