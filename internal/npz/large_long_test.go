//go:build long

package npz

import (
	"bufio"
	"os"
	"os/exec"
	"path/filepath"
	"testing"

	"github.com/stretchr/testify/require"
)

// An entry beyond 4 GiB and one that begins beyond 4 GiB.
func TestEntriesBeyond4GiB(t *testing.T) {
	path := filepath.Join(t.TempDir(), "large.npz")
	f, err := os.Create(path)
	require.NoError(t, err)
	buffered := bufio.NewWriterSize(f, 1<<20)
	w := NewWriter(buffered)
	const n = 1<<29 + 3
	data := make([]float64, n)
	data[n-1] = 1
	require.NoError(t, Write(w, "large", []int{n, 1}, data))
	require.NoError(t, Write(w, "after", nil, []int64{42}))
	require.NoError(t, w.Close())
	require.NoError(t, buffered.Flush())
	require.NoError(t, f.Close())

	r, err := Open(path)
	require.NoError(t, err)
	shape, back, err := Read[float64](r, "large")
	require.NoError(t, err)
	require.Equal(t, []int{n, 1}, shape)
	require.Equal(t, []float64{0, 1}, back[n-2:])
	_, after, err := Read[int64](r, "after")
	require.NoError(t, err)
	require.Equal(t, []int64{42}, after)
	require.NoError(t, r.Close())

	out, err := exec.Command(python(t), "-c", `
import sys, zipfile, numpy as np
d = np.load(sys.argv[1])
assert d["after"] == 42
a = d["large"]
print(a.shape[0], a[-1, 0])
`, path).CombinedOutput()
	require.NoError(t, err, "%s", out)
	require.Equal(t, "536870915 1.0\n", string(out))
}
