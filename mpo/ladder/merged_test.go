package ladder

import (
	"math/cmplx"
	"testing"

	"github.com/stretchr/testify/require"
)

// The strings of the merged sites, between the matrices that split them, are the Hamiltonian: compared in the product basis.
func TestMergedIsTheSameHamiltonian(t *testing.T) {
	con := Constants{"J": 1, "K": 0.7, "V": 1.3, "U": 2.1, "phi": 0.77, "x": 0.31}
	legs := []string{
		"-J*exp(i*phi/2) b^+[a,j+1] b[a,j] - J*exp(-i*phi/2) b^+[b,j+1] b[b,j] + h.c.", "-K b^+[a,j] b[b,j] + h.c.",
		"U/2 n[a,j] (n[a,j]-1) + U/2 n[b,j] (n[b,j]-1)", "V n[a,j] n[b,j+1] + V n[b,j] n[a,j+1]",
	}
	rung := []string{"-J b^+[a,j+1] b[a,j] - J b^+[b,j+1] b[b,j] + h.c.", "-K*exp(i*(phi*j + x)) b^+[a,j] b[b,j] + h.c."}
	spins := []string{
		"J/2*exp(i*phi) S^+[a,j+1] S^-[a,j] + J/2*exp(-i*phi) S^+[b,j+1] S^-[b,j] + h.c.", "K S[a,j].S[b,j]", "V S^z[a,j] S^z[a,j+1] + V S^z[b,j] S^z[b,j+1]",
		"U (S^z[a,j])^2 + U (S^z[b,j])^2",
	}
	three, err := New(2, Open, Leg("a", Boson(1)), Leg("b", Boson(1)), Leg("c", Spin(1)))
	require.NoError(t, err)
	for _, row := range []struct {
		name string
		h    *Hamiltonian
	}{
		{"hard-core bosons", modesCase(t, 4, Boson(1), con, legs...)},
		{"bosons", modesCase(t, 2, Boson(3), con, legs...)},
		{"flux on the rungs", modesCase(t, 3, Boson(1), con, rung...)},
		{"spins 1/2", modesCase(t, 3, Spin(1), con, spins...)},
		{"spins 1", modesCase(t, 2, Spin(2), con, spins...)},
		{"a third leg", modesOn(t, three, con, append(legs[:3:3], "V n[a,j] S^z[c,j] + V n[b,j] S^z[c,j]", "S[c,j].S[c,j+1]")...)},
		{"a field", modesCase(t, 3, Boson(1), con, append(rung[:1:1], "-K*exp(i*phi) b^+[a,j] b[b,j] + h.c.", "0.3*exp(i*x*j) b[a,j] + 0.3*exp(-i*(x*j+1)) b[b,j] + h.c.")...)},
	} {
		t.Run(row.name, func(t *testing.T) {
			f, err := row.h.Frames(FrameOptions{})
			require.NoError(t, err)
			require.False(t, f.Real, "phases alone do it: no case for merged sites")
			m := row.h.Merged(f)
			require.NotNil(t, m)
			require.True(t, m.Strings.Real)
			old, err := f.Strings(row.h.Poly)
			require.NoError(t, err)
			want, got := storedMatrix(old), storedMatrix(m.Strings)
			s, n := []complex128{1}, 1
			for k := range m.First {
				s, n = kron(s, n, m.Split(k, f), m.Strings.Axes[k].Dim())
			}
			require.Len(t, want, n)
			flat := make([]complex128, n*n)
			for i := range n {
				copy(flat[i*n:], got[i])
			}
			back := product(s, product(flat, adjoint(s)))
			for i := range n {
				for j := range n {
					require.InDelta(t, 0, cmplx.Abs(want[i][j]-back[i*n+j]), 1e-12, "element %d, %d", i, j)
				}
			}
		})
	}
}

func TestMergedNeedsTheSymmetry(t *testing.T) {
	con := Constants{"phi": 0.77}
	hop := "-exp(i*phi/2) b^+[a,j+1] b[a,j] - exp(-i*phi/2) b^+[b,j+1] b[b,j] + h.c."
	mixed, err := New(2, Open, Leg("a", Boson(1)), Leg("b", Boson(2)))
	require.NoError(t, err)
	for _, row := range []struct {
		name string
		h    *Hamiltonian
	}{
		{"tilt", modesCase(t, 3, Boson(1), con, hop, "-b^+[a,j] b[b,j] + h.c.", "n[a,j] - n[b,j]")},
		{"other sites", modesOn(t, mixed, con, hop, "-b^+[a,j] b[b,j] + h.c.")},
	} {
		t.Run(row.name, func(t *testing.T) {
			f, err := row.h.Frames(FrameOptions{})
			require.NoError(t, err)
			require.False(t, f.Real)
			require.Nil(t, row.h.Merged(f))
		})
	}
}
