package dmrg

import (
	"context"
	"errors"
	"fmt"
	"math"
	"testing"
	"time"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
	"rundle/mps/block"
)

// lowestOverAll searches every total on its own.
func lowestOverAll(t *testing.T, h *ladder.Hamiltonian, name string, values []float64) (at, energy float64) {
	t.Helper()
	energy = math.Inf(1)
	for _, v := range values {
		if r := ground1(t, h, ladder.Sector{name: v}, Options{}); r.Energy < energy-1e-8 {
			at, energy = v, r.Energy
		}
	}
	return at, energy
}

// TestFreeCharges leaves the number of free fermions open: few totals, all looked at, and many, found by a walk. The levels are mu - 2 cos(k pi/(n+1)).
func TestFreeCharges(t *testing.T) {
	for _, row := range []struct {
		name  string
		sites int
		mu    float64
	}{
		{"few totals", 8, -0.7}, {"many totals", 24, 1.1}, {"nearly empty", 24, 1.98}, {"empty", 16, 2.5}, {"full", 16, -3},
	} {
		t.Run(row.name, func(t *testing.T) {
			want, n := 0.0, 0.0
			for k := 1; k <= row.sites; k++ {
				if e := row.mu - 2*math.Cos(float64(k)*math.Pi/float64(row.sites+1)); e < 0 {
					want += e
					n++
				}
			}
			h := hamiltonian(t, row.sites, ladder.Open, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c.", fmt.Sprintf("%v n[a,j]", row.mu))
			r := ground1(t, h, nil, Options{})
			require.Equal(t, n, r.Sector["N"])
			require.InDelta(t, want, r.Energy, 1e-8)
			require.Equal(t, Converged, r.Verdict)
			named := ground1(t, h, ladder.Sector{"N": r.Sector["N"]}, Options{})
			require.Equal(t, named.Energy, r.Energy, "naming the sector found gives the same bits")
		})
	}
}

// TestPairsAlternate: attractive bosons bound in pairs make the energy alternate with the number: single steps see hills only.
func TestPairsAlternate(t *testing.T) {
	h := hamiltonian(t, 6, ladder.Open, []ladder.Site{ladder.Fermion(), ladder.Fermion()},
		"-0.5 c^+[a,j+1] c[a,j] + h.c.", "-0.5 c^+[b,j+1] c[b,j] + h.c.", "-4 n[a,j] n[b,j]", "0.6 n[a,j] n[a,j+1]", "1.9 n[a,j]", "1.9 n[b,j]")
	r := ground1(t, h, ladder.Sector{}, Options{Precision: 1e-4})
	n := r.Sector["N_a"]
	require.Equal(t, 2*n, r.Sector["N"])
	require.Greater(t, n, 1.0)
	for _, other := range [][2]float64{{n - 1, n - 1}, {n + 1, n + 1}, {n, n - 1}, {n + 1, n}} {
		s := ground1(t, h, ladder.Sector{"N_a": other[0], "N_b": other[1]}, Options{Precision: 1e-4})
		require.Greater(t, s.Energy, r.Energy, "%v", other)
	}
}

// TestPartlyFree names one of two charges.
func TestPartlyFree(t *testing.T) {
	h := hamiltonian(t, 6, ladder.Open, one(ladder.Electron()), append(hubbardTerms, "-0.4 n_up[a,j]", "0.4 n_down[a,j]")...)
	low, at := math.Inf(1), 0.0
	for sz := -3.0; sz <= 3; sz++ {
		if r := ground1(t, h, ladder.Sector{"N": 6, "Sz": sz}, Options{}); r.Energy < low {
			low, at = r.Energy, sz
		}
	}
	r := ground1(t, h, ladder.Sector{"N": 6}, Options{})
	require.Equal(t, map[string]float64{"N": 6, "Sz": at}, r.Sector)
	require.InDelta(t, low, r.Energy, 1e-8)
}

// TestDegenerateTotals: the pairing chain at its sweet spot has the same energy in both parities (Kitaev 2001). Either will do, always the same.
func TestDegenerateTotals(t *testing.T) {
	h := hamiltonian(t, 12, ladder.Open, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c.", "-c^+[a,j+1] c^+[a,j] + h.c.")
	want := exact.PairingChain(12, 1)
	first := ground1(t, h, nil, Options{})
	requireHonest(t, first, want)
	require.Equal(t, Converged, first.Verdict)
	for seed := range uint64(3) {
		r := ground1(t, h, nil, Options{Seed: seed + 1})
		require.Equal(t, first.Sector, r.Sector)
	}
}

// TestCloseTotals: parities a gap apart that short scouts cannot see: critical Ising chain in a weak field that favours one of them.
func TestCloseTotals(t *testing.T) {
	const n = 16
	h := hamiltonian(t, n, ladder.Open, one(ladder.Spin(1)), "-4 S^x[a,j] S^x[a,j+1]", "-0.3 S^z[a,j]")
	at, want := lowestOverAll(t, h, "P", []float64{0, 1})
	r := ground1(t, h, nil, Options{Precision: 1e-11})
	require.InDelta(t, want, r.Energy, 1e-8)
	if r.Sector["P"] != at { // closer than 1e-8: then the other must be above by less than that
		other := ground1(t, h, ladder.Sector{"P": at}, Options{Precision: 1e-11})
		require.GreaterOrEqual(t, other.Energy, r.Energy-1e-11)
	}
}

// TestWithoutCharges uses none of the charges that are there: the lowest state of all must still be found.
func TestWithoutCharges(t *testing.T) {
	for _, row := range []struct {
		name string
		h    *ladder.Hamiltonian
	}{
		{"spins", hamiltonian(t, 8, ladder.Open, one(ladder.Spin(1)), "S[a,j].S[a,j+1]", "0.3 S^z[a,j]")},
		{"spins in a field", hamiltonian(t, 8, ladder.Open, one(ladder.Spin(1)), "S[a,j].S[a,j+1]", "-1.3 S^z[a,j]")},
		{"bosons", hamiltonian(t, 6, ladder.Open, one(ladder.Boson(2)), "-b^+[a,j+1] b[a,j] + h.c.", "n[a,j] (n[a,j]-1)", "-0.6 n[a,j]")},
	} {
		t.Run(row.name, func(t *testing.T) {
			want := ground1(t, row.h, nil, Options{})
			r := ground1(t, row.h, nil, Options{Charges: []string{}})
			require.Empty(t, r.Sector)
			require.InDelta(t, want.Energy, r.Energy, 1e-8)
		})
	}
}

// TestChoiceHalts: cancelled among the scouts there is no result yet; at the cap on time there is one, of the best total so far.
func TestChoiceHalts(t *testing.T) {
	h := hamiltonian(t, 30, ladder.Open, one(ladder.Boson(2)), "-b^+[a,j+1] b[a,j] + h.c.", "n[a,j] (n[a,j]-1)", "-0.6 n[a,j]")
	p, err := newProblem(h, nil, Options{})
	require.NoError(t, err)
	for _, row := range []error{context.Canceled, errTime} {
		calls := 0
		p.halt = func() error {
			if calls++; calls > 500 {
				return row
			}
			return nil
		}
		_, err := pickTotal(p, build(t, p))
		if row == errTime {
			require.NoError(t, err)
		} else {
			require.True(t, errors.Is(err, row))
		}
	}
	r := ground1(t, h, nil, Options{Time: time.Microsecond})
	require.Equal(t, TimeCap, r.Verdict)
	require.True(t, math.IsInf(r.EnergyError, 1))
	require.False(t, math.IsNaN(r.Energy))
}

func TestAround(t *testing.T) {
	c := &choice[float64]{p: &problem{strings: &ladder.Strings{}}}
	g, err := block.NewGroup(block.Rule{Name: "N"}, block.Rule{Name: "Sz"})
	require.NoError(t, err)
	c.p.strings.Group = g
	for n := int32(0); n <= 12; n++ {
		for sz := -n; sz <= n; sz += 2 {
			c.totals = append(c.totals, block.Charge{n, sz})
		}
	}
	c.spacing = spacings(c.totals)
	require.Equal(t, [4]int64{1, 1, 1, 1}, c.spacing)
	near := c.around(block.Charge{6, 0}, 1)
	require.Len(t, near, 12) // (±1,±1), (±2,0), (0,±2), (±2,±2)
	require.ElementsMatch(t, []block.Charge{{5, -1}, {5, 1}, {7, -1}, {7, 1}}, near[:4])
	require.Contains(t, near, block.Charge{8, 0})
	far := c.around(block.Charge{6, 0}, 3)
	require.Equal(t, []block.Charge{{3, -1}, {3, 1}, {7, -3}, {7, 3}, {4, 0}, {6, -2}, {6, 2}, {8, 0}}, far, "one in each direction")
	require.Equal(t, [4]int64{1, 2, 1, 1}, spacings([]block.Charge{{6, 0}, {6, 4}, {6, 2}}))
}
