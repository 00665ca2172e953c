package solve

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/internal/runfolder"
)

// TestRead: observing the saved state again gives the same values, under wider error bars.
func TestRead(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "a.run")
	m := chain(t, 8, 3, 1e-8)
	first := solved(t, m, Options{Dir: dir}).Result
	again, notes, err := Read(context.Background(), dir, ReadOptions{})
	require.NoError(t, err)
	assert.Empty(t, notes)
	assert.Equal(t, first.Model, again.Model)
	assert.Equal(t, first.States[0].Energy, again.States[0].Energy)
	for name, list := range first.States[0].Observations {
		for i, o := range list {
			p := again.States[0].Observations[name][i]
			assert.Equal(t, o.At, p.At)
			assert.InDelta(t, o.Value.Re, p.Value.Re, 1e-13)
			assert.GreaterOrEqual(t, p.Error, 0.1*o.Error)
		}
	}
	assert.Len(t, again.States[0].Entanglement.Cuts, 7)
	assert.InDelta(t, first.States[0].Entanglement.Cuts[3].Entropy, again.States[0].Entanglement.Cuts[3].Entropy, 1e-12)
}

// TestReadOther: another model of the same ladder may ask for more; its formulas mean what it says.
func TestReadOther(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "a.run")
	solved(t, chain(t, 8, 3, 1e-8), Options{Dir: dir})
	other := parse(t, strings.Replace(fmt.Sprintf(hopping, 8, 3, 1e-8), "t = 1.0", "t = 2.0\nq = 0.5", 1)+`
[[observe]]
name    = "scaled"
formula = "q*t*n[a,0]"
[[observe]]
kind = "entanglement"
spectrum_to = 5
`)
	r, notes, err := Read(context.Background(), dir, ReadOptions{Model: other})
	require.NoError(t, err)
	assert.Equal(t, []string{"constant t is 2 in model.toml, but the states were found with 1; formulas are read with 2"}, notes)
	o := r.States[0].Observations
	assert.InDelta(t, o["density"][0].Value.Re, o["scaled"][0].Value.Re, 1e-12)
	assert.Equal(t, runfolder.At{}, o["scaled"][0].At)
	for _, c := range r.States[0].Entanglement.Cuts {
		for _, l := range c.Spectrum {
			assert.Less(t, l.Xi, 5.0)
		}
	}
}

func TestReadRefuses(t *testing.T) {
	folder := t.TempDir()
	dir := filepath.Join(folder, "a.run")
	solved(t, chain(t, 6, 3, 1e-8), Options{Dir: dir})
	refuses := func(t *testing.T, dir string, opt ReadOptions, want string) {
		_, _, err := Read(context.Background(), dir, opt)
		assert.True(t, isRefusal(err), "%v", err)
		assert.ErrorContains(t, err, want)
	}
	refuses(t, folder, ReadOptions{}, "has no result.json")
	refuses(t, dir, ReadOptions{Model: chain(t, 7, 3, 1e-8)}, "its ladder is another")
	ctx, stop := context.WithCancel(context.Background())
	stop()
	_, _, err := Read(ctx, dir, ReadOptions{})
	assert.ErrorIs(t, err, context.Canceled)
	require.NoError(t, os.WriteFile(runfolder.StatePath(dir, 0), []byte("no state"), 0o600))
	refuses(t, dir, ReadOptions{}, "state-0.npz")
	require.NoError(t, os.Remove(filepath.Join(dir, runfolder.ModelFile)))
	refuses(t, dir, ReadOptions{}, "no model.toml")
}
