package solve

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/mpo/ladder"
)

// TestSpreadBars follows values that approach their limit linearly in the square root of the discarded weight: the error is the distance.
func TestSpreadBars(t *testing.T) {
	const limit, slope = 0.3, 2.0
	for _, c := range []struct{ w, before, want float64 }{
		{1e-8, 2e-8, slope * 1e-4},       // r = 0.71
		{1e-10, 1e-6, slope * 1e-3},      // r = 0.01, kept at 1/2: the whole spread, about
		{1e-8, 1e-8, 0},                  // no spread
		{0, 1e-6, slope * 1e-3},          // nothing discarded any more
		{2e-8, 1e-8, slope * 4.1421e-05}, // it grew: nineteen times the spread
	} {
		v := func(w float64) complex128 { return complex(limit+slope*math.Sqrt(w), 0) }
		now := series{values: []complex128{v(c.w)}, norms: []float64{1}}
		bar := spreadBars(now, []complex128{v(c.before)}, quality{weight: c.w}, c.before)[0]
		want := c.want
		if c.w > c.before {
			want *= 19
		}
		assert.InDelta(t, want, bar, 2e-2*want+2*rounding, "%v", c)
	}
}

// TestSpreadBarsFloor: a place whose value happens not to move gets its part of the typical change.
func TestSpreadBarsFloor(t *testing.T) {
	now := series{values: []complex128{1, 2, 3, 4i}, norms: []float64{1, 1, 1, 1}}
	bars := spreadBars(now, []complex128{1, 2, 3, 4i + 0.01}, quality{}, 0)
	assert.InDelta(t, 0.3*0.005, bars[0], 1e-12)
	assert.InDelta(t, 0.01, bars[3], 1e-12)
	assert.Empty(t, spreadBars(series{}, nil, quality{}, 0))
	// The residual counts by the norm of the operator.
	now.norms[1] = 10
	bars = spreadBars(now, now.values, quality{residual: 1e-6}, 0)
	assert.InDelta(t, 5e-7, bars[0], 1e-12)
	assert.InDelta(t, 5e-6, bars[1], 1e-11)
}

func TestLoneBars(t *testing.T) {
	now := series{values: []complex128{1, 2}, norms: []float64{1, 3}}
	bars := loneBars(now, quality{weight: 1e-8, energy: 1e-6, residual: 1e-5})
	assert.InDelta(t, 2*(1e-4+1e-3+1e-5), bars[0], 1e-12)
	assert.InDelta(t, 3*bars[0], bars[1], 1e-12)
	assert.InDelta(t, 2.0, loneBars(now, quality{energy: 1e9})[0], 1e-9, "no more than twice the norm")
}

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
