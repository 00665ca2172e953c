//go:build long

package calibration

import (
	"testing"

	"github.com/stretchr/testify/require"
)

// TestAllBars judges the whole test half. What is wished for is 0.95 and 10 for all three.
func TestAllBars(t *testing.T) {
	total := measured(t, func(m *Model) bool { return !m.Tunes() }, 25)
	require.GreaterOrEqual(t, total.Energy.Covered, 0.95)
	require.LessOrEqual(t, total.Energy.Ratio, 15.0)
	require.GreaterOrEqual(t, total.Entropy.Covered, 0.9)
	require.LessOrEqual(t, total.Entropy.Ratio, 15.0)
	require.GreaterOrEqual(t, total.Local.Covered, 0.95)
	require.LessOrEqual(t, total.Local.Ratio, 90.0)
}
