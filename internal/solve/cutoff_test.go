package solve

import (
	"fmt"
	"math"
	"path/filepath"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/dmrg"
	"rundle/internal/runfolder"
)

const bosons = `
[ladder]
rungs = 3
[[leg]]
name = "a"
site = "boson"
max  = %d
[[term]]
formula = "-b^+[a,j+1] b[a,j] + h.c."
[[term]]
formula = "%g/2 n[a,j] (n[a,j] - 1)"
[sector]
N = %d
[solve]
precision = 1e-8
`

// TestCutoff: a boson site that is full too often makes the state suspect; hard-core bosons never do.
func TestCutoff(t *testing.T) {
	for _, c := range []struct {
		name    string
		max     int
		u       float64
		n       int
		verdict runfolder.Verdict
		top     bool
	}{
		{"pressed", 2, 1, 3, runfolder.Suspect, true},
		{"free", 6, 8, 2, runfolder.Converged, true},
		{"hard core", 1, 0, 2, runfolder.Converged, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			m := parse(t, fmt.Sprintf(bosons, c.max, c.u, c.n))
			s := solved(t, m, Options{Dir: filepath.Join(t.TempDir(), "a.run")}).Result.States[0]
			assert.Equal(t, c.verdict, s.Verdict)
			require.Equal(t, c.top, s.TopOccupation != nil)
			if c.top {
				assert.Equal(t, c.verdict == runfolder.Suspect, *s.TopOccupation > math.Sqrt(1e-8))
			}
			if c.verdict == runfolder.Suspect {
				assert.Contains(t, s.Reason, `boson cutoff: the probability of n = 2 is`)
				assert.Contains(t, s.Reason, `leg "a", rung 1`)
			}
		})
	}
}

// TestTooDear: the variance is left out where long-range couplings make its operator large and the search was short.
func TestTooDear(t *testing.T) {
	m := chain(t, 8, 4, 1e-8)
	found := &dmrg.Result{LargestBond: 100, OperatorBonds: []int{1, 5, 5, 5, 1}, Sweeps: []dmrg.Sweep{{LargestBond: 100}, {LargestBond: 100}}}
	assert.False(t, tooDear(found, m.Ladder))
	found.OperatorBonds = []int{1, 500, 500, 500, 1}
	assert.True(t, tooDear(found, m.Ladder))
	for range 50 {
		found.Sweeps = append(found.Sweeps, dmrg.Sweep{LargestBond: 100})
	}
	assert.False(t, tooDear(found, m.Ladder))
}
