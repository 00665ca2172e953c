package mpo

import (
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// TestProjectedOnLongChains wants what uses exact identities to agree, to some roundings, with environments that were multiplied across a hundred
// canonical sites, also between couplings of very different size and over many sites.
func TestProjectedOnLongChains(t *testing.T) {
	each := ladder.Each{"l": "legs"}
	for name, terms := range map[string][]ladder.Term{
		"large": {{Formula: "1e8 S[l,j].S[l,j+1]", Each: each}, {Formula: "S[a,j].S[b,j]"}, {Formula: "1e4 S[a,j].S[b,j+5]"}},
		"long":  {{Formula: "S[l,j].S[l,j+1]", Each: each}, {Formula: "0.3 S[a,j].S[a,j+7]"}, {Formula: "0.2 S[b,j].S[a,j+12]"}},
	} {
		l, err := ladder.New(55, ladder.Open, ladder.Leg("a", ladder.Spin(1)), ladder.Leg("b", ladder.Spin(1)))
		require.NoError(t, err)
		h, err := l.Hamiltonian(nil, terms...)
		require.NoError(t, err)
		f, err := h.Frames(ladder.FrameOptions{})
		require.NoError(t, err)
		s, err := f.Strings(h.Poly)
		require.NoError(t, err)
		o, err := Build[float64](s, Options{})
		require.NoError(t, err)
		psi, err := mps.Random[float64](o.Group, o.Phys, block.Charge{}, 16, rand.New(rand.NewPCG(1, 2)))
		require.NoError(t, err)
		var ws Workspace[float64]
		p := NewPlanner(o)
		for _, i := range []int{0, 54, 108} {
			psi.Canonicalize(i, nil)
			psi.Normalize()
			theta := block.Contract(psi.Sites[i], psi.Sites[i+1], []int{2}, []int{0})
			left, right := around(o, psi, i, 2, &ws)
			want := block.New[float64](theta.Structure)
			p.Project(i, 2, left, right, theta.Structure).Apply(want.Data, theta.Data, &ws, nil)
			left, right = LeftEdge(o), RightEdge(o, psi.Charge(), psi.Charge())
			for k := range i {
				left = GrowLeft(o, k, left, psi.Sites[k], psi.Sites[k], &ws, nil)
			}
			for k := o.Len() - 1; k >= i+2; k-- {
				right = GrowRight(o, k, right, psi.Sites[k], psi.Sites[k], &ws, nil)
			}
			got := block.New[float64](theta.Structure)
			p.Project(i, 2, left, right, theta.Structure).Apply(got.Data, theta.Data, &ws, nil)
			got.Axpy(-1, want)
			require.Less(t, got.Norm(), 30*0x1p-52*want.Norm(), "%s, bond %d", name, i)
		}
	}
}
