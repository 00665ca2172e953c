// Package examples tests the bundled models as a user meets them: through the built driver and the files that it writes.
package examples

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
)

// driver is the built program.
var driver string

func TestMain(m *testing.M) { os.Exit(build(m)) }

func build(m *testing.M) int {
	dir, err := os.MkdirTemp("", "rundle")
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		return 1
	}
	defer os.RemoveAll(dir)
	driver = filepath.Join(dir, "rundle.exe")
	if out, err := exec.Command("go", "build", "-o", driver, "rundle/cmd/rundle").CombinedOutput(); err != nil {
		fmt.Fprintf(os.Stderr, "building the driver: %v\n%s", err, out)
		return 1
	}
	return m.Run()
}

// result is what the tests read of result.json, by its documented names.
type result struct {
	Model struct {
		Arithmetic string
		Charges    []struct{ Name string }
	}
	States []state
}

type state struct {
	Energy       float64
	EnergyLimit  float64 `json:"energy_limit"`
	EnergyError  float64 `json:"energy_error"`
	Verdict      string
	Observations map[string][]observation
	Entanglement struct {
		Cuts []struct {
			AfterSite int  `json:"after_site"`
			RungEdge  bool `json:"rung_edge"`
			Entropy   float64
		}
	}
}

type observation struct {
	At    map[string]any
	Value any // a number, or a pair
	Error float64
}

// model reads a bundled model file and makes replacements, old text to new.
func model(t *testing.T, name string, edits ...string) string {
	t.Helper()
	text, err := os.ReadFile(filepath.Join(name, "model.toml"))
	require.NoError(t, err)
	for i := 0; i < len(edits); i += 2 {
		require.Equal(t, 1, strings.Count(string(text), edits[i]), "%q in the model", edits[i])
		text = bytes.Replace(text, []byte(edits[i]), []byte(edits[i+1]), 1)
	}
	file := filepath.Join(t.TempDir(), name+".toml")
	require.NoError(t, os.WriteFile(file, text, 0o644))
	return file
}

// solve runs "rundle solve" on a bundled model, edited, and returns the one state of its result.json, which must be converged. out is the run folder.
func solve(t *testing.T, name string, edits ...string) (s state, r result, out string) {
	t.Helper()
	file := model(t, name, edits...)
	out = filepath.Join(t.TempDir(), "run")
	run := exec.Command(driver, "solve", file, "--out", out)
	var stderr bytes.Buffer
	run.Stderr = &stderr
	require.NoError(t, run.Run(), "%s", &stderr)
	text, err := os.ReadFile(filepath.Join(out, "result.json"))
	require.NoError(t, err)
	require.NoError(t, json.Unmarshal(text, &r))
	require.Len(t, r.States, 1)
	s = r.States[0]
	require.Equal(t, "converged", s.Verdict)
	return s, r, out
}

// values returns the numbers of an observation that has one index, j, or two, j and l, by their places: "3" or "3 a".
func (s state) values(t *testing.T, name string) map[string]float64 {
	t.Helper()
	require.NotEmpty(t, s.Observations[name], "%q", name)
	out := map[string]float64{}
	for _, o := range s.Observations[name] {
		key := fmt.Sprint(o.At["j"])
		for _, other := range []string{"l", "m", "k'"} {
			if x, ok := o.At[other]; ok {
				key += fmt.Sprint(" ", x)
			}
		}
		switch x := o.Value.(type) {
		case float64:
			out[key] = x
		case []any:
			out[key] = math.Hypot(x[0].(float64), x[1].(float64))
		}
		require.GreaterOrEqual(t, o.Error, 0.0)
	}
	return out
}

func sum(values map[string]float64) float64 {
	total := 0.0
	for _, v := range values {
		total += v
	}
	return total
}

// onLegs is the place of a leg and a rung in values.
func onLegs(j int, l string) string { return fmt.Sprint(j, " ", l) }

func onRung(j int) string { return fmt.Sprint(j) }

// scan reads the two rungs of a place "3 5".
func scan(t *testing.T, place string, j, k *int) {
	t.Helper()
	_, err := fmt.Sscan(place, j, k)
	require.NoError(t, err)
}
