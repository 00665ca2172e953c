package main

import (
	"bytes"
	"context"
	"encoding/json"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/dmrg"
)

// TestMain lets the test binary serve jobs as the command does, since children are started from the running program.
func TestMain(m *testing.M) {
	if len(os.Args) == 3 && os.Args[1] == "--job" {
		if err := run(context.Background(), os.Args[1:], os.Stdout, os.Stderr); err != nil {
			os.Stderr.WriteString(err.Error())
			os.Exit(1)
		}
		os.Exit(0)
	}
	os.Exit(m.Run())
}

// TestRows: names are told apart, models exist, and the targets are those asked for.
func TestRows(t *testing.T) {
	seen := map[string]bool{}
	for _, quick := range []bool{false, true} {
		for _, r := range allRows(quick) {
			m, err := find(r.model)
			require.NoError(t, err)
			assert.Positive(t, r.target)
			if quick {
				assert.LessOrEqual(t, r.bond(), 200)
				assert.Less(t, r.rungs, m.rungs)
				continue
			}
			assert.False(t, seen[r.name()], r.name())
			seen[r.name()] = true
		}
	}
	for _, name := range []string{"sweep ladder 400", "sweep chain 256", "sweep hubbard 512", "sweep flux 256", "sweep boson 128", "energy pi-flux 256",
		"energy ladder 400, 2 threads", "gemm share hubbard 800", "gemm rate ladder 800", "memory ladder 800", "exponent ladder 200..1600"} {
		assert.True(t, seen[name], name)
	}
}

// TestSchedule: the passes are those that bench.py writes down for the same ramp.
func TestSchedule(t *testing.T) {
	r := row{bonds: []int{50, 100}}
	want := []dmrg.Pass{{Bond: 50, Vectors: 4, Perturbation: 1e-4}, {Bond: 50, Vectors: 4, Perturbation: 1e-4}, {Bond: 100, Vectors: 4, Perturbation: 1e-5},
		{Bond: 100, Vectors: 4}, {Bond: 100, Vectors: 4}, {Bond: 100, Vectors: 4}}
	require.Equal(t, want, r.schedule(cleanPasses))
}

// fakeBaseline is a program in the place of the baseline that prints what a run printed, and keeps its arguments.
func fakeBaseline(t *testing.T) (folder, shell string) {
	t.Helper()
	shell, err := exec.LookPath("sh")
	if err != nil {
		t.Skip("no shell here")
	}
	folder = t.TempDir()
	script := `echo "$* threads=$OPENBLAS_NUM_THREADS" >> "$(dirname "$0")/calls"
cat >&2 <<'END'
  1 chi   32 noise 1e-04 E -5.100000000000 disc 1.0e-09 m 32 1.50s cpu 1.00s {'svd': 0.04}
  2 chi   32 noise 0e+00 E -5.142090632500 disc 1.0e-09 m 32 2.50s cpu 2.00s {'svd': 0.04}
  3 chi   32 noise 0e+00 E -5.142090632841 disc 1.0e-09 m 32 4.50s cpu 4.00s {'svd': 0.04}
END
echo '{"energy": -5.142090632841, "sweeps": 3, "cpu_sec_per_sweep": 4.0, "sec_per_sweep": 4.5, "total_sec": 9.5, "total_cpu_sec": 8, "peak_rss_mb": 50, "max_bond": 32, "matvecs": 70}'
`
	require.NoError(t, os.WriteFile(filepath.Join(folder, "bench.py"), []byte(script), 0o600))
	return folder, shell
}

