package solve

import (
	"fmt"
	"math"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

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

// TestGiantCouplings: an energy near the largest numbers is a result; its variance is none.
func TestGiantCouplings(t *testing.T) {
	m := parse(t, strings.Replace(fmt.Sprintf(hopping, 6, 3, 1e-8), "t = 1.0", "t = 1e200", 1))
	dir := filepath.Join(t.TempDir(), "a.run")
	s := solved(t, m, Options{Dir: dir}).Result.States[0]
	energy, _ := filled(6, 3)
	assert.InEpsilon(t, 1e200*energy, s.Energy, 1e-10)
	assert.Nil(t, s.Variance)
	log, err := runfolder.ReadLog(dir)
	require.NoError(t, err)
	assert.Contains(t, log[len(log)-1].Note, "the variance is left out")
}
