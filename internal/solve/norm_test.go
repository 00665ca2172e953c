package solve

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/mpo/ladder"
)

// TestNormBound holds bounds against the norms of matrices known by hand.
func TestNormBound(t *testing.T) {
	lad, err := ladder.New(3, ladder.Open, ladder.Leg("a", ladder.Spin(1)), ladder.Leg("b", ladder.Boson(3)))
	require.NoError(t, err)
	h, err := lad.Hamiltonian(nil, ladder.Term{Formula: "S[a,j].S[a,j+1] + n[b,j]"})
	require.NoError(t, err)
	f, err := h.Frames(ladder.FrameOptions{})
	require.NoError(t, err)
	for _, c := range []struct {
		formula     string
		least, most float64 // the norm itself, and what the bound may reach
	}{
		{"S^z[a,0]", 0.5, 0.5},
		{"2i*S^+[a,0]", 2, 2},
		{"S[a,0].S[a,1]", 0.75, 1.25},
		{"n[b,0]", 3, 3},
		{"b[b,0]", math.Sqrt(3), math.Sqrt(3)},
		{"b[b,0] + b^+[b,0]", 2.33, 2 * math.Sqrt(3)},
		{"prod(k=0..2, exp(i*pi*S^z[a,k]))", 1, 1 + 1e-9},
		{"0*n[b,0]", 0, 0},
	} {
		p, err := h.Scope.Polynomial(ladder.Term{Formula: c.formula})
		require.NoError(t, err, c.formula)
		bound, err := normBound(p, f)
		require.NoError(t, err, c.formula)
		assert.GreaterOrEqual(t, bound, c.least-1e-12, c.formula)
		assert.LessOrEqual(t, bound, c.most+1e-12, c.formula)
	}
	// Two places: exchanges of at most 5/4, bosons of at most 3.
	bound, err := looseBound(h, f, 10)
	require.NoError(t, err)
	assert.InDelta(t, 10+2*1.25+2*3, bound, 1e-12)
	assert.InDelta(t, 1.0, largestCoefficient(h.Poly), 1e-12)
}
