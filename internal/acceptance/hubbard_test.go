package acceptance

import (
	"fmt"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

// hubbard is an open Hubbard chain with t = 1 and given numbers of electrons.
type hubbard struct {
	sites, up, down int
	repulsion       float64
}

func (c hubbard) String() string {
	return fmt.Sprintf("sites=%d/up=%d/down=%d/U=%v", c.sites, c.up, c.down, c.repulsion)
}

// run compares with the open Lieb-Wu equations (Schulz 1985), solved by the oracle, with both particle numbers as charges.
func (c hubbard) run(t *testing.T) {
	want, err := exact.HubbardChain(c.sites, max(c.up, c.down), min(c.up, c.down), 1, c.repulsion)
	require.NoError(t, err)
	h := openChain(t, c.sites, ladder.Electron(), ladder.Constants{"U": c.repulsion},
		"-(c_up^+[a,j+1] c_up[a,j] + c_down^+[a,j+1] c_down[a,j]) + h.c.", "U n_up[a,j] n_down[a,j]")
	sector := ladder.Sector{"N": c.up + c.down, "Sz": float64(c.up-c.down) / 2}
	res := requireGround(t, h, sector, wish{relative: 1e-9, want: want, largest: max(1, c.repulsion)})
	require.Equal(t, 2, res.State.Frames().Group.Len())
	n := values(t, res, "n[a,j]", nil)
	sz := values(t, res, "S^z[a,j]", nil)
	var total, magnetization float64
	for j := range n {
		total += real(n[j])
		magnetization += real(sz[j])
		require.InDelta(t, real(n[j]), real(n[c.sites-1-j]), 1e-5, "the chain is its mirror image")
	}
	require.InDelta(t, float64(c.up+c.down), total, 1e-9)
	require.InDelta(t, float64(c.up-c.down)/2, magnetization, 1e-9)
}

func TestHubbardChain(t *testing.T) {
	for _, c := range []hubbard{
		{8, 4, 4, 4},  // half filled
		{10, 5, 5, 8}, // half filled
		{10, 3, 3, 6}, // doped
		{9, 4, 2, 4},  // doped, magnetized
		{9, 2, 4, 4},  // and its mirror image
		{12, 1, 1, 2}, // two electrons
		{8, 4, 0, 4},  // one component
	} {
		t.Run(c.String(), c.run)
	}
}
