package calibration

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/require"
)

// The set is as large, as hard and as evenly split as it claims.
func TestModels(t *testing.T) {
	all, hard, tuning := Models(), 0, 0
	names := map[string]bool{}
	for _, m := range all {
		require.False(t, names[m.Name], m.Name)
		names[m.Name] = true
		if m.Hard {
			hard++
		}
		if m.Tunes() {
			tuning++
		}
		_, err := m.Hamiltonian()
		require.NoError(t, err, m.Name)
	}
	require.GreaterOrEqual(t, len(all), 60)
	require.GreaterOrEqual(t, 3*hard, len(all))
	require.GreaterOrEqual(t, tuning, 25)
	require.GreaterOrEqual(t, len(all)-tuning, 25)
}

func TestScore(t *testing.T) {
	s := score([]Bar{{Quoted: 2, True: 1}, {Quoted: 1, True: 2}, {Quoted: 8, True: 2}, {Quoted: 0, True: 1e-13}}, 1)
	require.Equal(t, Score{Covered: 0.75, Ratio: 2, Bars: 4}, s)
	s = score([]Bar{{True: 1e-13}}, 1)
	require.Equal(t, 1.0, s.Covered)
	require.True(t, math.IsNaN(s.Ratio), "rounding leaves the median")
}

// A model counts once, however many searches it has.
func TestTotal(t *testing.T) {
	held := Case{Energy: Bar{Quoted: 3, True: 1}}
	missed := Case{Energy: Bar{Quoted: 1, True: 2}}
	records := []Record{{Size: 1, Cases: []Case{held, held, held, held, held, held}}, {Size: 1, Cases: []Case{missed}}, {Hard: true}}
	models, total := Total(records, func(r *Record) bool { return !r.Hard })
	require.Equal(t, 2, models)
	require.Equal(t, Score{Covered: 0.5, Ratio: 1.75, Bars: 7}, total.Energy)
	require.Zero(t, total.Local.Bars)
}

// few are models of the test half that are cheap.
var few = map[string]bool{"critical Ising chain, 32 spins": true, "bosons, pi flux": true, "hard-core bosons, flux ladder, three of twelve": true, "Majumdar-Ghosh chain": true}

func TestBars(t *testing.T) {
	total := measured(t, func(m *Model) bool { return few[m.Name] && !m.Tunes() }, len(few))
	require.GreaterOrEqual(t, total.Energy.Covered, 0.95)
	require.LessOrEqual(t, total.Energy.Ratio, 50.0, "the median of few models; that of all is at most ten")
}

// measured searches models and logs how their bars fare.
func measured(t *testing.T, keep func(*Model) bool, least int) Scores {
	var records []Record
	for _, m := range Models() {
		if !keep(&m) {
			continue
		}
		r, err := m.Measure(context.Background())
		require.NoError(t, err)
		records = append(records, r)
	}
	n, total := Total(records, func(*Record) bool { return true })
	require.GreaterOrEqual(t, n, least)
	for name, s := range map[string]Score{"energies": total.Energy, "values": total.Local, "entropies": total.Entropy} {
		t.Logf("%s: %.1f %% of %d held, quoted over true %.3g", name, 100*s.Covered, s.Bars, s.Ratio)
	}
	return total
}