// TestCommand runs a row of each kind on small systems, with a stand-in for the baseline.
func TestCommand(t *testing.T) {
	folder, shell := fakeBaseline(t)
	var out bytes.Buffer
	args := []string{"--baseline", folder, "--python", shell, "--quick", "--json", "--only", "chain|memory|pi-flux|threads ladder|gemm.*ladder|exponent"}
	require.NoError(t, run(context.Background(), args, &out, io.Discard))
	lines := map[string]line{}
	for text := range strings.Lines(out.String()) {
		var l line
		require.NoError(t, json.Unmarshal([]byte(text), &l))
		assert.NotContains(t, lines, l.Row)
		lines[l.Row] = l
	}
	require.Len(t, lines, 9)
	sweep := lines["sweep chain 32"]
	assert.Greater(t, sweep.Figure, 1.8, "four seconds a sweep are beaten")
	assert.True(t, sweep.Met)
	assert.Contains(t, sweep.Note, "products 70, 70; bond 32, 32")
	assert.Contains(t, lines["energy chain 32"].Note, "whole run of the baseline")
	assert.Equal(t, "3 s", lines["energy chain 32"].Baseline, "the second sweep is near enough, the third does not count")
	assert.Contains(t, lines["energy chain 32, 2 threads"].Baseline, "4 s", "on the wall")
	assert.Positive(t, lines["memory ladder 100"].Figure)
	assert.Contains(t, lines, "gemm rate ladder 100") // so short a run may end between two samples of the profile: no figure
	assert.InDelta(t, 1.2, lines["exponent ladder 25..200"].Figure, 2)
	calls, err := os.ReadFile(filepath.Join(folder, "calls"))
	require.NoError(t, err)
	assert.Contains(t, string(calls), "chain 12 4,8,16,32 -v --discard 0 --krylov-tol 0 --tol 0 --max-sweeps 3 threads=1\n")
	assert.Contains(t, string(calls), "chain 12 4,8,16,32 -v threads=2\n")
	assert.Contains(t, string(calls), `--params {"phi": 3.141592653589793}`)
}

func TestRefusals(t *testing.T) {
	folder, shell := fakeBaseline(t)
	for _, row := range []struct {
		args []string
		want string
	}{
		{[]string{"--only", "sweep chain", "--quick"}, "--baseline DIR is needed"},
		{[]string{"--only", "nothing"}, "no row of that name"},
		{[]string{"--only", "("}, "--only"},
		{[]string{"--rounds", "0"}, "--rounds 0"},
		{[]string{"more"}, "more"},
		{[]string{"--job", "{"}, "--job"},
		{[]string{"--job", `{"Model": "triangle"}`}, `"triangle"`},
		{[]string{"--baseline", filepath.Join(folder, "elsewhere"), "--python", shell, "--quick", "--only", "energy chain"}, "the baseline"},
	} {
		require.ErrorContains(t, run(context.Background(), row.args, io.Discard, io.Discard), row.want)
	}
	_, err := readTheirs([]byte(`{"sweeps": 2}`), "")
	require.ErrorContains(t, err, "0 sweeps told of, expected 2")
}

// TestClaim: stacks as the profiler writes them end up where they belong.
func TestClaim(t *testing.T) {
	for _, row := range []struct {
		want  part
		stack string
	}{
		{productsPart, "rundle/internal/dense.tile24x8 rundle/internal/dense.runTiles rundle/internal/dense.Gemm rundle/mpo.multiply rundle/internal/krylov.Lowest"},
		{innerProductsPart, "rundle/internal/dense.Gemm rundle/internal/dense.(*SVD).Factor rundle/mps/block.decompose"},
		{decompositionPart, "rundle/internal/dense.Dot rundle/internal/dense.(*SVD).Factor rundle/mps/block.decompose"},
		{movesPart, "rundle/internal/dense.Axpy rundle/mpo.move rundle/mpo.(*network).runMiddle rundle/internal/krylov.Lowest"},
		{krylovPart, "rundle/internal/dense.Axpy rundle/internal/krylov.combine rundle/internal/krylov.Lowest"},
		{planningPart, "rundle/mps/block.NewStructure rundle/dmrg.(*engine).update"},
		{memoryPart, "runtime.memclrNoHeapPointers runtime.mallocgc rundle/mps/block.New"},
		{memoryPart, "runtime.scanobject runtime.gcDrain runtime.gcBgMarkWorker"},
		{otherPart, "rundle/mps/block.Dot rundle/dmrg.distance"},
	} {
		assert.Equal(t, row.want, claim(strings.Fields(row.stack)), row.stack)
	}
	assert.Equal(t, "rundle/mpo.(*network).run", bare("rundle/mpo.(*network[...]).run"))
}

func TestSlope(t *testing.T) {
	assert.InDelta(t, 3, slope([]float64{0, 1, 2}, []float64{1, 4, 7}), 1e-14)
	assert.InDelta(t, 2.5, median([]float64{4, 1, 2, 3}), 0)
}

func TestRender(t *testing.T) {
	text := render([]line{{Row: "sweep chain 256", Rundle: "1 s", Baseline: "2 s", Figure: 2, Target: 1.8, Met: true}, {Row: "memory ladder 800", Figure: 0.7, Target: 0.6, AtMost: true}})
	assert.Contains(t, text, "at least 1.8")
	assert.Contains(t, text, "at most 0.6")
	assert.Contains(t, text, "met")
	assert.Contains(t, text, "missed")
}
