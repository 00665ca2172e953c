package calibration

import (
	"context"
	"math"
	"testing"

	"github.com/stretchr/testify/require"
)

// The set is as large, as hard and as evenly split as it claims.
func TestModels(t *testing.T) {
	all, hard, halves := Models(), 0, map[string]int{}
	names := map[string]bool{}
	for _, m := range all {
		require.False(t, names[m.Name], m.Name)
		names[m.Name] = true
		if m.Hard {
			hard++
		}
		halves[m.Half()]++
		_, err := m.Hamiltonian()
		require.NoError(t, err, m.Name)
	}
	require.GreaterOrEqual(t, 3*hard, len(all))
	require.GreaterOrEqual(t, halves[Tuning], 30)
	require.GreaterOrEqual(t, halves[Test], 30)
	require.GreaterOrEqual(t, halves[HeldBack], 16)
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

// few are cheap models of the kinds that there are, none of which tunes.
var few = map[string]bool{
	"critical Ising chain, 32 spins": true, "Majumdar-Ghosh chain": true, "anisotropic ring, 12 spins, 0.5": true,
	"disordered Heisenberg chain": true, "frustrated chain, J2 = 0.8": true, "spin-one chain, easy plane": true, "chiral clock chain": true,
	"bosons, pi flux": true, "bosons, disordered chain": true, "hard-core bosons, flux ladder, three of twelve": true,
	"fermions that attract, disordered": true, "pairing chain, 50 sites": true, "disordered chain, 48 sites": true,
}

// TestBars holds the error bars to account. The median of quoted over true is that of few models; of all it is at most ten, or results.md says what it is.
func TestBars(t *testing.T) {
	total := measured(t, func(m *Model) bool { return few[m.Name] && m.Half() != Tuning }, len(few))
	for _, s := range []Score{total.Energy, total.Local, total.Entropy} {
		require.GreaterOrEqual(t, s.Covered, 0.9)
		require.LessOrEqual(t, s.Ratio, 20.0)
	}
	require.GreaterOrEqual(t, total.Far.Covered, 0.9)
	require.LessOrEqual(t, total.Far.Ratio, 30.0)
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
	for name, s := range map[string]Score{"energies": total.Energy, "values": total.Local, "correlations": total.Far, "entropies": total.Entropy} {
		t.Logf("%s: %.1f %% of %d held, quoted over true %.3g", name, 100*s.Covered, s.Bars, s.Ratio)
	}
	return total
}
