package errorbar

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
)

// TestSpread follows values that approach their limit linearly in the square root of the discarded weight: the error is the distance.
func TestSpread(t *testing.T) {
	const limit, slope = 0.3, 2.0
	for _, c := range []struct{ w, before, want float64 }{
		{1e-8, 4e-8, slope * 1e-4},                                  // r = 0.5
		{1e-12, 1e-6, slope * 1e-3 * leastRatio / (1 - leastRatio)}, // r = 0.001, kept at its least
		{1e-8, 1e-8, 0}, // no spread
		{0, 1e-6, slope * 1e-3 * leastRatio / (1 - leastRatio)},        // nothing discarded any more
		{2e-8, 1e-8, slope * 4.1421e-05 * mostRatio / (1 - mostRatio)}, // it grew
	} {
		v := func(w float64) complex128 { return complex(limit+slope*math.Sqrt(w), 0) }
		bar := Values.Spread([]complex128{v(c.w)}, []complex128{v(c.before)}, []float64{1}, Quality{Weight: c.w}, c.before)[0]
		assert.InDelta(t, c.want, bar, 2e-3*c.want+2*rounding, "%v", c)
	}
}

// TestSpreadFloor: a place whose value happens not to move gets its part of the typical change.
func TestSpreadFloor(t *testing.T) {
	const share = leastRatio / (1 - leastRatio)
	now, norms := []complex128{1, 2, 3, 4i}, []float64{1, 1, 1, 1}
	bars := Values.Spread(now, []complex128{1, 2, 3, 4i + 0.01}, norms, Quality{}, 0)
	assert.InDelta(t, leastSpread*0.005*share, bars[0], 1e-12)
	assert.InDelta(t, 0.01*share, bars[3], 1e-12)
	assert.Empty(t, Values.Spread(nil, nil, nil, Quality{}, 0))
}

// TestFloor: what the energy and the residual tell counts by the norm of the operator, over the gap where one was seen.
func TestFloor(t *testing.T) {
	now, norms := []complex128{1, 2}, []float64{1, 10}
	for _, k := range []Kind{Values, Entropies} {
		for _, gap := range []float64{0, 1, 5, 1e-2} {
			over := gap
			if gap != 1e-2 {
				over = 1
			}
			bars := k.Spread(now, now, norms, Quality{Residual: 1e-6, Energy: 1e-8, Gap: gap}, 0)
			want := (k.excess*1e-8 + k.residual*1e-6) / over
			assert.InEpsilon(t, want+rounding, bars[0], 1e-9)
			assert.InEpsilon(t, 10*(want+rounding), bars[1], 1e-9)
		}
		assert.InEpsilon(t, k.excess+rounding, k.Spread(now, now, norms, Quality{Energy: 1, Gap: 1e-3}, 0)[0], 1e-9, "no more than the whole")
	}
}

// TestDilution: a value sees the less of the excess of energy the more sites share it.
func TestDilution(t *testing.T) {
	now := []complex128{1}
	bar := func(sites int) float64 {
		return Values.Spread(now, now, []float64{1}, Quality{Sites: sites, Energy: 1e-3}, 0)[0]
	}
	assert.InEpsilon(t, 1e-3*Values.excess, bar(1), 1e-6)
	assert.InEpsilon(t, bar(1)/4, bar(8), 1e-6)
	assert.Equal(t, bar(1), bar(0))
}

// TestLeft: a residual counts as far as truncation does not explain it.
func TestLeft(t *testing.T) {
	assert.Zero(t, Quality{Weight: 1e-8}.left())
	assert.InEpsilon(t, 1e-5, Quality{Residual: 1e-5}.left(), 1e-12)
	assert.InEpsilon(t, 1e-5, Quality{Residual: 1e-5, Weight: 1e-16}.left(), 1e-5)
	assert.Less(t, Quality{Residual: 1e-5, Weight: 1e-6}.left(), 1e-7)
}

// TestReach: to first order truncation is seen by what reaches over the cut.
func TestReach(t *testing.T) {
	now, q := []complex128{1}, Quality{Weight: 1e-8}
	far := Correlations.Spread(now, now, []float64{2}, q, 1e-8)[0]
	assert.InEpsilon(t, 2*(Correlations.root*1e-4+rounding), far, 1e-9)
	assert.InDelta(t, 0, Values.Spread(now, now, []float64{2}, q, 1e-8)[0], 3*rounding)
}

func TestLone(t *testing.T) {
	norms := []float64{1, 3}
	bars := Lone(norms, Quality{Weight: 1e-8, Energy: 1e-6, Residual: 1e-5})
	assert.InDelta(t, 2*(1e-4+1e-3+1e-5), bars[0], 1e-12)
	assert.InDelta(t, 3*bars[0], bars[1], 1e-12)
	assert.InDelta(t, 2.0, Lone(norms, Quality{Energy: 1e9})[0], 1e-9, "no more than twice the norm")
}
